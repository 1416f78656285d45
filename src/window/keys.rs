//! The keys, in one table: what is pressed, what it does, and the words that the help shows.

use egui::{Context, Key, Modifiers};

use super::state::{Action, Panel, View};
use super::strip_pane::{StripPane, on_loop, zoomed_about_middle};
use crate::scenario::{Plan, Theme};
use crate::season::hold::Hold;

/// What keys can ask for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Command {
    StepOn,
    StepBack,
    TenOn,
    TenBack,
    NextEvent,
    PreviousEvent,
    SeasonStart,
    SeasonEnd,
    Play,
    Faster,
    Slower,
    NextHold,
    TypeDate,
    FitLoop,
    FitSeason,
    Nearer,
    Farther,
    TurnRound,
    Skyline,
    NextTheme,
    LargerText,
    SmallerText,
    EditSeason,
    Open,
    Save,
    SaveAs,
    Undo,
    Redo,
    Copy,
    Help,
    Put,
}

/// A key with what it does.
pub struct Binding {
    pub key: Key,
    pub modifiers: Modifiers,
    /// As the help writes the key.
    pub shown: &'static str,
    pub words: &'static str,
    pub command: Command,
}

const fn plain(key: Key, shown: &'static str, words: &'static str, command: Command) -> Binding {
    Binding {
        key,
        modifiers: Modifiers::NONE,
        shown,
        words,
        command,
    }
}

const fn shift(key: Key, shown: &'static str, words: &'static str, command: Command) -> Binding {
    Binding {
        key,
        modifiers: Modifiers::SHIFT,
        shown,
        words,
        command,
    }
}

const fn ctrl(key: Key, shown: &'static str, words: &'static str, command: Command) -> Binding {
    Binding {
        key,
        modifiers: Modifiers::COMMAND,
        shown,
        words,
        command,
    }
}

const CTRL_SHIFT: Modifiers = Modifiers {
    shift: true,
    ..Modifiers::COMMAND
};

/// Every key of the window. Those with more modifiers stand before those with fewer.
pub const BINDINGS: [Binding; 31] = [
    Binding {
        key: Key::S,
        modifiers: CTRL_SHIFT,
        shown: "Ctrl Shift S",
        words: "save under another name",
        command: Command::SaveAs,
    },
    Binding {
        key: Key::Z,
        modifiers: CTRL_SHIFT,
        shown: "Ctrl Shift Z",
        words: "redo",
        command: Command::Redo,
    },
    ctrl(
        Key::Z,
        "Ctrl Z",
        "undo a change of the season",
        Command::Undo,
    ),
    ctrl(Key::O, "Ctrl O", "open a file", Command::Open),
    ctrl(Key::S, "Ctrl S", "save", Command::Save),
    ctrl(Key::Plus, "Ctrl +", "larger text", Command::LargerText),
    ctrl(
        Key::Minus,
        "Ctrl \u{2212}",
        "smaller text",
        Command::SmallerText,
    ),
    shift(
        Key::ArrowRight,
        "Shift \u{2192}",
        "ten steps on",
        Command::TenOn,
    ),
    shift(
        Key::ArrowLeft,
        "Shift \u{2190}",
        "ten steps back",
        Command::TenBack,
    ),
    plain(Key::ArrowRight, "\u{2192}", "a step on", Command::StepOn),
    plain(Key::ArrowLeft, "\u{2190}", "a step back", Command::StepBack),
    plain(Key::PageDown, "Page down", "next event", Command::NextEvent),
    plain(
        Key::PageUp,
        "Page up",
        "event before",
        Command::PreviousEvent,
    ),
    plain(
        Key::Home,
        "Home",
        "beginning of the season",
        Command::SeasonStart,
    ),
    plain(Key::End, "End", "end of the season", Command::SeasonEnd),
    plain(Key::P, "P", "play or pause", Command::Play),
    plain(Key::Period, ".", "play faster", Command::Faster),
    plain(Key::Comma, ",", "play slower", Command::Slower),
    plain(
        Key::H,
        "H",
        "hold the next: clock, Sun, stars",
        Command::NextHold,
    ),
    plain(Key::D, "D", "type a date", Command::TypeDate),
    plain(
        Key::L,
        "L",
        "the loop, as large as it fits",
        Command::FitLoop,
    ),
    plain(Key::W, "W", "the whole season", Command::FitSeason),
    plain(Key::ArrowUp, "\u{2191}", "nearer", Command::Nearer),
    plain(Key::ArrowDown, "\u{2193}", "farther", Command::Farther),
    plain(Key::U, "U", "turn the strip round", Command::TurnRound),
    plain(Key::K, "K", "skyline on or off", Command::Skyline),
    plain(
        Key::T,
        "T",
        "next theme: light, dark, red",
        Command::NextTheme,
    ),
    plain(Key::E, "E", "edit the season", Command::EditSeason),
    plain(Key::C, "C", "copy the readings", Command::Copy),
    plain(Key::F1, "F1", "these keys", Command::Help),
    plain(
        Key::Escape,
        "Esc",
        "close what is open, pause",
        Command::Put,
    ),
];

/// What was pressed. While a text is typed only keys with Ctrl count.
#[must_use]
pub fn pressed(ctx: &Context) -> Vec<Command> {
    let typing = ctx.text_edit_focused();
    let mut commands = Vec::new();
    for binding in &BINDINGS {
        if typing && !binding.modifiers.command && binding.command != Command::Help {
            continue;
        }
        // A slow frame may hold several presses of a key.
        let count =
            ctx.input_mut(|input| input.count_and_consume_key(binding.modifiers, binding.key));
        commands.extend(std::iter::repeat_n(binding.command, count));
    }
    commands
}

/// The action behind a command; `None` where there is nothing to do now, or where it concerns fields alone.
#[must_use]
pub fn action(
    command: Command,
    view: &View,
    plan: Option<&Plan>,
    strip: &StripPane,
) -> Option<Action> {
    let toggle = |panel: Panel| {
        Action::ShowPanel(if view.panel == panel {
            Panel::None
        } else {
            panel
        })
    };
    Some(match command {
        Command::StepOn => Action::Step(1),
        Command::StepBack => Action::Step(-1),
        Command::TenOn => Action::Step(10),
        Command::TenBack => Action::Step(-10),
        Command::NextEvent => Action::NextEvent,
        Command::PreviousEvent => Action::PreviousEvent,
        Command::SeasonStart => Action::SeasonStart,
        Command::SeasonEnd => Action::SeasonEnd,
        Command::Play => Action::Play(!view.playing),
        Command::Faster => Action::Speed(1),
        Command::Slower => Action::Speed(-1),
        Command::NextHold => Action::SetHold(match view.hold {
            Hold::Clock => Hold::Sun,
            Hold::Sun => Hold::Stars,
            Hold::Stars => Hold::Clock,
        }),
        Command::FitLoop => fit_loop(view, plan?, strip)?,
        Command::FitSeason => Action::ShowSky(None),
        Command::Nearer => zoomed_about_middle(strip.wanted.as_ref()?, plan?, 1.25)?,
        Command::Farther => zoomed_about_middle(strip.wanted.as_ref()?, plan?, 0.8)?,
        Command::TurnRound => Action::TurnRound,
        Command::Skyline => Action::ShowSkyline(!view.skyline),
        Command::NextTheme => Action::SetTheme(match view.theme {
            Theme::Light => Theme::Dark,
            Theme::Dark => Theme::Red,
            Theme::Red => Theme::Light,
        }),
        Command::LargerText => Action::TextScale(1),
        Command::SmallerText => Action::TextScale(-1),
        Command::EditSeason => toggle(Panel::Season),
        Command::Open => toggle(Panel::Open),
        Command::SaveAs => Action::ShowPanel(Panel::Save),
        Command::Undo => Action::Undo,
        Command::Redo => Action::Redo,
        Command::Copy => Action::CopyReadings,
        Command::Help => toggle(Panel::Keys),
        Command::Put if view.panel != Panel::None => Action::ShowPanel(Panel::None),
        Command::Put if view.playing => Action::Play(false),
        Command::Put | Command::TypeDate | Command::Save => return None,
    })
}

/// Shows the loop nearest to the moment.
#[must_use]
pub fn fit_loop(view: &View, plan: &Plan, strip: &StripPane) -> Option<Action> {
    let wanted = strip.wanted.as_ref()?;
    let aspect = wanted.width / wanted.height.max(1.0);
    on_loop(&plan.season, aspect, view.instant).map(|window| Action::ShowSky(Some(window)))
}
