//! What makes a number doubtful, carried beside it up to the label on screen and the column in a file.

use std::fmt;

/// One reason to doubt or to be careful with a value.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
#[repr(u8)]
pub enum Caution {
    /// The place comes from the analytic series, not from DE440.
    SeriesPlace,
    /// The magnitude formula is used outside the phase angles it was made for.
    MagnitudeOutsideRange,
    /// Delta-T is a model or a forecast here, not a measurement.
    DeltaTModelled,
    /// The Sun is up and near: never point optics or eyes there.
    SunNear,
}

impl Caution {
    pub const ALL: [Caution; 4] = [
        Caution::SeriesPlace,
        Caution::MagnitudeOutsideRange,
        Caution::DeltaTModelled,
        Caution::SunNear,
    ];

    /// What to know or to do, in a sentence.
    #[must_use]
    pub const fn sentence(self) -> &'static str {
        match self {
            Caution::SeriesPlace => {
                "outside 1550-2650 places come from analytic series: good to 15 arcseconds from Mercury to Mars since 1000 BC, to two arcminutes for all planets since 2000 BC"
            }
            Caution::MagnitudeOutsideRange => {
                "magnitude outside the range its formula was made for"
            }
            Caution::DeltaTModelled => {
                "the Earth's rotation is modelled at this date, not measured"
            }
            Caution::SunNear => {
                "never point optics or eyes near the Sun: wait until the whole disc has set beyond the true horizon"
            }
        }
    }

    /// The word used in tables.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Caution::SeriesPlace => "series-place",
            Caution::MagnitudeOutsideRange => "magnitude-outside-range",
            Caution::DeltaTModelled => "delta-t-modelled",
            Caution::SunNear => "sun-near",
        }
    }
}

/// A set of cautions; empty for a sound value.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub struct Cautions(u8);

impl Cautions {
    pub const NONE: Cautions = Cautions(0);

    #[must_use]
    pub const fn of(caution: Caution) -> Self {
        Cautions(1 << caution as u8)
    }

    #[must_use]
    pub const fn and(self, other: Cautions) -> Self {
        Cautions(self.0 | other.0)
    }

    /// This set with `caution` added where `condition` holds.
    #[must_use]
    pub const fn with_if(self, condition: bool, caution: Caution) -> Self {
        if condition {
            self.and(Cautions::of(caution))
        } else {
            self
        }
    }

    #[must_use]
    pub const fn contains(self, caution: Caution) -> bool {
        self.0 & (1 << caution as u8) != 0
    }

    #[must_use]
    pub const fn is_empty(self) -> bool {
        self.0 == 0
    }

    pub fn iter(self) -> impl Iterator<Item = Caution> {
        Caution::ALL
            .into_iter()
            .filter(move |caution| self.contains(*caution))
    }
}

/// The words of the set, separated by spaces, as tables print them.
impl fmt::Display for Cautions {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let words: Vec<&str> = self.iter().map(Caution::word).collect();
        f.write_str(&words.join(" "))
    }
}

/// A value with what makes it doubtful.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Flagged<T> {
    pub value: T,
    pub cautions: Cautions,
}

impl<T> Flagged<T> {
    #[must_use]
    pub const fn sound(value: T) -> Self {
        Flagged {
            value,
            cautions: Cautions::NONE,
        }
    }
}
