//! Where labels may stand: the ground taken so far, and the cost of taking more. Deterministic: the first of equally
//! good places wins, and what is placed early stays.

use super::geometry::{self, Point, Rect};

/// Space kept between two labels, points.
const LABEL_GAP: f64 = 3.2;
/// A leader may run this far upon lines: enough to cross one, not to follow it, points.
const LONGEST_UPON: f64 = 16.0;
/// What a point of air around a label is worth, and how much of it counts, points.
const AIR: f64 = 0.35;
const MOST_AIR: f64 = 9.0;
/// Space kept between a label and a line it must not touch, points.
const LINE_GAP: f64 = 1.6;

/// A place offered for a label.
#[derive(Clone, Copy, Debug)]
pub(super) struct Offer {
    pub bounds: Rect,
    /// What it costs before the ground is looked at; less is better.
    pub cost: f64,
    /// Where a leader would begin, if the label stands off.
    pub leader_from: Option<Point>,
}

/// A place taken.
#[derive(Clone, Copy, Debug)]
pub(super) struct Taken {
    pub bounds: Rect,
    pub leader: Option<(Point, Point)>,
}

/// Ground within one frame.
#[derive(Clone, Debug)]
pub(super) struct Ground {
    within: Rect,
    boxes: Vec<Rect>,
    /// Lines that no label may touch: ends and half width.
    lines: Vec<(Point, Point, f64)>,
    /// Small things that a label had better not cover: centre, radius, cost.
    dots: Vec<(Point, f64, f64)>,
    leaders: Vec<(Point, Point)>,
}

impl Ground {
    pub fn new(within: Rect) -> Self {
        Ground {
            within,
            boxes: Vec::new(),
            lines: Vec::new(),
            dots: Vec::new(),
            leaders: Vec::new(),
        }
    }

    /// A line that no label and no leader may touch.
    pub fn line(&mut self, from: Point, to: Point, half_width: f64) {
        self.lines.push((from, to, half_width));
    }

    /// Something small that a label had better not cover.
    pub fn dot(&mut self, centre: Point, radius: f64, cost: f64) {
        self.dots.push((centre, radius, cost));
    }

    fn is_free(&self, bounds: &Rect) -> bool {
        self.within.holds(bounds)
            && !self
                .boxes
                .iter()
                .any(|taken| taken.overlaps(&bounds.grown(LABEL_GAP)))
            && !self
                .lines
                .iter()
                .any(|&(from, to, half)| is_near(bounds, from, to, half + LINE_GAP))
            && !self
                .leaders
                .iter()
                .any(|&(from, to)| is_near(bounds, from, to, LINE_GAP))
    }

    fn leader_is_clear(&self, from: Point, to: Point, may_cross: bool) -> bool {
        !self
            .boxes
            .iter()
            .any(|taken| is_near(taken, from, to, LABEL_GAP))
            && !self.lines.iter().any(|&(a, b, half)| {
                !may_cross && geometry::crossing((from, to), (a, b)).is_some()
                    || geometry::distance_to_segment(to, a, b).0 < half + LINE_GAP
            })
            && !self
                .leaders
                .iter()
                .any(|&leader| geometry::crossing((from, to), leader).is_some())
            && self.length_upon_lines(from, to) <= LONGEST_UPON
    }

    /// How much of a leader lies upon lines or close beside them, points.
    fn length_upon_lines(&self, from: Point, to: Point) -> f64 {
        const STEP: f64 = 2.0;
        let length = from.distance(to);
        let (mut at, mut upon) = (0.0, 0.0);
        while at < length {
            let point = from.between(to, at / length);
            let is_upon = self.lines.iter().any(|&(a, b, half)| {
                geometry::distance_to_segment(point, a, b).0 < half + LINE_GAP
            });
            if is_upon {
                upon += STEP;
            }
            at += STEP;
        }
        upon
    }

    /// Room around a free box, up to `most` points.
    pub fn room(&self, bounds: &Rect, most: f64) -> f64 {
        let lines = self.lines.iter().fold(most, |least, &(from, to, half)| {
            if is_beyond(bounds, from, to, least + half) {
                least
            } else {
                least.min(geometry::rect_to_segment(bounds, from, to) - half)
            }
        });
        let boxes = self.boxes.iter().map(|taken| {
            let across = (taken.left - bounds.right).max(bounds.left - taken.right);
            let up = (taken.top - bounds.bottom).max(bounds.top - taken.bottom);
            libm::hypot(across.max(0.0), up.max(0.0))
        });
        boxes.fold(lines, f64::min).max(0.0)
    }

    /// Takes the cheapest free place among the offers.
    pub fn take(&mut self, offers: impl IntoIterator<Item = Offer>) -> Option<Taken> {
        self.find(offers, false)
    }

    /// The same for what must not be left out: where there is no other place, the leader may cross a line.
    pub fn take_across(&mut self, offers: &[Offer]) -> Option<Taken> {
        self.find(offers.iter().copied(), false)
            .or_else(|| self.find(offers.iter().copied(), true))
    }

    fn find(&mut self, offers: impl IntoIterator<Item = Offer>, may_cross: bool) -> Option<Taken> {
        let mut best: Option<(f64, Taken)> = None;
        for offer in offers {
            if best
                .as_ref()
                .is_some_and(|(cost, _)| offer.cost - AIR * MOST_AIR >= *cost)
                || !self.is_free(&offer.bounds)
            {
                continue;
            }
            let leader = offer.leader_from.map(|from| {
                let around = offer.bounds.grown(1.0);
                (from, around.nearest(from))
            });
            if leader.is_some_and(|(from, to)| !self.leader_is_clear(from, to, may_cross)) {
                continue;
            }
            let covered: f64 = self
                .dots
                .iter()
                .filter(|(centre, radius, _)| {
                    offer.bounds.nearest(*centre).distance(*centre) < radius + 2.0
                })
                .map(|dot| dot.2)
                .sum();
            // Air around a label reads better than nearness to its point.
            let cost = offer.cost + covered - AIR * self.room(&offer.bounds, MOST_AIR);
            if best.as_ref().is_none_or(|(least, _)| cost < *least) {
                best = Some((
                    cost,
                    Taken {
                        bounds: offer.bounds,
                        leader,
                    },
                ));
            }
        }
        let (_, taken) = best?;
        self.boxes.push(taken.bounds);
        self.leaders.extend(taken.leader);
        Some(taken)
    }
}

/// Whether a segment lies wholly beyond `reach` on one side of a rectangle: the quick answer for most.
fn is_beyond(bounds: &Rect, from: Point, to: Point, reach: f64) -> bool {
    from.x.max(to.x) < bounds.left - reach
        || bounds.right + reach < from.x.min(to.x)
        || from.y.max(to.y) < bounds.top - reach
        || bounds.bottom + reach < from.y.min(to.y)
}

fn is_near(bounds: &Rect, from: Point, to: Point, reach: f64) -> bool {
    !is_beyond(bounds, from, to, reach) && geometry::rect_to_segment(bounds, from, to) < reach
}

/// Offers around a point: in `directions` even directions beginning upward, at growing distances from it; those
/// beyond `near` points with a leader. `square` is the direction preferred (square to a path), if there is one.
pub(super) fn around(
    point: Point,
    size: (f64, f64),
    clear: f64,
    distances: &[f64],
    directions: u32,
    near: f64,
    square: Option<Point>,
) -> Vec<Offer> {
    let (width, height) = size;
    let mut offers = Vec::new();
    for &distance in distances {
        for step in 0..directions {
            let angle = f64::from(step) / f64::from(directions) * std::f64::consts::TAU;
            let (sin, cos) = libm::sincos(angle);
            let along = Point::new(sin, -cos);
            // The box touches a circle of that radius from outside.
            let reach = distance + along.x.abs() * width / 2.0 + along.y.abs() * height / 2.0;
            let centre = point.towards(along, reach);
            let bounds = Rect::around(centre, width, height);
            let gap = bounds.nearest(point).distance(point);
            let off = square.map_or(0.0, |square| 1.0 - square.dot(along).abs());
            let start = bounds.nearest(point).minus(point).unit();
            let led = gap > near;
            offers.push(Offer {
                bounds,
                cost: gap + 10.0 * off + if led { 6.0 } else { 0.0 },
                leader_from: led.then(|| point.towards(start, clear)),
            });
        }
    }
    offers
}

#[cfg(test)]
mod tests {
    use super::*;

    fn offer(x: f64, cost: f64) -> Offer {
        Offer {
            bounds: Rect::around(Point::new(x, 50.0), 20.0, 8.0),
            cost,
            leader_from: None,
        }
    }

    #[test]
    fn the_cheapest_free_place_is_taken_and_then_gone() {
        let mut ground = Ground::new(Rect::new(0.0, 0.0, 100.0, 100.0));
        let offers = [offer(50.0, 1.0), offer(80.0, 20.0), offer(95.0, 0.0)];
        let first = ground.take(offers).map(|taken| taken.bounds.centre().x);
        assert_eq!(first, Some(50.0), "95 is cut by the frame");
        let second = ground.take(offers).map(|taken| taken.bounds.centre().x);
        assert_eq!(second, Some(80.0));
        assert!(ground.take(offers).is_none());
    }

    #[test]
    fn no_leader_runs_through_a_label_or_a_line() {
        let mut ground = Ground::new(Rect::new(0.0, 0.0, 100.0, 100.0));
        let block = Offer {
            bounds: Rect::around(Point::new(50.0, 50.0), 10.0, 10.0),
            cost: 0.0,
            leader_from: None,
        };
        assert!(ground.take([block]).is_some());
        ground.line(Point::new(0.0, 80.0), Point::new(100.0, 80.0), 1.0);
        let led = |from| Offer {
            bounds: Rect::around(Point::new(50.0, 20.0), 10.0, 8.0),
            cost: 0.0,
            leader_from: Some(from),
        };
        assert!(ground.take([led(Point::new(50.0, 70.0))]).is_none());
        assert!(ground.take([led(Point::new(90.0, 90.0))]).is_none());
        assert!(ground.take([led(Point::new(90.0, 40.0))]).is_some());
    }
}
