//! Areas as triangles: any rings by the even-odd rule, cut into trapezoids between the heights of their corners.
//!
//! Plane coordinates, y down, units of the caller. Rings may be concave, touch and hold each other; where edges cross
//! between two corners' heights the picture is off by the crossing's own size.

use crate::chart::Point;

/// An edge that is not level, from its upper end to its lower one.
#[derive(Clone, Copy, Debug)]
struct Edge {
    top: Point,
    bottom: Point,
}

impl Edge {
    fn x_at(&self, y: f64) -> f64 {
        let part = (y - self.top.y) / (self.bottom.y - self.top.y);
        self.top.x + (self.bottom.x - self.top.x) * part
    }
}

/// The inside of the rings as trapezoids with level upper and lower sides, cut also at the heights given. Corners run
/// round: upper left, upper right, lower right, lower left.
pub(super) fn trapezoids(rings: &[Vec<Point>], cuts: &[f64]) -> Vec<[Point; 4]> {
    let mut edges: Vec<Edge> = Vec::new();
    for ring in rings {
        let next = ring.iter().cycle().skip(1);
        for (&a, &b) in ring.iter().zip(next) {
            if a.y != b.y && a.is_finite() && b.is_finite() {
                let (top, bottom) = if a.y < b.y { (a, b) } else { (b, a) };
                edges.push(Edge { top, bottom });
            }
        }
    }
    edges.sort_by(|a, b| a.top.y.total_cmp(&b.top.y));
    let mut heights: Vec<f64> = edges
        .iter()
        .flat_map(|edge| [edge.top.y, edge.bottom.y])
        .collect();
    heights.extend(cuts.iter().filter(|cut| cut.is_finite()));
    heights.sort_by(f64::total_cmp);
    heights.dedup();

    let mut pieces = Vec::new();
    let mut waiting = edges.into_iter().enumerate().peekable();
    let mut active: Vec<(usize, Edge)> = Vec::new();
    let mut open: Vec<Open> = Vec::new();
    for pair in heights.windows(2) {
        let &[upper, lower] = pair else { continue };
        active.retain(|(_, edge)| edge.bottom.y > upper);
        while let Some(edge) = waiting.next_if(|(_, edge)| edge.top.y <= upper) {
            active.push(edge);
        }
        let middle = (upper + lower) / 2.0;
        active.sort_by(|a, b| a.1.x_at(middle).total_cmp(&b.1.x_at(middle)));
        let is_cut = cuts.contains(&upper);
        let mut next = Vec::with_capacity(active.len() / 2);
        for sides in active.chunks_exact(2) {
            let &[left, right] = sides else { continue };
            // Between the same two edges a piece goes on, whatever happens elsewhere at this height.
            let before = open
                .iter()
                .find(|open| !is_cut && open.left.0 == left.0 && open.right.0 == right.0);
            next.push(Open {
                left,
                right,
                upper: before.map_or(upper, |before| before.upper),
            });
        }
        for ended in &open {
            let goes_on = |next: &Open| {
                next.left.0 == ended.left.0
                    && next.right.0 == ended.right.0
                    && next.upper == ended.upper
            };
            if !next.iter().any(goes_on) {
                pieces.push(ended.closed(upper));
            }
        }
        open = next;
    }
    if let Some(&last) = heights.last() {
        pieces.extend(open.iter().map(|ended| ended.closed(last)));
    }
    pieces
}

/// A piece whose lower side is not known yet.
#[derive(Clone, Copy, Debug)]
struct Open {
    left: (usize, Edge),
    right: (usize, Edge),
    upper: f64,
}

impl Open {
    fn closed(&self, lower: f64) -> [Point; 4] {
        [
            Point::new(self.left.1.x_at(self.upper), self.upper),
            Point::new(self.right.1.x_at(self.upper), self.upper),
            Point::new(self.right.1.x_at(lower), lower),
            Point::new(self.left.1.x_at(lower), lower),
        ]
    }
}

/// The inside of the rings in as few pieces as come of cutting it across or along.
pub(super) fn quadrangles(rings: &[Vec<Point>]) -> Vec<[Point; 4]> {
    let turned = |point: &Point| Point::new(point.y, point.x);
    let across = trapezoids(rings, &[]);
    let flipped: Vec<Vec<Point>> = rings
        .iter()
        .map(|ring| ring.iter().map(turned).collect())
        .collect();
    let along = trapezoids(&flipped, &[]);
    if along.len() < across.len() {
        along
            .iter()
            .map(|piece| piece.map(|corner| turned(&corner)))
            .collect()
    } else {
        across
    }
}

/// Twice the area, positive where the corners run clockwise on a sheet with y down.
fn turn(a: Point, b: Point, c: Point) -> f64 {
    b.minus(a).cross(c.minus(a))
}

/// Whether a ring turns one way only, once round.
pub(super) fn convex(ring: &[Point]) -> bool {
    if ring.len() < 3 {
        return true;
    }
    let (mut left, mut right, mut bends) = (false, false, 0);
    let at = |index: usize| ring.get(index % ring.len()).copied().unwrap_or_default();
    let mut before_sign = 0.0;
    for index in 0..ring.len() {
        let (a, b, c) = (at(index), at(index + 1), at(index + 2));
        let bend = turn(a, b, c);
        left |= bend < 0.0;
        right |= bend > 0.0;
        // A star polygon turns one way only but runs to and fro more than once.
        let sign = b.x - a.x;
        if sign != 0.0 {
            if before_sign != 0.0 && sign.signum() != before_sign {
                bends += 1;
            }
            before_sign = sign.signum();
        }
    }
    !(left && right) && bends <= 2
}

/// The part of a triangle that lies in a convex polygon, as triangles.
pub(super) fn triangles_within(triangle: [Point; 3], polygon: &[Point]) -> Vec<[Point; 3]> {
    let [a, b, c] = triangle;
    let around = polygon
        .iter()
        .fold(0.0, |sum, corner| sum + corner.x + corner.y);
    if !around.is_finite() || polygon.len() < 3 {
        return Vec::new();
    }
    let middle = polygon.iter().fold(Point::default(), |sum, corner| {
        sum.moved(
            corner.x / polygon.len() as f64,
            corner.y / polygon.len() as f64,
        )
    });
    let mut rest = vec![a, b, c];
    for (&from, &to) in polygon.iter().zip(polygon.iter().cycle().skip(1)) {
        let inward = turn(from, to, middle);
        if inward == 0.0 {
            continue;
        }
        let height = |point: Point| turn(from, to, point) * inward.signum();
        let mut kept = Vec::with_capacity(rest.len() + 1);
        for (&here, &next) in rest.iter().zip(rest.iter().cycle().skip(1)) {
            let (h, n) = (height(here), height(next));
            if h >= 0.0 {
                kept.push(here);
            }
            if (h < 0.0) != (n < 0.0) {
                kept.push(here.between(next, h / (h - n)));
            }
        }
        rest = kept;
        if rest.len() < 3 {
            return Vec::new();
        }
    }
    let Some(&first) = rest.first() else {
        return Vec::new();
    };
    rest.windows(2)
        .skip(1)
        .filter_map(|pair| match *pair {
            [second, third] => Some([first, second, third]),
            _ => None,
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ring(corners: &[(f64, f64)]) -> Vec<Point> {
        corners.iter().map(|&(x, y)| Point::new(x, y)).collect()
    }

    fn area(corners: &[Point]) -> f64 {
        let next = corners.iter().cycle().skip(1);
        corners
            .iter()
            .zip(next)
            .map(|(a, b)| a.cross(*b))
            .sum::<f64>()
            .abs()
            / 2.0
    }

    /// Areas by the shoelace formula.
    #[test]
    fn trapezoids_cover_the_inside_and_no_more() {
        let comb = ring(&[
            (0.0, 0.0),
            (10.0, 0.0),
            (10.0, 6.0),
            (8.0, 2.0),
            (6.0, 7.0),
            (3.0, 1.0),
            (0.0, 5.0),
        ]);
        let hole = ring(&[(4.0, 0.2), (5.0, 0.2), (5.0, 0.8), (4.0, 0.8)]);
        let wanted = area(&comb) - area(&hole);
        for cuts in [&[][..], &[0.5, 1.5, 3.25, 99.0]] {
            let pieces = trapezoids(&[comb.clone(), hole.clone()], cuts);
            let covered: f64 = pieces.iter().map(|piece| area(piece)).sum();
            assert!((covered - wanted).abs() < 1e-9, "{covered} {wanted}");
        }
        let covered: f64 = quadrangles(&[comb, hole])
            .iter()
            .map(|piece| area(piece))
            .sum();
        assert!((covered - wanted).abs() < 1e-9, "{covered} {wanted}");
    }

    /// A band between two waves needs a piece for each step along it, not for each height.
    #[test]
    fn a_long_band_takes_few_pieces() {
        let wave =
            |k: i32, lift: f64| Point::new(f64::from(k), lift + libm::sin(f64::from(k) * 0.37));
        let mut band: Vec<Point> = (0..200).map(|k| wave(k, 0.0)).collect();
        band.extend((0..200).rev().map(|k| wave(k, 5.0)));
        let pieces = quadrangles(&[band.clone()]);
        assert_eq!(pieces.len(), 199);
        let covered: f64 = pieces.iter().map(|piece| area(piece)).sum();
        assert!((covered - area(&band)).abs() < 1e-9);
    }

    #[test]
    fn convex_rings_are_told_from_others() {
        assert!(convex(&ring(&[
            (0.0, 0.0),
            (4.0, 0.0),
            (4.0, 3.0),
            (0.0, 3.0)
        ])));
        assert!(!convex(&ring(&[
            (0.0, 0.0),
            (4.0, 0.0),
            (1.0, 1.0),
            (0.0, 3.0)
        ])));
        // A five-pointed star drawn in one stroke.
        let star: Vec<(f64, f64)> = (0..5)
            .map(|k| {
                let (sin, cos) = libm::sincos(f64::from(2 * k) * std::f64::consts::TAU / 5.0);
                (cos, sin)
            })
            .collect();
        assert!(!convex(&ring(&star)));
    }

    #[test]
    fn a_triangle_is_cut_to_a_square() {
        let square = ring(&[(0.0, 0.0), (1.0, 0.0), (1.0, 1.0), (0.0, 1.0)]);
        let corners = ring(&[(0.5, -1.0), (3.0, 0.5), (0.5, 2.0)]);
        let pieces = triangles_within([corners[0], corners[1], corners[2]], &square);
        let covered: f64 = pieces.iter().map(|piece| area(piece)).sum();
        // The triangle covers the square's right half: its sides leave it outside.
        assert!((covered - 0.5).abs() < 1e-9, "{covered}");
        let far = [
            Point::new(5.0, 5.0),
            Point::new(6.0, 5.0),
            Point::new(5.0, 6.0),
        ];
        assert!(triangles_within(far, &square).is_empty());
    }
}
