//! `loopwright frame`: which of the scenario's lenses holds the path, where to aim it, where each date falls in the picture.

use std::io::{BufWriter, Write, stdout};
use std::path::PathBuf;

use clap::ValueEnum;

use crate::scenario::Camera;
use crate::scenario::programme::Programme;
use crate::season::Span;
use crate::season::exposure::{AngularRate, ThumbRule};
use crate::season::framing::{
    FrameError, LongestLens, PhotoFrame, longest_lens, longest_run, mosaic, smallest_rectangle,
};
use crate::season::lens::OutOfRange;
use crate::season::picks::Measure;
use crate::season::stacking::{NightHalf, StarStack};
use crate::sheet::table::{Cell, TableFormat, TableWriter};
use crate::sheet::words::LocalClock;
use crate::sky::calendar::CivilDate;
use crate::sky::place::Sky;
use crate::sky::stars::StarCatalogue;
use crate::sky::{Angle, Tt, Vec3};

use super::CliError;
use super::outings::{PageFormat, day_and_part, plan, print_cautions, today, utc_second};
use super::picks::By;

/// Frame the path: which lens holds it with named stars, how it is aimed and tilted, where each date falls.
#[derive(Debug, clap::Args)]
#[command(after_help = "Examples:
  loopwright frame scenarios/mars-loop-2026.ron --stars Regulus,Algieba --margin 2 --today 2026-09-20
  loopwright frame scenarios/venus-evening-2029.ron --on ground --sun -6 --today 2029-07-01

The path is that of the picks, from its first night to its last; the dates are those that \"loopwright picks\" gives, and the
frames of the log. Positions are astrometric, of the site, on ICRS axes; pixels count from the top left corner of the picture, x
to the right, y down. Tilts: position angle of the picture's upward direction, from celestial north through east.")]
pub struct Options {
    /// A scenario file.
    scenario: PathBuf,
    /// Stars to hold as well, by their names, separated by commas.
    #[arg(long, value_name = "LIST")]
    stars: Option<String>,
    /// Margin around everything, degrees.
    #[arg(
        long,
        value_name = "DEG",
        default_value_t = 2.0,
        allow_hyphen_values = true
    )]
    margin: f64,
    /// On what the pictures of all dates are laid: the same stars, or the same ground.
    #[arg(long, value_enum, default_value_t)]
    on: Base,
    /// On the ground: altitude of the Sun at which every picture is taken, degrees.
    #[arg(
        long,
        value_name = "DEG",
        default_value_t = -6.0,
        allow_hyphen_values = true
    )]
    sun: f64,
    /// On the ground: at dawn instead of dusk.
    #[arg(long)]
    morning: bool,
    /// Longest trail of a star in an untracked exposure, pixels.
    #[arg(
        long,
        value_name = "N",
        default_value_t = 2.0,
        allow_hyphen_values = true
    )]
    trail_pixels: f64,
    /// Number of dates; without it the scenario's.
    #[arg(long, value_name = "N")]
    count: Option<usize>,
    /// By what the steps along the path are even; without it the scenario's.
    #[arg(long, value_enum)]
    by: Option<By>,
    /// The first night that is still open: 2026-11-01.
    #[arg(long, value_name = "DATE", allow_hyphen_values = true)]
    today: Option<CivilDate>,
    #[arg(long, value_enum, default_value_t)]
    format: PageFormat,
}

/// What a stacked picture is fixed on.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, ValueEnum)]
enum Base {
    /// The loop among the constellations.
    #[default]
    Stars,
    /// An arc over the skyline; a page of words only.
    Ground,
}

const COLUMNS: &[&str] = &[
    "lens",
    "focal_length_mm",
    "field_width_deg",
    "field_height_deg",
    "pixel_scale_arcsec",
    "path_held_fraction",
    "pictures",
    "centre_ra_deg",
    "centre_dec_deg",
    "tilt_deg",
    "night",
    "utc",
    "ra_deg",
    "dec_deg",
    "x_px",
    "y_px",
    "in_picture",
    "tilt_to_horizon_deg",
];

/// Share of a side that pictures side by side have in common (common practice, no source).
const OVERLAP: f64 = 0.2;

/// A date as a dot.
struct Dot {
    night: CivilDate,
    instant: Tt,
    direction: Vec3,
    /// Position angle of the zenith at the dot, from celestial north through east.
    zenith: Angle,
}

/// What one lens makes of the path.
struct View<'a> {
    camera: &'a Camera,
    frame: PhotoFrame,
    /// Of the length of the path, 0 to 1.
    held: f64,
    /// Side by side, to hold all; `None` for too many.
    pictures: Option<(usize, usize)>,
}

impl View<'_> {
    /// Turned by half a turn where the picture would stand on its head over most dates, as celestial north up does at
    /// southern sites: the same piece of sky, the right way up.
    fn upright(mut self, dots: &[Dot]) -> Result<Self, CliError> {
        let on_its_head = dots
            .iter()
            .filter(|dot| lean(&self, dot).abs() > Angle::QUARTER_TURN)
            .count();
        if on_its_head * 2 > dots.len() {
            let rectangle = self.frame.rectangle();
            let tilt = (rectangle.tilt() + Angle::HALF_TURN).signed();
            let Camera { lens, sensor } = self.camera;
            self.frame =
                PhotoFrame::new(rectangle.centre(), tilt, lens, sensor).map_err(frame_failed)?;
        }
        Ok(self)
    }
}

pub(super) fn run(options: &Options) -> Result<(), CliError> {
    let plan = plan(&options.scenario)?;
    let scenario = &plan.scenario;
    if scenario.lenses.is_empty() {
        return Err(CliError::Failed(format!(
            "{} has no lenses; add for example lenses: [(lens: (name: \"standard\", focal_length_mm: 50, f_ratio: 2.8), sensor: (width_mm: 36, height_mm: 24, columns: 6000, rows: 4000))]",
            options.scenario.display()
        )));
    }
    let programme = Programme::new(&plan)?;
    let today = today(&programme, options.today)?;
    let measure = options.by.map_or(scenario.picks.measure, Measure::from);
    let count = options.count.unwrap_or(scenario.picks.count);
    let dots = dots(&programme, count, measure, today)?;
    if options.on == Base::Ground {
        return ground_page(options, &programme, &dots);
    }
    let path = path(&programme)?;
    let stars = stars(options.stars.as_deref(), path.first().map(|point| point.0))?;
    let margin = Angle::from_degrees(options.margin);
    let mut wanted: Vec<Vec3> = path.iter().map(|point| point.1).collect();
    let path_only = wanted.clone();
    wanted.extend(&stars);
    let views = scenario
        .lenses
        .iter()
        .map(|camera| view(camera, &path_only, &stars, &wanted, margin)?.upright(&dots))
        .collect::<Result<Vec<_>, CliError>>()?;
    match options.format {
        PageFormat::Words => {
            let clock = LocalClock {
                scenario,
                sky: &plan.sky,
            };
            let mut out = BufWriter::new(stdout().lock());
            writeln!(out, "{}", scenario.title)?;
            for line in path_lines(&wanted, margin, &dots, &clock)? {
                writeln!(out, "{line}")?;
            }
            for view in &views {
                writeln!(out)?;
                for line in view_lines(view, &wanted, margin, &dots, options, &clock)? {
                    writeln!(out, "{line}")?;
                }
            }
            out.flush()?;
        }
        PageFormat::Csv => table(&plan.sky, &views, &dots, TableFormat::Csv)?,
        PageFormat::Json => table(&plan.sky, &views, &dots, TableFormat::Json)?,
    }
    print_cautions(&plan);
    Ok(())
}

fn ground_page(options: &Options, programme: &Programme<'_>, dots: &[Dot]) -> Result<(), CliError> {
    if options.format != PageFormat::Words {
        return Err(CliError::Words(
            "--on ground is written as words only; leave --format out".to_owned(),
        ));
    }
    let half = if options.morning {
        NightHalf::Morning
    } else {
        NightHalf::Evening
    };
    let nights: Vec<Span> = dots
        .iter()
        .filter_map(|dot| programme.season.night(dot.night))
        .map(|night| night.night.span)
        .collect();
    let sun = Angle::from_degrees(options.sun);
    let lines = super::ground::lines(programme, &nights, sun, half)?;
    let mut out = BufWriter::new(stdout().lock());
    writeln!(out, "{}", programme.plan.scenario.title)?;
    for line in lines {
        writeln!(out, "{line}")?;
    }
    out.flush()?;
    print_cautions(programme.plan);
    Ok(())
}

fn frame_failed(error: FrameError) -> CliError {
    CliError::Failed(error.to_string())
}

fn number_failed(error: OutOfRange) -> CliError {
    CliError::Failed(error.to_string())
}

/// The path with a point each night, at its middle.
fn path(programme: &Programme<'_>) -> Result<Vec<(Tt, Vec3)>, CliError> {
    let path = programme.path()?;
    let nights = programme.season.nights.iter();
    nights
        .filter(|night| path.holds(night.date()))
        .map(|night| {
            let middle = night.night.span.middle();
            Ok((middle, programme.direction(middle)?))
        })
        .collect()
}

/// The frames of the log and the picks, in order of time.
fn dots(
    programme: &Programme<'_>,
    count: usize,
    measure: Measure,
    today: CivilDate,
) -> Result<Vec<Dot>, CliError> {
    let plan = programme.plan;
    let dates = programme.dates(count, measure, today)?;
    let entries = plan.scenario.log.entries().iter();
    let mut instants: Vec<(CivilDate, Tt)> = entries
        .filter(|entry| entry.outcome.gives_frame())
        .filter_map(|entry| {
            let night = programme.season.night(entry.night)?;
            let at = entry.at.map(|at| plan.sky.tables().tt_from_utc(at));
            let best = night.offer.spells().first();
            let best = best.map(|judged| judged.spell.best.instant);
            Some((
                entry.night,
                at.or(best).unwrap_or_else(|| night.night.span.middle()),
            ))
        })
        .collect();
    instants.extend(dates.plan.sections.iter().filter_map(|section| {
        let (night, judged) = programme.spell(section.pick)?;
        Some((night.date(), judged.spell.best.instant))
    }));
    instants
        .into_iter()
        .map(|(night, instant)| {
            let vantage = plan.sky.observer(&plan.scenario.site, instant)?;
            let direction = vantage.place(plan.scenario.subject)?.direction;
            let zenith = vantage
                .direction_at(crate::sky::place::Horizontal {
                    azimuth: Angle::ZERO,
                    altitude: Angle::from_degrees(90.0),
                })
                .map_or(Angle::ZERO, |zenith| direction.position_angle(zenith));
            Ok(Dot {
                night,
                instant,
                direction,
                zenith,
            })
        })
        .collect()
}

/// Named stars, where they stand at an instant.
fn stars(list: Option<&str>, instant: Option<Tt>) -> Result<Vec<Vec3>, CliError> {
    let (Some(list), Some(instant)) = (list, instant) else {
        return Ok(Vec::new());
    };
    let catalogue =
        StarCatalogue::embedded().map_err(|error| CliError::Failed(error.to_string()))?;
    list.split(',')
        .map(str::trim)
        .filter(|name| !name.is_empty())
        .map(|name| {
            let star = catalogue.by_name(name).ok_or_else(|| {
                CliError::Words(format!(
                    "no star is called \"{name}\" here; use an IAU name such as Regulus"
                ))
            })?;
            Ok(star.direction_at(instant))
        })
        .collect()
}

fn view<'a>(
    camera: &'a Camera,
    path: &[Vec3],
    stars: &[Vec3],
    wanted: &[Vec3],
    margin: Angle,
) -> Result<View<'a>, CliError> {
    let Camera { lens, sensor } = camera;
    let whole = match longest_lens(wanted, margin, sensor) {
        Ok(best) => Some(best).filter(|best| best.is_held_by(lens)),
        Err(FrameError::TooWide { .. }) => None,
        Err(error) => return Err(frame_failed(error)),
    };
    if let Some(best) = whole {
        return Ok(View {
            camera,
            frame: best.frame(lens, sensor),
            held: 1.0,
            pictures: Some((1, 1)),
        });
    }
    let pictures = match mosaic(wanted, margin, OVERLAP, lens, sensor) {
        Ok(mosaic) => Some((mosaic.columns, mosaic.rows)),
        Err(FrameError::TooManyPictures { .. } | FrameError::TooWide { .. }) => None,
        Err(error) => return Err(frame_failed(error)),
    };
    // With the stars if that can be, else the path alone, at last without a margin.
    let mut run = longest_run(path, stars, margin, lens, sensor).map_err(frame_failed)?;
    if run.is_none() {
        run = longest_run(path, &[], Angle::ZERO, lens, sensor).map_err(frame_failed)?;
    }
    match run {
        Some(run) => Ok(View {
            camera,
            frame: run.frame,
            held: run.frame.part_held(path).fraction,
            pictures,
        }),
        None => Err(CliError::Failed(format!(
            "lens {} holds no point of the path",
            lens.name()
        ))),
    }
}

fn path_lines(
    wanted: &[Vec3],
    margin: Angle,
    dots: &[Dot],
    clock: &LocalClock<'_>,
) -> Result<Vec<String>, CliError> {
    let mut lines = Vec::new();
    match smallest_rectangle(wanted, margin) {
        Ok(rectangle) => lines.push(format!(
            "path, stars and margin fit in {:.1} x {:.1} deg, its short side's direction at position angle {:.0} deg",
            rectangle.width().degrees(),
            rectangle.height().degrees(),
            rectangle.tilt().degrees()
        )),
        Err(error @ FrameError::TooWide { .. }) => lines.push(error.to_string()),
        Err(error) => return Err(frame_failed(error)),
    }
    let pairs = dots
        .iter()
        .enumerate()
        .flat_map(|(k, a)| dots.iter().skip(k + 1).map(move |b| (a, b)));
    let nearest = pairs
        .map(|(a, b)| (a.direction.separation(b.direction), a, b))
        .min_by(|a, b| a.0.radians().total_cmp(&b.0.radians()));
    if let Some((distance, a, b)) = nearest {
        lines.push(format!(
            "{} dots; the two nearest are {:.2} deg apart ({}; {})",
            dots.len(),
            distance.degrees(),
            day_and_part(clock, a.instant),
            day_and_part(clock, b.instant)
        ));
    }
    Ok(lines)
}

fn view_lines(
    view: &View<'_>,
    wanted: &[Vec3],
    margin: Angle,
    dots: &[Dot],
    options: &Options,
    clock: &LocalClock<'_>,
) -> Result<Vec<String>, CliError> {
    let Camera { lens, sensor } = view.camera;
    let field = lens.field(sensor);
    let scale = lens.pixel_scale(sensor);
    let rectangle = view.frame.rectangle();
    let centre = rectangle.centre();
    let mut lines = vec![format!(
        "{}, {} mm f/{}: field {:.1} x {:.1} deg, {:.1}\" a pixel",
        lens.name(),
        lens.focal_length_mm(),
        lens.f_ratio(),
        field.width.degrees(),
        field.height.degrees(),
        scale.arcsec()
    )];
    lines.push(match view.pictures {
        Some((1, 1)) => "  holds all of it in one picture".to_owned(),
        Some((columns, rows)) => format!(
            "  one picture holds {:.0} % of the path; {} side by side ({columns} x {rows}, sharing {:.0} %) hold all of it",
            view.held * 100.0,
            columns * rows,
            OVERLAP * 100.0
        ),
        None => format!(
            "  one picture holds {:.0} % of the path; all of it would take hundreds",
            view.held * 100.0
        ),
    });
    if let Ok(best) = longest_lens(wanted, margin, sensor) {
        lines.push(format!(
            "  on this sensor {} mm is the longest lens that holds all",
            longest_words(&best)
        ));
    }
    lines.push(format!(
        "  aim at RA {:.2} deg, Dec {:+.2} deg; picture's up at position angle {:.0} deg",
        centre.longitude().degrees(),
        centre.latitude().degrees(),
        rectangle.tilt().degrees()
    ));
    let declination = rectangle.declination_nearest_equator();
    let rate = AngularRate::of_the_sky(declination);
    if let Some(seconds) = rate
        .longest_exposure_s(options.trail_pixels, lens, sensor)
        .map_err(number_failed)?
    {
        let mut line = format!(
            "  on a fixed tripod stars trail {} pixels in {seconds:.1} s",
            options.trail_pixels
        );
        if let Ok(thumb) = ThumbRule::FiveHundred.exposure(declination, lens, sensor) {
            line += &format!(
                " ({} allows {:.1} s and trails {:.0} pixels)",
                thumb.rule.label(),
                thumb.seconds,
                thumb.trail_pixels
            );
        }
        lines.push(line);
    }
    let picks: Vec<(Tt, Vec3)> = dots
        .iter()
        .map(|dot| (dot.instant, dot.direction))
        .collect();
    let stack = StarStack::new(view.frame, &picks);
    for (dot, placed) in dots.iter().zip(&stack.dots) {
        let day = day_and_part(clock, dot.instant);
        lines.push(match placed.pixel.filter(|_| placed.held) {
            Some(pixel) => format!(
                "  {day}: x {:.0}, y {:.0}; picture's up leans {:+.0} deg from the zenith",
                pixel.x,
                pixel.y,
                lean(view, dot).degrees()
            ),
            None => format!("  {day}: outside this picture"),
        });
    }
    Ok(lines)
}

fn longest_words(best: &LongestLens) -> String {
    // Rounded down, so that the lens still holds all.
    let length = best.focal_length_mm;
    if length < 100.0 {
        format!("{:.1}", (length * 10.0).floor() / 10.0)
    } else {
        format!("{:.0}", length.floor())
    }
}

/// How far the upward direction of the picture leans from the zenith at a dot, counter-clockwise on the sky (through east).
fn lean(view: &View<'_>, dot: &Dot) -> Angle {
    let north_pole = Vec3::new(0.0, 0.0, 1.0);
    let rectangle = view.frame.rectangle();
    // Upward at the dot: along the great circle to the point where the picture's vertical axis ends.
    let (centre, tilt) = (rectangle.centre(), rectangle.tilt());
    let east = north_pole.cross(centre).unit();
    let north = centre.cross(east);
    let up = north * tilt.cos() + east * tilt.sin();
    (dot.direction.position_angle(up) - dot.zenith).signed()
}

fn table(sky: &Sky, views: &[View<'_>], dots: &[Dot], format: TableFormat) -> Result<(), CliError> {
    let mut table = TableWriter::new(BufWriter::new(stdout().lock()), COLUMNS, format)?;
    for view in views {
        let Camera { lens, sensor } = view.camera;
        let field = lens.field(sensor);
        let rectangle = view.frame.rectangle();
        let centre = rectangle.centre();
        for dot in dots {
            let pixel = view.frame.pixel(dot.direction);
            table.row(&[
                Cell::text(lens.name()),
                Cell::Number(lens.focal_length_mm(), 1),
                Cell::Number(field.width.degrees(), 3),
                Cell::Number(field.height.degrees(), 3),
                Cell::Number(lens.pixel_scale(sensor).arcsec(), 3),
                Cell::Number(view.held, 3),
                view.pictures.map_or(Cell::Empty, |(columns, rows)| {
                    Cell::Digits((columns * rows).to_string())
                }),
                Cell::Number(centre.longitude().degrees(), 4),
                Cell::Number(centre.latitude().degrees(), 4),
                Cell::Number(rectangle.tilt().degrees(), 2),
                Cell::text(dot.night.to_string()),
                Cell::text(utc_second(sky, dot.instant)),
                Cell::Number(dot.direction.longitude().degrees(), 5),
                Cell::Number(dot.direction.latitude().degrees(), 5),
                Cell::number(pixel.map(|pixel| pixel.x), 1),
                Cell::number(pixel.map(|pixel| pixel.y), 1),
                Cell::text(if view.frame.holds(dot.direction) {
                    "yes"
                } else {
                    "no"
                }),
                Cell::Number(lean(view, dot).degrees(), 1),
            ])?;
        }
    }
    table.finish()?;
    Ok(())
}
