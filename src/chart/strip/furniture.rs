//! What stands around the sky: measured edges, title block, key, cautions.

use crate::chart::geometry::{Point, Rect};
use crate::chart::palette::Role;
use crate::chart::scene::{Align, Label, Layer, MarkId, Paint, RibbonPoint, Scene, Shape, Stroke};
use crate::chart::text::{self, Font};
use crate::season::Season;
use crate::sky::Body;

use super::course::Course;
use super::layout::{StripLayout, StripRow};
use super::marks::{self, Glyph, signed};
use super::{Drawn, StripText, StripView, star_limit, star_paint, star_radius, track_width};

/// Blank edge of the sheet, points.
const MARGIN: f64 = 24.0;
/// Left and right of title and key: in line with the edge of the sky, points.
const SIDE: f64 = MARGIN + 23.0;
/// Height of the title block, points.
const TITLE_HEIGHT: f64 = 38.0;
/// Height of the key, points.
const KEY_HEIGHT: f64 = 40.0;
/// Size and line height of the cautions, and how many lines there may be.
const CAUTION_SIZE: f64 = 7.8;
const CAUTION_LEADING: f64 = 10.5;
const CAUTION_LINES: usize = 3;
/// Width of the measured edge, points.
const EDGE: f64 = 3.0;

/// Where the sky may lie on the sheet, the numbers along its edges included.
pub(super) fn sky_area(view: &StripView, text: &StripText) -> Rect {
    let (width, height) = view.size();
    if !view.furniture {
        return Rect::new(0.0, 0.0, width, height);
    }
    let top = MARGIN + TITLE_HEIGHT;
    let below = MARGIN + KEY_HEIGHT + caution_height(width, text);
    // On a sheet too small for all this the sky keeps a little, and the rest lies over it.
    Rect::new(
        MARGIN,
        top,
        (width - MARGIN).max(MARGIN + 60.0),
        (height - below).max(top + 60.0),
    )
}

/// What the chart shows, for those who cannot see it.
pub(super) fn description(season: &Season, text: &StripText) -> String {
    let mut words = format!(
        "Path of {} among the stars along the ecliptic, {}.",
        season.subject, text.span
    );
    for (event, date) in season.events.iter().zip(&text.event_dates) {
        if let Some((_, told)) = marks::told(event.kind) {
            words.push_str(&format!(" {date}: {told}."));
        }
    }
    words
}

pub(super) fn sheet(scene: &mut Scene) {
    let sheet = Rect::new(0.0, 0.0, scene.width, scene.height);
    scene.add(
        MarkId::Sheet,
        Layer::Sheet,
        Shape::Area {
            rings: vec![sheet.corners().to_vec()],
            fill: Paint::of(Role::Ground),
            edge: None,
        },
    );
}

fn line(scene: &mut Scene, id: MarkId, layer: Layer, from: Point, to: Point, stroke: Stroke) {
    scene.add(
        id,
        layer,
        Shape::Line {
            points: vec![from, to],
            stroke,
        },
    );
}

fn write(scene: &mut Scene, id: MarkId, label: Label) {
    scene.add(id, Layer::Frame, Shape::Label(label));
}

/// The ecliptic across a row: a hairline with a tick at every piece of the edge.
pub(super) fn ecliptic(scene: &mut Scene, row: &StripRow) {
    let frame = row.frame;
    let y = row.point(row.longitude, 0.0).y;
    if y <= frame.top || frame.bottom <= y {
        return;
    }
    line(
        scene,
        MarkId::Scale,
        Layer::Scale,
        Point::new(frame.left, y),
        Point::new(frame.right, y),
        Stroke::of(Role::Hairline, 0.5),
    );
    let half = row.half_length().min(180.0);
    for minute in multiples(row.longitude, half, step(row.scale, TICK_ROOM, &PIECES)) {
        let x = edge_x(row, degrees(minute), half);
        let reach = match minute {
            minute if minute % 600 == 0 => 3.0,
            minute if minute % 300 == 0 => 2.0,
            _ => 1.1,
        };
        line(
            scene,
            MarkId::Scale,
            Layer::Scale,
            Point::new(x, y - reach),
            Point::new(x, y + reach),
            Stroke::of(Role::Hairline, 0.45),
        );
    }
}

/// Lengths of the light and dark pieces of a measured edge, arcminutes.
const PIECES: [i32; 5] = [10, 30, 60, 300, 600];
/// Steps from number to number, arcminutes.
const NUMBERS: [i32; 6] = [30, 60, 120, 300, 600, 1800];
/// Least distance between ticks of the ecliptic, between ends of pieces, and between numbers along and up the edge,
/// points.
const TICK_ROOM: f64 = 5.5;
const PIECE_ROOM: f64 = 14.0;
const NUMBER_ROOM: f64 = 55.0;
const NUMBER_ROOM_UP: f64 = 26.0;

/// The shortest step that takes at least so many points.
fn step(scale: f64, room: f64, steps: &[i32]) -> i32 {
    steps
        .iter()
        .copied()
        .find(|step| degrees(*step) * scale >= room)
        .or(steps.last().copied())
        .unwrap_or(600)
}

fn degrees(minutes: i32) -> f64 {
    f64::from(minutes) / 60.0
}

/// Multiples of a step within `half` degrees of a middle, arcminutes.
fn multiples(middle: f64, half: f64, step: i32) -> impl Iterator<Item = i32> {
    let length = degrees(step);
    let first = ((middle - half) / length).ceil() as i32;
    let last = ((middle + half) / length).floor() as i32;
    (first..=last).map(move |number| number * step)
}

/// A number of degrees along an edge: whole or with a half.
fn numbered(minutes: i32) -> String {
    let decimals = usize::from(minutes % 60 != 0);
    format!("{:.decimals$}°", degrees(minutes))
}

/// The measured edge of a row: a frame of light and dark pieces, numbers below and at the sides.
pub(super) fn edges(scene: &mut Scene, row: &StripRow) {
    let frame = row.frame;
    let outer = frame.grown(EDGE);
    let piece = step(row.scale, PIECE_ROOM, &PIECES);
    let block = |scene: &mut Scene, rect: Rect| {
        scene.add(
            MarkId::Scale,
            Layer::Frame,
            Shape::Area {
                rings: vec![rect.corners().to_vec()],
                fill: Paint::of(Role::FaintInk),
                edge: None,
            },
        );
    };
    // Every other piece of the edge is dark, from an even multiple of its length to the next odd one.
    let half = row.half_length().min(180.0);
    for minute in multiples(row.longitude, half + degrees(piece), 2 * piece) {
        let a = edge_x(row, degrees(minute), half);
        let b = edge_x(row, degrees(minute + piece), half);
        let (left, right) = (a.min(b).max(frame.left), a.max(b).min(frame.right));
        if left < right {
            block(scene, Rect::new(left, outer.top, right, frame.top));
            block(scene, Rect::new(left, frame.bottom, right, outer.bottom));
        }
    }
    for minute in multiples(row.latitude, row.half_height() + degrees(piece), 2 * piece) {
        let a = row.point(row.longitude, degrees(minute)).y;
        let b = row.point(row.longitude, degrees(minute + piece)).y;
        let (top, bottom) = (a.min(b).max(frame.top), a.max(b).min(frame.bottom));
        if top < bottom {
            block(scene, Rect::new(outer.left, top, frame.left, bottom));
            block(scene, Rect::new(frame.right, top, outer.right, bottom));
        }
    }
    for rect in [frame, outer] {
        let mut corners = rect.corners().to_vec();
        corners.extend(corners.first().copied());
        scene.add(
            MarkId::Scale,
            Layer::Frame,
            Shape::Line {
                points: corners,
                stroke: Stroke::of(Role::FaintInk, 0.6),
            },
        );
    }
    let number = |words: String, at: Point, align: Align| {
        Label::new(at, words, Font::Sans, 7.2, Role::FaintInk).aligned(align)
    };
    for minute in multiples(row.longitude, half, step(row.scale, NUMBER_ROOM, &NUMBERS)) {
        let x = edge_x(row, degrees(minute), half);
        let label = number(
            numbered(minute.rem_euclid(360 * 60)),
            Point::new(x, outer.bottom + 8.2),
            Align::Middle,
        );
        let bounds = label.bounds();
        // The last degree of a whole circle is its first one again.
        let doubled = degrees(minute) - row.longitude >= 180.0;
        if outer.left <= bounds.left && bounds.right <= outer.right && !doubled {
            write(scene, MarkId::Scale, label);
        }
    }
    let up = step(row.scale, NUMBER_ROOM_UP, &NUMBERS);
    for minute in multiples(row.latitude, row.half_height(), up) {
        let y = row.point(row.longitude, degrees(minute)).y;
        let words = signed(degrees(minute), usize::from(minute % 60 != 0)) + "°";
        for (x, align) in [
            (outer.left - 3.0, Align::End),
            (outer.right + 3.0, Align::Start),
        ] {
            let label = number(words.clone(), Point::new(x, y + 2.5), align);
            let bounds = label.bounds();
            if outer.top <= bounds.top && bounds.bottom <= outer.bottom {
                write(scene, MarkId::Scale, label);
            }
        }
    }
}

/// Where a degree of longitude (not wrapped) meets the lower edge.
fn edge_x(row: &StripRow, degree: f64, half: f64) -> f64 {
    let east = (degree - row.longitude).clamp(-half, half) * row.scale;
    row.frame.centre().x + if row.east_left { -east } else { east }
}

/// Title at the left, place and span at the right.
pub(super) fn title_block(scene: &mut Scene, text: &StripText) {
    let base = MARGIN + 21.0;
    let right = scene.width - SIDE;
    let place = fitted(
        &text.place,
        Font::SansStrong,
        10.0,
        scene.width * 0.4,
        Role::Ink,
    );
    let span = fitted(
        &text.span,
        Font::Sans,
        9.2,
        scene.width * 0.4,
        Role::FaintInk,
    );
    let note = fitted(
        &text.date_note,
        Font::Sans,
        7.6,
        scene.width * 0.4,
        Role::FaintInk,
    );
    let taken = place.width().max(span.width()).max(note.width());
    let room = (right - SIDE - taken - 24.0).max(40.0);
    // A long title is set smaller before it is shortened.
    let size = [28.0, 24.0, 20.0, 17.0, 14.0]
        .into_iter()
        .find(|size| text::width(&text.title, Font::SerifItalic, *size, 0.0) <= room)
        .unwrap_or(14.0);
    let mut title = fitted(&text.title, Font::SerifItalic, size, room, Role::Ink);
    title.anchor = Point::new(SIDE, base + 1.0);
    write(scene, MarkId::Sheet, title);
    for (mut label, y) in [(place, base - 13.0), (span, base - 1.0), (note, base + 9.5)] {
        label.anchor = Point::new(right, y);
        if !label.text.is_empty() {
            write(scene, MarkId::Sheet, label.aligned(Align::End));
        }
    }
}

/// A line of text, shortened with an ellipsis where it is wider than `room`.
fn fitted(words: &str, font: Font, size: f64, room: f64, role: Role) -> Label {
    let mut shown = words.to_owned();
    let mut kept: Vec<char> = words.chars().collect();
    while text::width(&shown, font, size, 0.0) > room && kept.pop().is_some() {
        shown = kept.iter().collect::<String>().trim_end().to_owned() + "…";
    }
    Label::new(Point::default(), shown, font, size, role)
}

/// The cautions under the key.
pub(super) fn cautions(scene: &mut Scene, text: &StripText) {
    let room = scene.width - 2.0 * SIDE;
    let lines = caution_lines(scene.width, text);
    for (index, words) in lines.iter().rev().enumerate() {
        let mut label = fitted(words, Font::Sans, CAUTION_SIZE, room, Role::Caution);
        let base = scene.height - MARGIN - CAUTION_LEADING * index as f64;
        label.anchor = Point::new(SIDE, base);
        write(scene, MarkId::Sheet, label);
    }
}

fn caution_height(width: f64, text: &StripText) -> f64 {
    match caution_lines(width, text).len() {
        0 => 0.0,
        lines => 6.0 + CAUTION_LEADING * lines as f64,
    }
}

/// The cautions one after the other, broken into lines.
fn caution_lines(width: f64, text: &StripText) -> Vec<String> {
    let room = width - 2.0 * SIDE;
    let mut lines: Vec<String> = Vec::new();
    for word in text
        .cautions
        .iter()
        .flat_map(|caution| caution.split_whitespace())
    {
        let longer = lines
            .last()
            .map(|last| format!("{last} {word}"))
            .filter(|longer| text::width(longer, Font::Sans, CAUTION_SIZE, 0.0) <= room);
        match (longer, lines.last_mut()) {
            (Some(longer), Some(last)) => *last = longer,
            _ => lines.push(word.to_owned()),
        }
    }
    if lines.len() > CAUTION_LINES {
        lines.truncate(CAUTION_LINES);
        if let Some(last) = lines.last_mut() {
            last.push_str(" …");
        }
    }
    lines
}

/// An entry of the key: drawn into a scene of its own from (0, 0), then moved to its place.
struct Entry {
    scene: Scene,
    width: f64,
}

const KEY_TEXT: f64 = 7.6;

fn caption(at: Point, words: &str) -> Label {
    Label::new(at, words, Font::SerifItalic, 9.4, Role::FaintInk)
}

fn reading(at: Point, words: impl Into<String>) -> Label {
    Label::new(at, words, Font::Sans, KEY_TEXT, Role::Ink)
}

/// What the signs and lines mean, under the sky.
pub(super) fn key(
    scene: &mut Scene,
    season: &Season,
    text: &StripText,
    subject: &Course,
    layout: &StripLayout,
    drawn: &Drawn,
) {
    let mut entries = vec![brightness(subject), senses(season.subject, drawn, subject)];
    if !drawn.glyphs.is_empty() {
        entries.push(glyphs(drawn));
    }
    if let Some(row) = layout.rows.first() {
        entries.push(star_sizes(row.scale));
        entries.push(compass(row.east_left));
    }
    let room = scene.width - 2.0 * SIDE;
    let total: f64 = entries.iter().map(|entry| entry.width).sum();
    let gaps = (entries.len().max(2) - 1) as f64;
    let gap = ((room - total) / gaps).clamp(6.0, 200.0);
    // On a narrow sheet the key is drawn smaller rather than cut.
    let shrink = (room / (total + gap * gaps)).min(1.0);
    let top = scene.height - MARGIN - caution_height(scene.width, text) - KEY_HEIGHT + 7.0;
    let mut x = SIDE;
    for entry in entries {
        for mark in entry.scene.marks {
            let shape = placed(mark.shape, Point::new(x, top), shrink);
            scene.add(mark.id, Layer::Frame, shape);
        }
        x += (entry.width + gap) * shrink;
    }
}

/// A shape of the key at its place and size.
fn placed(shape: Shape, origin: Point, scale: f64) -> Shape {
    let put = |point: Point| origin.moved(point.x * scale, point.y * scale);
    let pen = |stroke: Stroke| Stroke {
        width: stroke.width * scale,
        ..stroke
    };
    match shape {
        Shape::Line { points, stroke } => Shape::Line {
            points: points.into_iter().map(put).collect(),
            stroke: pen(stroke),
        },
        // Widths and radii are the scale that the key explains: they stay.
        Shape::Ribbon(points) => Shape::Ribbon(
            points
                .into_iter()
                .map(|point| RibbonPoint {
                    at: put(point.at),
                    ..point
                })
                .collect(),
        ),
        Shape::Area { rings, fill, edge } => Shape::Area {
            rings: rings
                .into_iter()
                .map(|ring| ring.into_iter().map(put).collect())
                .collect(),
            fill,
            edge: edge.map(pen),
        },
        Shape::Disc {
            centre,
            radius,
            fill,
        } => Shape::Disc {
            centre: put(centre),
            radius,
            fill,
        },
        Shape::Ring {
            centre,
            radius,
            stroke,
        } => Shape::Ring {
            centre: put(centre),
            radius,
            stroke: pen(stroke),
        },
        Shape::Shade {
            polygon,
            run,
            stops,
        } => Shape::Shade {
            polygon: polygon.into_iter().map(put).collect(),
            run,
            stops,
        },
        Shape::Label(label) => Shape::Label(Label {
            anchor: put(label.anchor),
            size: label.size * scale,
            spacing: label.spacing * scale,
            ..label
        }),
    }
}

const CAPTION_Y: f64 = 8.0;
const FIRST_Y: f64 = 19.5;
const SECOND_Y: f64 = 31.0;

/// The width of the track by brightness.
fn brightness(subject: &Course) -> Entry {
    let mut scene = Scene::default();
    let magnitudes: Vec<f64> = subject
        .samples()
        .iter()
        .filter_map(|spot| spot.magnitude)
        .collect();
    let brightest = magnitudes.iter().copied().fold(f64::INFINITY, f64::min);
    let faintest = magnitudes.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    write(
        &mut scene,
        MarkId::Sheet,
        caption(Point::new(0.0, CAPTION_Y), "width: magnitude"),
    );
    let mut width: f64 = 70.0;
    if brightest <= faintest {
        let (from, to) = (brightest.floor().max(-5.0), faintest.ceil().min(3.0));
        let to = to.max(from + 1.0);
        let step = 21.0;
        let count = (to - from) as usize;
        let place = |number: f64| Point::new(4.0 + (to - number) * step, FIRST_Y - 2.0);
        let points = (0..=count * 8)
            .map(|part| {
                let number = to - part as f64 / 8.0;
                RibbonPoint {
                    at: place(number),
                    width: track_width(number),
                    paint: Paint::of(Role::FaintInk),
                    index: 0,
                }
            })
            .collect();
        scene.add(MarkId::Sheet, Layer::Frame, Shape::Ribbon(points));
        for number in 0..=count {
            let number = to - number as f64;
            write(
                &mut scene,
                MarkId::Sheet,
                reading(
                    place(number).moved(0.0, SECOND_Y - FIRST_Y + 2.0),
                    signed(number, 0),
                )
                .aligned(Align::Middle),
            );
        }
        width = width.max(8.0 + count as f64 * step + 4.0);
    }
    Entry { scene, width }
}

/// The two senses of motion, and the finer lines.
fn senses(subject: Body, drawn: &Drawn, course: &Course) -> Entry {
    const SAMPLE: f64 = 34.0;
    let mut scene = Scene::default();
    write(
        &mut scene,
        MarkId::Sheet,
        caption(Point::new(0.0, CAPTION_Y), subject.name()),
    );
    let usual = course
        .samples()
        .iter()
        .filter_map(|spot| spot.magnitude)
        .fold(2.0, f64::min);
    let width = track_width(usual).min(4.6);
    let ribbon = |y: f64, paint: &dyn Fn(f64) -> Paint| -> Vec<RibbonPoint> {
        (0..=24)
            .map(|part| {
                let part = f64::from(part) / 24.0;
                RibbonPoint {
                    at: Point::new(SAMPLE * part, y),
                    width,
                    paint: paint(part),
                    index: 0,
                }
            })
            .collect()
    };
    let mut longest: f64 = 0.0;
    let mut entry = |scene: &mut Scene, y: f64, words: &str| {
        let label = reading(Point::new(SAMPLE + 5.0, y), words);
        longest = longest.max(label.width());
        write(scene, MarkId::Sheet, label);
    };
    let direct = ribbon(FIRST_Y - 2.6, &|part| {
        Paint::mixed(Role::Subject, Role::SubjectLate, part)
    });
    scene.add(MarkId::Sheet, Layer::Frame, Shape::Ribbon(direct));
    entry(&mut scene, FIRST_Y, "eastward, from early to late");
    if drawn.retrograde {
        let back = ribbon(SECOND_Y - 2.6, &|_| Paint::of(Role::Retrograde));
        let light: Vec<RibbonPoint> = super::light_line(&back)
            .into_iter()
            .map(|point| RibbonPoint {
                paint: Paint::of(Role::Ground),
                ..point
            })
            .collect();
        scene.add(MarkId::Sheet, Layer::Frame, Shape::Ribbon(back));
        scene.add(MarkId::Sheet, Layer::Frame, Shape::Ribbon(light));
        entry(&mut scene, SECOND_Y, "westward: retrograde");
    }
    Entry {
        scene,
        width: SAMPLE + 5.0 + longest,
    }
}

/// The marks on the track.
fn glyphs(drawn: &Drawn) -> Entry {
    let mut scene = Scene::default();
    write(
        &mut scene,
        MarkId::Sheet,
        caption(Point::new(0.0, CAPTION_Y), "on the path"),
    );
    let shown: Vec<Glyph> = Glyph::ALL
        .into_iter()
        .filter(|glyph| drawn.glyphs.contains(glyph))
        .collect();
    let mut x = 0.0;
    for column in shown.chunks(2) {
        let mut widest: f64 = 0.0;
        for (glyph, y) in column.iter().zip([FIRST_Y, SECOND_Y]) {
            let middle = Point::new(x + marks::RADIUS + 1.0, y - 2.6);
            marks::draw(&mut scene, MarkId::Sheet, Layer::Frame, *glyph, middle);
            let label = reading(
                Point::new(x + 2.0 * marks::RADIUS + 6.0, y),
                glyph.meaning(),
            );
            widest = widest.max(label.width());
            write(&mut scene, MarkId::Sheet, label);
        }
        x += 2.0 * marks::RADIUS + 6.0 + widest + 11.0;
    }
    Entry {
        scene,
        width: (x - 11.0).max(50.0),
    }
}

/// Dots by magnitude.
fn star_sizes(scale: f64) -> Entry {
    let mut scene = Scene::default();
    write(
        &mut scene,
        MarkId::Sheet,
        caption(Point::new(0.0, CAPTION_Y), "stars: magnitude"),
    );
    let faintest = star_limit(scale).floor() as i32;
    let mut x = 4.0;
    for magnitude in 1..=faintest {
        let magnitude = f64::from(magnitude);
        scene.add(
            MarkId::Sheet,
            Layer::Frame,
            Shape::Disc {
                centre: Point::new(x, FIRST_Y - 2.0),
                radius: star_radius(magnitude, scale),
                fill: star_paint(magnitude, None),
            },
        );
        write(
            &mut scene,
            MarkId::Sheet,
            reading(Point::new(x, SECOND_Y), format!("{magnitude:.0}")).aligned(Align::Middle),
        );
        x += 12.5;
    }
    Entry {
        scene,
        width: (x - 8.0).max(66.0),
    }
}

/// Which way north and east lie.
fn compass(east_left: bool) -> Entry {
    let mut scene = Scene::default();
    let (arm, tip) = (15.0, 3.0);
    // Half a turn for the southern sky: east to the right, north down.
    let foot = if east_left {
        Point::new(26.0, SECOND_Y - 1.5)
    } else {
        Point::new(12.0, SECOND_Y - 13.5)
    };
    let side = if east_left { -1.0 } else { 1.0 };
    let stroke = Stroke::of(Role::FaintInk, 0.8);
    let north = foot.moved(0.0, side * arm);
    let east = foot.moved(side * arm, 0.0);
    scene.add(
        MarkId::Sheet,
        Layer::Frame,
        Shape::Line {
            points: vec![north, foot, east],
            stroke,
        },
    );
    for (end, back) in [
        (north, Point::new(0.0, -side)),
        (east, Point::new(-side, 0.0)),
    ] {
        let across = back.turned();
        let corner = end.towards(back, tip);
        scene.add(
            MarkId::Sheet,
            Layer::Frame,
            Shape::Area {
                rings: vec![vec![
                    end.towards(back, -1.2),
                    corner.towards(across, 1.6),
                    corner.towards(across, -1.6),
                ]],
                fill: Paint::of(Role::FaintInk),
                edge: None,
            },
        );
    }
    write(
        &mut scene,
        MarkId::Sheet,
        caption(
            north.moved(0.0, if east_left { -4.5 } else { 9.5 }),
            "north",
        )
        .aligned(Align::Middle),
    );
    let label = caption(east.moved(side * 4.5, 2.6), "east").aligned(if east_left {
        Align::End
    } else {
        Align::Start
    });
    let bounds = label.bounds();
    let shift = (-bounds.left).max(0.0);
    write(&mut scene, MarkId::Sheet, label);
    for mark in &mut scene.marks {
        mark.shape = placed(mark.shape.clone(), Point::new(shift, 0.0), 1.0);
    }
    let right = if east_left {
        foot.x + shift + 12.0
    } else {
        bounds.right
    };
    Entry {
        scene,
        width: right,
    }
}
