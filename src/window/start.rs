//! Opening the window, and saying plainly why there is none.

use std::panic::{AssertUnwindSafe, catch_unwind, resume_unwind, set_hook, take_hook};
use std::path::PathBuf;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use super::app::Window;
use crate::scenario::Scenario;
use crate::sky::Tt;

/// Variables that name a display; without one of them there is none.
const DISPLAYS: [&str; 3] = ["WAYLAND_DISPLAY", "WAYLAND_SOCKET", "DISPLAY"];

/// Why no window could be opened, in a sentence for the user.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum NoWindow {
    #[error("there is no display")]
    NoDisplay,
    #[error("the display {0} cannot be reached")]
    Unreachable(String),
    #[error("the display has no OpenGL that can be used")]
    NoGraphics,
    #[error("a library of the window system is missing ({0})")]
    MissingLibrary(&'static str),
    #[error("the window system gave up")]
    GaveUp,
}

/// Opens the window and returns when it is closed.
///
/// # Errors
/// Why there is no window.
pub fn open(scenario: Scenario, path: Option<PathBuf>, now: Tt) -> Result<(), NoWindow> {
    let Some(display) = display() else {
        return Err(NoWindow::NoDisplay);
    };
    let options = eframe::NativeOptions {
        viewport: egui::ViewportBuilder::default()
            .with_title("Loopwright")
            .with_app_id("loopwright")
            .with_inner_size([1280.0, 800.0])
            .with_min_inner_size([900.0, 600.0])
            .with_icon(egui::IconData::default()),
        renderer: eframe::Renderer::Glow,
        // Costs more than it shows where the processor draws.
        dithering: false,
        ..eframe::NativeOptions::default()
    };
    // The window system's own library panics where a shared library is missing; that is no fault of the user's, and its
    // report would not help. Once the window stands, a panic is a fault of ours and is reported as any other.
    let stands = Arc::new(AtomicBool::new(false));
    let usual = take_hook();
    let of_hook = Arc::clone(&stands);
    set_hook(Box::new(move |report| {
        if of_hook.load(Ordering::Relaxed) {
            usual(report);
        }
    }));
    let of_window = Arc::clone(&stands);
    let result = catch_unwind(AssertUnwindSafe(|| {
        eframe::run_native(
            "Loopwright",
            options,
            Box::new(move |context| {
                of_window.store(true, Ordering::Relaxed);
                Ok(Box::new(Window::new(
                    &context.egui_ctx,
                    scenario,
                    path,
                    now,
                )?))
            }),
        )
    }));
    let stood = stands.swap(true, Ordering::Relaxed);
    match result {
        Ok(Ok(())) => Ok(()),
        Ok(Err(error)) => Err(reason(&error, display)),
        Err(panic) if stood => resume_unwind(panic),
        Err(panic) => {
            let text = panic
                .downcast_ref::<String>()
                .map(String::as_str)
                .or_else(|| panic.downcast_ref::<&str>().copied())
                .unwrap_or_default();
            Err(if text.contains("xkbcommon-x11") {
                NoWindow::MissingLibrary("libxkbcommon-x11")
            } else if text.contains("xkbcommon") {
                NoWindow::MissingLibrary("libxkbcommon")
            } else {
                NoWindow::GaveUp
            })
        }
    }
}

/// The display that would be used.
fn display() -> Option<String> {
    DISPLAYS.into_iter().find_map(|name| {
        let value = std::env::var_os(name)?.to_string_lossy().into_owned();
        (!value.is_empty()).then(|| format!("{name}={value}"))
    })
}

fn reason(error: &eframe::Error, display: String) -> NoWindow {
    match error {
        eframe::Error::Glutin(_)
        | eframe::Error::NoGlutinConfigs(..)
        | eframe::Error::OpenGL(_) => NoWindow::NoGraphics,
        _ => NoWindow::Unreachable(display),
    }
}
