//! Work that takes more than a few milliseconds: one thread, and of each kind of work only the latest request counts.
//!
//! The window asks, goes on drawing what it has, and collects what is done at the beginning of a frame.

use std::sync::mpsc::{Receiver, Sender, channel};
use std::sync::{Arc, Condvar, Mutex, MutexGuard, PoisonError};
use std::thread::JoinHandle;

/// Kinds of work, in the order in which waiting ones are done.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    Plan,
    /// Rise, culmination and set of the night.
    Tonight,
    Strip,
    /// The light of every night.
    Nights,
    Timeline,
}

impl Kind {
    const COUNT: usize = 5;
    pub const ALL: [Kind; Kind::COUNT] = [
        Kind::Plan,
        Kind::Tonight,
        Kind::Strip,
        Kind::Nights,
        Kind::Timeline,
    ];
}

type Job<T> = Box<dyn FnOnce() -> T + Send>;

struct Desk<T> {
    waiting: [Option<Job<T>>; Kind::COUNT],
    closed: bool,
}

struct Shared<T> {
    desk: Mutex<Desk<T>>,
    bell: Condvar,
}

impl<T> Shared<T> {
    fn desk(&self) -> MutexGuard<'_, Desk<T>> {
        // A panic in between leaves the desk whole: each change to it is a single assignment.
        self.desk.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

/// The thread and what it was asked for.
pub struct Worker<T> {
    shared: Arc<Shared<T>>,
    done: Receiver<(Kind, T)>,
    /// Requests and answers of each kind so far; replaced requests count as answered.
    asked: [u64; Kind::COUNT],
    answered: [u64; Kind::COUNT],
    thread: Option<JoinHandle<()>>,
}

impl<T: Send + 'static> Worker<T> {
    /// Starts the thread. `wake` is called from it whenever something is done.
    ///
    /// # Errors
    /// The system gives no thread.
    pub fn new(wake: impl Fn() + Send + 'static) -> std::io::Result<Self> {
        let shared = Arc::new(Shared {
            desk: Mutex::new(Desk {
                waiting: [const { None }; Kind::COUNT],
                closed: false,
            }),
            bell: Condvar::new(),
        });
        let (send, done) = channel();
        let of_thread = Arc::clone(&shared);
        let thread = std::thread::Builder::new()
            .name(String::from("season work"))
            .spawn(move || work(&of_thread, &send, wake))?;
        Ok(Worker {
            shared,
            done,
            asked: [0; Kind::COUNT],
            answered: [0; Kind::COUNT],
            thread: Some(thread),
        })
    }

    /// Asks for work; a request of the same kind that has not begun is dropped.
    pub fn ask(&mut self, kind: Kind, job: impl FnOnce() -> T + Send + 'static) {
        let index = kind as usize;
        let mut desk = self.shared.desk();
        if let (Some(slot), Some(asked), Some(answered)) = (
            desk.waiting.get_mut(index),
            self.asked.get_mut(index),
            self.answered.get_mut(index),
        ) {
            if slot.replace(Box::new(job)).is_some() {
                *answered += 1;
            }
            *asked += 1;
        }
        self.shared.bell.notify_one();
    }

    /// Whether work of this kind waits or is under way.
    #[must_use]
    pub fn is_busy(&self, kind: Kind) -> bool {
        self.asked.get(kind as usize) != self.answered.get(kind as usize)
    }

    /// What has been done since the last call; does not wait.
    pub fn collect(&mut self) -> Vec<T> {
        let mut all = Vec::new();
        while let Ok(answer) = self.done.try_recv() {
            self.take(answer, &mut all);
        }
        all
    }

    /// Waits for whatever comes next; `None` when nothing is under way.
    pub fn wait(&mut self) -> Option<T> {
        if self.asked == self.answered {
            return None;
        }
        let answer = self.done.recv().ok()?;
        let mut all = Vec::new();
        self.take(answer, &mut all);
        all.pop()
    }

    fn take(&mut self, (kind, value): (Kind, T), all: &mut Vec<T>) {
        if let Some(answered) = self.answered.get_mut(kind as usize) {
            *answered += 1;
        }
        all.push(value);
    }
}

impl<T> Drop for Worker<T> {
    fn drop(&mut self) {
        let mut desk = self.shared.desk();
        desk.closed = true;
        desk.waiting = [const { None }; Kind::COUNT];
        drop(desk);
        self.shared.bell.notify_one();
        if let Some(thread) = self.thread.take() {
            // A thread that panicked has already said so.
            let _ = thread.join();
        }
    }
}

fn work<T>(shared: &Shared<T>, done: &Sender<(Kind, T)>, wake: impl Fn()) {
    loop {
        let mut desk = shared.desk();
        let (kind, job) = loop {
            if desk.closed {
                return;
            }
            let next = Kind::ALL
                .into_iter()
                .find_map(|kind| Some((kind, desk.waiting.get_mut(kind as usize)?.take()?)));
            match next {
                Some(next) => break next,
                None => {
                    desk = shared
                        .bell
                        .wait(desk)
                        .unwrap_or_else(PoisonError::into_inner)
                }
            }
        };
        drop(desk);
        if done.send((kind, job())).is_err() {
            return;
        }
        wake();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_latest_request_of_a_kind_wins() {
        let mut worker = Worker::new(|| {}).unwrap();
        let (release, hold) = channel::<()>();
        let (begun, begins) = channel();
        worker.ask(Kind::Strip, move || {
            begun.send(()).unwrap();
            hold.recv().unwrap();
            1
        });
        begins.recv().unwrap();
        // While the first is under way, the second waits and is replaced by the third.
        worker.ask(Kind::Strip, || 2);
        worker.ask(Kind::Strip, || 3);
        worker.ask(Kind::Plan, || 4);
        assert!(worker.is_busy(Kind::Strip));
        release.send(()).unwrap();
        let mut answers = Vec::new();
        while let Some(answer) = worker.wait() {
            answers.push(answer);
        }
        assert_eq!(answers, [1, 4, 3]);
        assert!(!worker.is_busy(Kind::Strip));
    }
}
