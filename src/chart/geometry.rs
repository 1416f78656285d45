//! Plane geometry of charts: points (1/72 inch), y down.

/// A place on a chart, in points from the upper left corner, y down.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Point {
    pub x: f64,
    pub y: f64,
}

impl Point {
    #[must_use]
    pub const fn new(x: f64, y: f64) -> Self {
        Point { x, y }
    }

    /// This point moved by `(x, y)`.
    #[must_use]
    pub const fn moved(self, x: f64, y: f64) -> Self {
        Point::new(self.x + x, self.y + y)
    }

    /// This point moved by `length` along the direction `along`.
    #[must_use]
    pub const fn towards(self, along: Point, length: f64) -> Self {
        Point::new(self.x + along.x * length, self.y + along.y * length)
    }

    #[must_use]
    pub const fn minus(self, other: Point) -> Self {
        Point::new(self.x - other.x, self.y - other.y)
    }

    #[must_use]
    pub fn length(self) -> f64 {
        (self.x * self.x + self.y * self.y).sqrt()
    }

    #[must_use]
    pub fn distance(self, other: Point) -> f64 {
        self.minus(other).length()
    }

    /// The same direction at length 1; a vector without length stays as it is.
    #[must_use]
    pub fn unit(self) -> Self {
        let length = self.length();
        if length > 0.0 {
            Point::new(self.x / length, self.y / length)
        } else {
            self
        }
    }

    /// A quarter turn: the direction square to this one.
    #[must_use]
    pub const fn turned(self) -> Self {
        Point::new(-self.y, self.x)
    }

    /// The point at `part` (0 to 1) of the way to `other`.
    #[must_use]
    pub const fn between(self, other: Point, part: f64) -> Self {
        Point::new(
            self.x + (other.x - self.x) * part,
            self.y + (other.y - self.y) * part,
        )
    }

    #[must_use]
    pub const fn cross(self, other: Point) -> f64 {
        self.x * other.y - self.y * other.x
    }

    #[must_use]
    pub const fn dot(self, other: Point) -> f64 {
        self.x * other.x + self.y * other.y
    }

    #[must_use]
    pub const fn is_finite(self) -> bool {
        self.x.is_finite() && self.y.is_finite()
    }
}

/// An upright rectangle, edges included; `left <= right` and `top <= bottom`.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Rect {
    pub left: f64,
    pub top: f64,
    pub right: f64,
    pub bottom: f64,
}

impl Rect {
    #[must_use]
    pub const fn new(left: f64, top: f64, right: f64, bottom: f64) -> Self {
        Rect {
            left,
            top,
            right,
            bottom,
        }
    }

    #[must_use]
    pub const fn around(centre: Point, width: f64, height: f64) -> Self {
        Rect::new(
            centre.x - width / 2.0,
            centre.y - height / 2.0,
            centre.x + width / 2.0,
            centre.y + height / 2.0,
        )
    }

    #[must_use]
    pub const fn width(&self) -> f64 {
        self.right - self.left
    }

    #[must_use]
    pub const fn height(&self) -> f64 {
        self.bottom - self.top
    }

    #[must_use]
    pub const fn centre(&self) -> Point {
        Point::new(
            (self.left + self.right) / 2.0,
            (self.top + self.bottom) / 2.0,
        )
    }

    /// This rectangle with every edge moved outward by `by` (inward where negative).
    #[must_use]
    pub const fn grown(&self, by: f64) -> Self {
        Rect::new(
            self.left - by,
            self.top - by,
            self.right + by,
            self.bottom + by,
        )
    }

    #[must_use]
    pub fn contains(&self, point: Point) -> bool {
        self.left <= point.x
            && point.x <= self.right
            && self.top <= point.y
            && point.y <= self.bottom
    }

    #[must_use]
    pub fn holds(&self, other: &Rect) -> bool {
        self.left <= other.left
            && other.right <= self.right
            && self.top <= other.top
            && other.bottom <= self.bottom
    }

    /// Whether the two share more than an edge.
    #[must_use]
    pub fn overlaps(&self, other: &Rect) -> bool {
        self.left < other.right
            && other.left < self.right
            && self.top < other.bottom
            && other.top < self.bottom
    }

    /// The smallest rectangle around both.
    #[must_use]
    pub fn union(&self, other: &Rect) -> Self {
        Rect::new(
            self.left.min(other.left),
            self.top.min(other.top),
            self.right.max(other.right),
            self.bottom.max(other.bottom),
        )
    }

    /// The point of the rectangle nearest to `point`.
    #[must_use]
    pub fn nearest(&self, point: Point) -> Point {
        Point::new(
            point.x.max(self.left).min(self.right),
            point.y.max(self.top).min(self.bottom),
        )
    }

    #[must_use]
    pub const fn corners(&self) -> [Point; 4] {
        [
            Point::new(self.left, self.top),
            Point::new(self.right, self.top),
            Point::new(self.right, self.bottom),
            Point::new(self.left, self.bottom),
        ]
    }

    /// The part of the segment inside the rectangle, as parts (0 to 1) of the way (Liang and Barsky 1984,
    /// ACM Trans. Graph. 3:1).
    #[must_use]
    pub fn clip(&self, from: Point, to: Point) -> Option<(f64, f64)> {
        let way = to.minus(from);
        let (mut enter, mut leave) = (0.0_f64, 1.0_f64);
        for (step, room) in [
            (-way.x, from.x - self.left),
            (way.x, self.right - from.x),
            (-way.y, from.y - self.top),
            (way.y, self.bottom - from.y),
        ] {
            if step == 0.0 {
                if room < 0.0 {
                    return None;
                }
            } else if step < 0.0 {
                enter = enter.max(room / step);
            } else {
                leave = leave.min(room / step);
            }
        }
        (enter < leave).then_some((enter, leave))
    }

    /// The parts of a polyline inside the rectangle.
    #[must_use]
    pub fn clip_line(&self, points: &[Point]) -> Vec<Vec<Point>> {
        let mut parts: Vec<Vec<Point>> = Vec::new();
        let mut open = false;
        for pair in points.windows(2) {
            let &[from, to] = pair else { continue };
            let Some((enter, leave)) = self.clip(from, to) else {
                open = false;
                continue;
            };
            let end = from.between(to, leave);
            match parts.last_mut() {
                Some(part) if open && enter == 0.0 => part.push(end),
                _ => parts.push(vec![from.between(to, enter), end]),
            }
            open = leave == 1.0;
        }
        parts
    }
}

/// Distance from `point` to the segment, and how far along it (0 to 1) the nearest point lies.
#[must_use]
pub fn distance_to_segment(point: Point, from: Point, to: Point) -> (f64, f64) {
    let way = to.minus(from);
    let square = way.dot(way);
    let part = if square > 0.0 {
        (point.minus(from).dot(way) / square).clamp(0.0, 1.0)
    } else {
        0.0
    };
    (point.distance(from.between(to, part)), part)
}

/// Where two segments cross, as parts (0 to 1) of each; `None` for parallel ones.
#[must_use]
pub fn crossing(a: (Point, Point), b: (Point, Point)) -> Option<(f64, f64)> {
    let (u, v) = (a.1.minus(a.0), b.1.minus(b.0));
    let turn = u.cross(v);
    if turn == 0.0 {
        return None;
    }
    let apart = b.0.minus(a.0);
    let (s, t) = (apart.cross(v) / turn, apart.cross(u) / turn);
    ((0.0..=1.0).contains(&s) && (0.0..=1.0).contains(&t)).then_some((s, t))
}

/// Distance between a rectangle and a segment; 0 where they meet.
#[must_use]
pub fn rect_to_segment(rect: &Rect, from: Point, to: Point) -> f64 {
    if rect.clip(from, to).is_some() || rect.contains(from) {
        return 0.0;
    }
    // Apart, two convex figures are nearest at a corner of one of them.
    let ends = rect
        .nearest(from)
        .distance(from)
        .min(rect.nearest(to).distance(to));
    rect.corners().into_iter().fold(ends, |least, corner| {
        least.min(distance_to_segment(corner, from, to).0)
    })
}

/// Whether a point lies inside a polygon (even-odd rule).
#[must_use]
pub fn inside(point: Point, polygon: &[Point]) -> bool {
    let mut within = false;
    let Some(mut last) = polygon.last().copied() else {
        return false;
    };
    for &corner in polygon {
        if (corner.y > point.y) != (last.y > point.y) {
            let x = last.x + (point.y - last.y) / (corner.y - last.y) * (corner.x - last.x);
            if point.x < x {
                within = !within;
            }
        }
        last = corner;
    }
    within
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_line_through_a_rectangle_keeps_the_part_inside() {
        let rect = Rect::new(0.0, 0.0, 10.0, 10.0);
        let parts = rect.clip_line(&[
            Point::new(-5.0, 5.0),
            Point::new(5.0, 5.0),
            Point::new(5.0, 15.0),
            Point::new(8.0, 15.0),
            Point::new(8.0, 8.0),
        ]);
        assert_eq!(
            parts,
            vec![
                vec![
                    Point::new(0.0, 5.0),
                    Point::new(5.0, 5.0),
                    Point::new(5.0, 10.0)
                ],
                vec![Point::new(8.0, 10.0), Point::new(8.0, 8.0)],
            ]
        );
    }

    #[test]
    fn a_segment_beside_a_rectangle_is_as_far_as_its_nearest_point() {
        let rect = Rect::new(0.0, 0.0, 10.0, 4.0);
        // 3-4-5 triangle from the corner (10, 4).
        let apart = rect_to_segment(&rect, Point::new(13.0, 8.0), Point::new(20.0, 8.0));
        assert!((apart - 5.0).abs() < 1e-12);
        assert_eq!(
            rect_to_segment(&rect, Point::new(-5.0, 2.0), Point::new(20.0, 2.0)),
            0.0
        );
        assert_eq!(
            rect_to_segment(&rect, Point::new(2.0, 1.0), Point::new(3.0, 1.0)),
            0.0
        );
    }

    #[test]
    fn segments_cross_where_they_cross() {
        let cross = crossing(
            (Point::new(0.0, 0.0), Point::new(4.0, 0.0)),
            (Point::new(1.0, -1.0), Point::new(1.0, 3.0)),
        );
        assert_eq!(cross, Some((0.25, 0.25)));
        let apart = crossing(
            (Point::new(0.0, 0.0), Point::new(4.0, 0.0)),
            (Point::new(5.0, -1.0), Point::new(5.0, 3.0)),
        );
        assert_eq!(apart, None);
    }
}
