//! The window through its accessibility tree, without a display; and what the program does where there is none.
//!
//! Numbers on screen are held against the engine asked anew: the engine itself is tested against outside sources
//! elsewhere. A day of the stars is 86 164.0989 s of UT1 (IAU 2000 resolution B1.8).

use std::path::Path;
use std::process::{Command, Output};

use egui::{Key, Modifiers};
use egui_kittest::Harness;
use egui_kittest::kittest::{NodeT, Queryable};
use loopwright::scenario::Scenario;
use loopwright::season::EventKind;
use loopwright::sky::calendar::parse_utc;
use loopwright::sky::delta_t::TimeTables;
use loopwright::sky::stars::StarCatalogue;
use loopwright::sky::{Body, Tt};
use loopwright::window::Window;
use loopwright::window::state::Panel;

const SIZE: egui::Vec2 = egui::Vec2::new(1280.0, 800.0);

fn harness_of(scenario: Scenario, path: Option<&Path>) -> Harness<'static, Window> {
    let path = path.map(Path::to_owned);
    let mut harness = Harness::builder().with_size(SIZE).build_eframe(|cc| {
        Window::new(&cc.egui_ctx, scenario, path, Tt::from_days(9_800.0)).unwrap()
    });
    settle(&mut harness);
    harness
}

fn harness() -> Harness<'static, Window> {
    harness_of(Scenario::embedded().unwrap(), None)
}

/// Runs until neither the window nor its worker has anything to do.
fn settle(harness: &mut Harness<'_, Window>) {
    for _ in 0..4 {
        harness.run_steps(2);
        harness.state_mut().finish_work();
    }
    harness.run();
    assert!(!harness.state().is_working());
}

fn press(harness: &mut Harness<'_, Window>, key: Key) {
    harness.key_press(key);
    settle(harness);
}

fn click(harness: &mut Harness<'_, Window>, label: &str) {
    harness.get_by_label(label).click();
    settle(harness);
}

fn instant(harness: &Harness<'_, Window>) -> Tt {
    harness.state().state().view.instant
}

fn type_date(harness: &mut Harness<'_, Window>, text: &str) {
    press(harness, Key::D);
    harness
        .get_by_label("date and time at the site")
        .type_text(text);
    press(harness, Key::Enter);
}

/// Altitude of the Sun's centre at the window's instant and site, degrees, from the engine.
fn sun_altitude(harness: &Harness<'_, Window>) -> f64 {
    let plan = harness.state().state().plan.clone().unwrap();
    let vantage = plan
        .sky
        .observer(&plan.scenario.site, instant(harness))
        .unwrap();
    let sun = vantage.place(Body::Sun).unwrap();
    vantage.horizontal(sun.apparent).unwrap().altitude.degrees()
}

fn assert_shows_elongation(harness: &Harness<'_, Window>) {
    let plan = harness.state().state().plan.clone().unwrap();
    let vantage = plan
        .sky
        .observer(&plan.scenario.site, instant(harness))
        .unwrap();
    let (mars, sun) = (
        vantage.place(Body::Mars).unwrap(),
        vantage.place(Body::Sun).unwrap(),
    );
    let angle = mars.separation(&sun).degrees();
    let side = mars.side_of(&sun).word();
    harness.get_by_label(&format!("elongation {angle:.1}\u{b0} {side}"));
    harness.get_by_label(&format!("distance {:.3} au", mars.distance_au));
}

#[test]
fn the_season_opens_with_its_three_views() {
    let harness = harness();
    assert_shows_elongation(&harness);
    harness.get_by_label_contains("strip at ");
    let timeline = harness.get_by_label("timeline, night of the season");
    assert!(timeline.accesskit_node().value().unwrap().contains("2027"));
    // More than half of the window.
    let strip = harness.get_by_label_contains("strip at ").rect();
    assert!(strip.area() > SIZE.x * SIZE.y / 2.0, "{strip:?}");
}

#[test]
fn scrubbing_changes_the_readings_to_the_numbers_of_the_engine() {
    let mut harness = harness();
    let before = instant(&harness);
    press(&mut harness, Key::ArrowRight);
    assert!((instant(&harness).days() - before.days() - 1.0).abs() < 1e-9);
    assert_shows_elongation(&harness);

    harness
        .get_by_label("timeline, night of the season")
        .set_value_accesskit(30.0);
    settle(&mut harness);
    let season = harness.state().state().plan.clone().unwrap().season.span;
    assert!((instant(&harness).days() - season.from.days() - 30.0).abs() < 1.5);
    assert_shows_elongation(&harness);

    let rect = harness.get_by_label("timeline, night of the season").rect();
    let at = instant(&harness);
    let from = rect.center();
    harness.drag_at(from);
    harness.run_steps(1);
    for step in 1..=10 {
        harness.hover_at(from + egui::vec2(12.0 * step as f32, 0.0));
        harness.run_steps(1);
    }
    harness.drop_at(from + egui::vec2(120.0, 0.0));
    settle(&mut harness);
    assert!(
        instant(&harness).days() - at.days() > 60.0,
        "the drag went from December to March"
    );
    assert_shows_elongation(&harness);
}

#[test]
fn holding_the_stars_their_places_over_the_horizon_stay() {
    let mut harness = harness();
    click(&mut harness, "hold the stars");
    let regulus = StarCatalogue::embedded()
        .unwrap()
        .by_name("Regulus")
        .unwrap();
    let place = |harness: &Harness<'_, Window>| {
        harness
            .state()
            .moment()
            .unwrap()
            .axes
            .horizontal(regulus.direction)
    };
    let (before, began) = (place(&harness), instant(&harness));
    for _ in 0..20 {
        press(&mut harness, Key::ArrowRight);
        let now = place(&harness);
        // Precession and nutation turn the pole by less than 2" in 20 days.
        assert!((now.altitude - before.altitude).abs().degrees() < 0.002);
        assert!((now.azimuth - before.azimuth).signed().abs().degrees() < 0.004);
    }
    let seconds = (instant(&harness).days() - began.days()) * 86_400.0;
    assert!((seconds - 20.0 * 86_164.098_9).abs() < 0.1, "{seconds}");
    assert_shows_elongation(&harness);
}

#[test]
fn holding_the_sun_its_altitude_stays() {
    let mut harness = harness();
    click(&mut harness, "hold the Sun's altitude");
    let before = sun_altitude(&harness);
    for _ in 0..30 {
        press(&mut harness, Key::ArrowRight);
        let now = sun_altitude(&harness);
        assert!((now - before).abs() < 0.01, "{now} {before}");
    }
    harness.get_by_label_contains(&format!(
        "Sun {}\u{b0}",
        format!("{before:.1}").replace('-', "\u{2212}")
    ));
}

#[test]
fn holding_the_clock_it_stays_over_the_change_to_summer_time() {
    let mut harness = harness();
    type_date(&mut harness, "2027-03-27 20:30");
    press(&mut harness, Key::ArrowRight);
    // Central European summer time begins on the last Sunday of March, 1h UTC (Directive 2000/84/EC): 28 March 2027.
    let wanted = TimeTables::embedded().tt_from_utc(parse_utc("2027-03-28T18:30:00Z").unwrap());
    assert!((instant(&harness).days() - wanted.days()).abs() < 1e-6);
}

#[test]
fn everything_can_be_done_with_the_keyboard() {
    let mut harness = harness();
    let view = |harness: &Harness<'_, Window>| harness.state().state().view.clone();
    press(&mut harness, Key::F1);
    assert_eq!(view(&harness).panel, Panel::Keys);
    press(&mut harness, Key::Escape);
    assert_eq!(view(&harness).panel, Panel::None);

    press(&mut harness, Key::L);
    let on_loop = view(&harness).sky.unwrap();
    press(&mut harness, Key::ArrowUp);
    assert!(view(&harness).sky.unwrap().degrees_across < on_loop.degrees_across);
    assert!(
        harness.state().strip().unwrap().view.window == view(&harness).sky,
        "the strip follows"
    );
    press(&mut harness, Key::W);
    assert_eq!(view(&harness).sky, None);

    let is_turned = harness.state().strip().unwrap().view.east_left;
    press(&mut harness, Key::U);
    assert_ne!(harness.state().strip().unwrap().view.east_left, is_turned);
    press(&mut harness, Key::K);
    assert!(!view(&harness).skyline);
    let theme = view(&harness).theme;
    press(&mut harness, Key::T);
    assert_ne!(view(&harness).theme, theme);

    press(&mut harness, Key::Home);
    press(&mut harness, Key::PageDown);
    let plan = harness.state().state().plan.clone().unwrap();
    let first = plan
        .season
        .events
        .iter()
        .find(|event| event.kind != EventKind::Perihelion)
        .unwrap();
    assert_eq!(instant(&harness), first.instant);

    type_date(&mut harness, "2027-02-12 18:50");
    harness.get_by_label_contains("17:50 UTC");
    type_date(&mut harness, "2027-02-30");
    harness.get_by_label_contains("2027-02-30");

    // The arrows step whatever has the focus, but not while a text is typed.
    press(&mut harness, Key::Escape);
    let before = instant(&harness);
    for _ in 0..6 {
        press(&mut harness, Key::Tab);
    }
    press(&mut harness, Key::ArrowLeft);
    let moved = before.days() - instant(&harness).days();
    let typing = harness.ctx.text_edit_focused();
    assert!(typing || (moved - 1.0).abs() < 0.1, "{moved}");
}

#[test]
fn the_step_is_typed_and_told_when_wrong() {
    let mut harness = harness();
    let before = instant(&harness);
    harness.get_by_label("length of a step").focus();
    settle(&mut harness);
    harness.key_press_modifiers(Modifiers::COMMAND, Key::A);
    harness.get_by_label("length of a step").type_text("10 min");
    press(&mut harness, Key::Enter);
    click(&mut harness, "on by a step");
    assert!(((instant(&harness).days() - before.days()) * 1_440.0 - 10.0).abs() < 1e-6);

    harness.get_by_label("length of a step").focus();
    settle(&mut harness);
    harness.key_press_modifiers(Modifiers::COMMAND, Key::A);
    harness
        .get_by_label("length of a step")
        .type_text("a while");
    press(&mut harness, Key::Enter);
    harness.get_by_label_contains("a while");
    click(&mut harness, "on by a step");
    assert!(
        ((instant(&harness).days() - before.days()) * 1_440.0 - 20.0).abs() < 1e-6,
        "the old step stays"
    );
}

#[test]
fn a_press_on_the_path_goes_to_that_day() {
    let mut harness = harness();
    let made = harness.state().strip().unwrap().clone();
    let season = &made.plan.season;
    let sample = &season.track.points[43];
    let row = made.layout.rows[0];
    let point = row.point_of(season.frame.ecliptic_from_icrs * sample.direction);
    let rect = harness.get_by_label_contains("strip at ").rect();
    let scale = f64::from(rect.width()) / made.view.width;
    let pos = rect.min + egui::vec2((point.x * scale) as f32, (point.y * scale) as f32);
    harness.hover_at(pos);
    harness.run_steps(2);
    harness.get_by_label_contains("Mars, ");
    harness.drag_at(pos);
    harness.run_steps(1);
    harness.drop_at(pos);
    settle(&mut harness);
    assert!((instant(&harness).days() - sample.instant.days()).abs() < 1.01);
}

#[test]
fn the_sun_caution_stands_while_the_sun_is_up_and_near() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios/mercury-roofs-2029.ron");
    let mut harness = harness_of(Scenario::load(&folder).unwrap(), Some(&folder));
    type_date(&mut harness, "2029-05-13 12:00");
    harness.get_by_label_contains("Never point optics or eyes");
    type_date(&mut harness, "2029-05-13 00:30");
    assert!(
        harness
            .query_by_label_contains("Never point optics or eyes")
            .is_none()
    );
}

#[test]
fn an_edit_is_planned_undone_and_never_lost_silently() {
    let folder = tempfile::tempdir().unwrap();
    let mut harness = harness();
    press(&mut harness, Key::E);
    click(&mut harness, "Jupiter as the subject");
    click(&mut harness, "plan this season");
    let subject = |harness: &Harness<'_, Window>| {
        harness
            .state()
            .state()
            .plan
            .as_ref()
            .unwrap()
            .season
            .subject
    };
    assert_eq!(subject(&harness), Body::Jupiter);
    harness.get_by_label("not saved");

    // What is wrong stands beside its field, and nothing is planned.
    harness.get_by_label("latitude, \u{b0} north").focus();
    settle(&mut harness);
    harness.key_press_modifiers(Modifiers::COMMAND, Key::A);
    harness
        .get_by_label("latitude, \u{b0} north")
        .type_text("95");
    settle(&mut harness);
    harness.get_by_label_contains("from -90 to 90");
    press(&mut harness, Key::Enter);
    assert!(
        harness
            .state()
            .state()
            .document
            .scenario
            .site
            .latitude
            .degrees()
            < 60.0
    );

    // Opening another season asks first.
    let path = folder.path().join("kept.ron");
    Scenario::embedded().unwrap().save(&path).unwrap();
    harness.key_press_modifiers(Modifiers::COMMAND, Key::O);
    settle(&mut harness);
    harness
        .get_by_label("file")
        .type_text(path.to_str().unwrap());
    press(&mut harness, Key::Enter);
    harness.get_by_label("The season has changes that are not saved.");
    assert_eq!(subject(&harness), Body::Jupiter);
    click(&mut harness, "go on editing");
    assert!(
        harness
            .query_by_label("The season has changes that are not saved.")
            .is_none()
    );

    harness.key_press_modifiers(Modifiers::COMMAND, Key::Z);
    settle(&mut harness);
    assert_eq!(subject(&harness), Body::Mars);
    assert!(!harness.state().state().document.is_changed());
}

#[test]
fn a_season_is_saved_and_read_back_with_its_theme() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("winter.ron");
    let mut harness = harness();
    click(&mut harness, "dark theme");
    harness.key_press_modifiers(Modifiers::COMMAND, Key::S);
    settle(&mut harness);
    harness
        .get_by_label("file")
        .type_text(path.to_str().unwrap());
    press(&mut harness, Key::Enter);
    let mut wanted = Scenario::embedded().unwrap();
    wanted.view.theme = loopwright::scenario::Theme::Dark;
    assert_eq!(Scenario::load(&path).unwrap(), wanted);
    assert!(!harness.state().state().document.is_changed());
}

#[test]
fn a_missing_file_is_told_in_the_window() {
    let mut harness = harness();
    harness.key_press_modifiers(Modifiers::COMMAND, Key::O);
    settle(&mut harness);
    harness
        .get_by_label("file")
        .type_text("/nowhere/at-all.ron");
    press(&mut harness, Key::Enter);
    harness.get_by_label_contains("/nowhere/at-all.ron");
    assert_shows_elongation(&harness);
}

#[test]
fn the_readings_are_copied_as_text() {
    let mut harness = harness();
    press(&mut harness, Key::C);
    harness.get_by_label("The readings are copied as text.");
    let text = harness.state().readings_text().unwrap();
    let plan = harness.state().state().plan.clone().unwrap();
    assert!(text.starts_with(&plan.scenario.site.name), "{text}");
    assert!(
        text.contains("\nelongation ") && text.contains(" au\n") && text.contains("Jupiter: "),
        "{text}"
    );
}

/// egui asks for a frame at once, later or never: an idle window must ask for none.
#[test]
fn an_idle_window_repaints_nothing() {
    let mut harness = harness();
    for _ in 0..3 {
        harness.step();
    }
    let root = harness.output().viewport_output[&egui::ViewportId::ROOT].clone();
    assert_eq!(root.repaint_delay, std::time::Duration::MAX);

    harness.key_press(Key::P);
    harness.step();
    harness.step();
    let root = harness.output().viewport_output[&egui::ViewportId::ROOT].clone();
    assert!(
        root.repaint_delay < std::time::Duration::from_secs(1),
        "playing asks for frames"
    );
    harness.key_press(Key::P);
    harness.step();
    settle(&mut harness);
    harness.step();
    let root = harness.output().viewport_output[&egui::ViewportId::ROOT].clone();
    assert_eq!(root.repaint_delay, std::time::Duration::MAX);
}

/// The program as a user without a window system runs it.
fn run_without_window(display: Option<&str>, words: &[&str]) -> (Output, tempfile::TempDir) {
    let folder = tempfile::tempdir().unwrap();
    let mut command = Command::new(env!("CARGO_BIN_EXE_loopwright"));
    command.args(words).current_dir(folder.path());
    for name in ["DISPLAY", "WAYLAND_DISPLAY", "WAYLAND_SOCKET"] {
        command.env_remove(name);
    }
    if let Some(display) = display {
        command.env("DISPLAY", display);
    }
    (command.output().unwrap(), folder)
}

fn assert_sheet_instead(output: &Output, folder: &Path, reason: &str) {
    let error = String::from_utf8_lossy(&output.stderr);
    assert!(output.status.success(), "{error}");
    let told: Vec<&str> = error
        .lines()
        .filter(|line| line.contains("No window"))
        .collect();
    assert_eq!(told.len(), 1, "{error}");
    assert!(told[0].contains(reason), "{error}");
    assert!(
        !error.contains("panicked") && !error.contains(".rs:"),
        "{error}"
    );
    for name in ["strip.svg", "strip.png", "events.csv", "places.csv"] {
        assert!(folder.join("season-sheet").join(name).exists(), "{name}");
    }
}

#[test]
fn without_a_display_the_season_sheet_is_written() {
    let (output, folder) = run_without_window(None, &[]);
    assert_sheet_instead(&output, folder.path(), "no display");
    let (output, folder) = run_without_window(Some(""), &[]);
    assert_sheet_instead(&output, folder.path(), "no display");
}

#[test]
fn with_a_dead_display_the_season_sheet_is_written() {
    let (output, folder) = run_without_window(Some(":9731"), &[]);
    // On a machine without the X11 libraries the reason is another one.
    assert_sheet_instead(&output, folder.path(), "No window, as ");
}

#[test]
fn a_missing_file_is_told_on_the_command_line() {
    let (output, folder) = run_without_window(None, &["nowhere.ron"]);
    assert_eq!(output.status.code(), Some(1));
    let error = String::from_utf8_lossy(&output.stderr);
    assert!(error.contains("nowhere.ron"), "{error}");
    assert!(!folder.path().join("season-sheet").exists());
}
