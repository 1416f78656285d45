//! A frame of the strip: the picture kept, the skyline of the moment built anew, everything tessellated; on a headless
//! egui context, 2560 x 1440 points. The budget is 4 ms.
//!
//! 15,000 stars of which 5,000 stand on the strip, eight tracks of 2,000 points, the skyline of the built-in scenario;
//! every frame is another instant, as in scrubbing.

use std::sync::Arc;

use egui::{Pos2, Rect, Vec2};
use loopwright::chart::{
    Layer, Level, MarkId, Outline, OverlayStyle, Paint, Palette, Point, RibbonPoint, Role, Scene,
    Shape, StripView, note_boxes, skyline_overlay,
};
use loopwright::scenario::{Plan, Scenario};
use loopwright::season::moment::{Watch, moment};
use loopwright::sky::{Body, Tt};
use loopwright::window::painter::{Easel, Picture, Placement, Shift};
use loopwright::window::strip_pane::StripMade;

const SIZE: Vec2 = Vec2::new(2560.0, 1440.0);
const SCALE: f64 = 1.6;

fn main() {
    divan::main();
}

struct Stage {
    made: Arc<StripMade>,
    easel: Easel,
    picture: Picture,
    outline: Outline,
    boxes: Vec<loopwright::chart::Rect>,
    ctx: egui::Context,
}

/// A number between 0 and 1: Marsaglia's xorshift, the same sky each time.
fn chance(state: &mut u64) -> f64 {
    *state ^= *state << 13;
    *state ^= *state >> 7;
    *state ^= *state << 17;
    (*state >> 11) as f64 / (1_u64 << 53) as f64
}

fn crowd(scene: &mut Scene) {
    let mut state = 0x9E37_79B9_7F4A_7C15;
    for star in 0..15_000 {
        // A third of them on the sheet.
        let x = (3.0 * chance(&mut state) - 1.0) * scene.width;
        let shape = Shape::Disc {
            centre: Point::new(x, chance(&mut state) * scene.height),
            radius: 0.5 + 2.0 * chance(&mut state).powi(4),
            fill: Paint::of(Role::Star),
        };
        scene.add(MarkId::Star(star), Layer::Stars, shape);
    }
    for track in 0..8 {
        let points = (0..2_000)
            .map(|index| {
                let part = f64::from(index) / 2_000.0;
                let wave = libm::sin(9.0 * part + f64::from(track)) * scene.height * 0.3;
                RibbonPoint {
                    at: Point::new(part * scene.width, scene.height / 2.0 + wave),
                    width: 3.0,
                    paint: Paint::mixed(Role::Subject, Role::SubjectLate, part),
                    index: index as usize,
                }
            })
            .collect();
        scene.add(
            MarkId::Track(Body::Mars),
            Layer::Track,
            Shape::Ribbon(points),
        );
    }
    scene.sort();
}

fn stage() -> Stage {
    let plan = Plan::new(
        Scenario::embedded().expect("built in"),
        Tt::from_days(9_800.0),
    )
    .expect("a season");
    let view = StripView {
        width: f64::from(SIZE.x) / SCALE,
        height: f64::from(SIZE.y) / SCALE,
        furniture: false,
        ..StripView::A4
    };
    let mut made = StripMade::new(Arc::new(plan), view);
    crowd(&mut made.scene);
    let easel = Easel {
        placement: Placement {
            left: 0.0,
            top: 0.0,
            scale: SCALE,
        },
        palette: Palette::DARK,
        pixels_per_point: 1.0,
        clip: Rect::from_min_size(Pos2::ZERO, SIZE),
    };
    let scenario = &made.plan.scenario;
    let ctx = egui::Context::default();
    loopwright::window::theme::prepare(&ctx);
    Stage {
        picture: Picture::new(&made.scene, easel.clone(), Level::of_strip),
        outline: Outline::new(scenario.skyline.polygon(), &scenario.site.air),
        boxes: note_boxes(&made.scene),
        made: Arc::new(made),
        easel,
        ctx,
    }
}

impl Stage {
    fn overlay(&self, instant: Tt) -> Picture {
        let plan = &self.made.plan;
        let scenario = &plan.scenario;
        let watch = Watch {
            sky: &plan.sky,
            site: &scenario.site,
            skyline: scenario.skyline.polygon(),
            subject: plan.season.subject,
            companions: &scenario.companions,
            sun_distance: scenario.sun_distance,
        };
        let moment = moment(&watch, instant).expect("covered");
        let style = OverlayStyle {
            width: self.made.view.width,
            height: self.made.view.height,
            text_scale: 1.0,
            sun_distance: scenario.sun_distance,
            keep_clear: &self.boxes,
        };
        let scene = skyline_overlay(
            &plan.season,
            &self.made.layout,
            &self.outline,
            &moment,
            &style,
        );
        Picture::new(&scene, self.easel.clone(), Level::of_overlay)
    }

    fn frame(&self, instant: Tt) -> usize {
        let over = self.overlay(instant);
        let input = egui::RawInput {
            screen_rect: Some(self.easel.clip),
            ..egui::RawInput::default()
        };
        let output = self.ctx.run_ui(input, |ui| {
            self.picture
                .show(ui.painter(), Shift::NONE, &[], Some(&over));
        });
        self.ctx.tessellate(output.shapes, 1.0).len()
    }
}

/// What a frame costs while scrubbing: moment, overlay, shapes, tessellation.
#[divan::bench]
fn frame_while_scrubbing(bencher: divan::Bencher<'_, '_>) {
    let stage = stage();
    let from = stage.made.plan.season.span.middle();
    let mut minutes = 0.0;
    bencher.bench_local(|| {
        minutes += 10.0;
        stage.frame(from.plus_seconds(60.0 * (minutes % 100_000.0)))
    });
}

/// What the moment's overlay costs alone.
#[divan::bench]
fn overlay_alone(bencher: divan::Bencher<'_, '_>) {
    let stage = stage();
    let from = stage.made.plan.season.span.middle();
    let mut minutes = 0.0;
    bencher.bench_local(|| {
        minutes += 10.0;
        stage
            .overlay(from.plus_seconds(60.0 * (minutes % 100_000.0)))
            .vertices()
    });
}

/// The picture that is kept: made again only when the chart, the window or the colours change.
#[divan::bench]
fn picture_made_again(bencher: divan::Bencher<'_, '_>) {
    let stage = stage();
    bencher.bench_local(|| {
        Picture::new(&stage.made.scene, stage.easel.clone(), Level::of_strip).vertices()
    });
}

/// Laying the chart out: on the worker, when the view changes.
#[divan::bench(sample_count = 20)]
fn strip_laid_out(bencher: divan::Bencher<'_, '_>) {
    let stage = stage();
    bencher.bench_local(|| {
        StripMade::new(Arc::clone(&stage.made.plan), stage.made.view.clone())
            .scene
            .marks
            .len()
    });
}
