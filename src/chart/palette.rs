//! Colours by what they are for. A chart names roles; a palette turns them into colours at output.
//!
//! Text roles reach a contrast of at least 4.5 : 1 on the ground and the plate in the light and the dark theme
//! (WCAG 2.2, success criterion 1.4.3), lines that carry meaning at least 3 : 1 (1.4.11). The red theme keeps one
//! hue and little light, for eyes used to the dark.

/// What a colour is for.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Role {
    /// The sheet.
    Ground,
    /// The piece of sky within the sheet.
    Plate,
    Ink,
    FaintInk,
    /// Names of constellations, set wide and pale.
    RegionName,
    /// Frames, scales, leaders.
    Hairline,
    /// Constellation boundaries, the faintest line.
    Boundary,
    /// The subject early in the season.
    Subject,
    /// The subject late in the season.
    SubjectLate,
    Retrograde,
    Companion,
    Sun,
    Star,
    StarWarm,
    StarCool,
    Skyline,
    Dusk,
    Caution,
    Selection,
    /// The sky of a night without the Moon.
    Night,
    /// The sky under the Moon, and the Moon itself.
    Moonlight,
}

impl Role {
    pub const ALL: [Role; 21] = [
        Role::Ground,
        Role::Plate,
        Role::Ink,
        Role::FaintInk,
        Role::RegionName,
        Role::Hairline,
        Role::Boundary,
        Role::Subject,
        Role::SubjectLate,
        Role::Retrograde,
        Role::Companion,
        Role::Sun,
        Role::Star,
        Role::StarWarm,
        Role::StarCool,
        Role::Skyline,
        Role::Dusk,
        Role::Caution,
        Role::Selection,
        Role::Night,
        Role::Moonlight,
    ];

    /// The roles in which text may be set.
    pub const TEXT: [Role; 7] = [
        Role::Ink,
        Role::FaintInk,
        Role::RegionName,
        Role::Companion,
        Role::Sun,
        Role::Caution,
        Role::Selection,
    ];

    /// The word that stands for the role in text dumps.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Role::Ground => "ground",
            Role::Plate => "plate",
            Role::Ink => "ink",
            Role::FaintInk => "faint-ink",
            Role::RegionName => "region-name",
            Role::Hairline => "hairline",
            Role::Boundary => "boundary",
            Role::Subject => "subject",
            Role::SubjectLate => "subject-late",
            Role::Retrograde => "retrograde",
            Role::Companion => "companion",
            Role::Sun => "sun",
            Role::Star => "star",
            Role::StarWarm => "star-warm",
            Role::StarCool => "star-cool",
            Role::Skyline => "skyline",
            Role::Dusk => "dusk",
            Role::Caution => "caution",
            Role::Selection => "selection",
            Role::Night => "night",
            Role::Moonlight => "moonlight",
        }
    }
}

/// A colour in sRGB.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Rgb {
    pub red: u8,
    pub green: u8,
    pub blue: u8,
}

impl Rgb {
    /// From a number such as `0xF4EEDF`.
    const fn hex(number: u32) -> Self {
        let [_, red, green, blue] = number.to_be_bytes();
        Rgb { red, green, blue }
    }

    /// The colour at `part` (0 to 1) of the way to `other`, in sRGB components.
    #[must_use]
    pub fn mixed(self, other: Rgb, part: f64) -> Rgb {
        let part = part.clamp(0.0, 1.0);
        let mix = |from: u8, to: u8| {
            let value = f64::from(from) + (f64::from(to) - f64::from(from)) * part;
            // Within 0 to 255 by construction.
            value.round() as u8
        };
        Rgb {
            red: mix(self.red, other.red),
            green: mix(self.green, other.green),
            blue: mix(self.blue, other.blue),
        }
    }
}

/// A theme.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Palette {
    pub name: &'static str,
    colours: [Rgb; Role::ALL.len()],
}

impl Palette {
    /// Warm paper, blue-black ink: the theme of what is printed.
    pub const LIGHT: Palette = Palette::of(
        "light",
        [
            (Role::Ground, 0xF5_EFE1),
            (Role::Plate, 0xFA_F6EB),
            (Role::Ink, 0x1B_2431),
            (Role::FaintInk, 0x5F_5B50),
            (Role::RegionName, 0x74_6B5B),
            (Role::Hairline, 0x8F_8876),
            (Role::Boundary, 0xD8_CFBA),
            (Role::Subject, 0xB0_7A1E),
            (Role::SubjectLate, 0x4A_2320),
            (Role::Retrograde, 0xB8_321C),
            (Role::Companion, 0x2F_6E86),
            (Role::Sun, 0x6F_695E),
            (Role::Star, 0x2A_3340),
            (Role::StarWarm, 0x9A_4A1E),
            (Role::StarCool, 0x1F_4A86),
            (Role::Skyline, 0xCF_C4AC),
            (Role::Dusk, 0x9F_B0B8),
            (Role::Caution, 0xA8_2312),
            (Role::Selection, 0x1D_5FA8),
            (Role::Night, 0x7F_929D),
            (Role::Moonlight, 0xEC_E9DC),
        ],
    );

    /// Warm blue-black ground, lines in the tone of old paper.
    pub const DARK: Palette = Palette::of(
        "dark",
        [
            (Role::Ground, 0x0D_1118),
            (Role::Plate, 0x12_1822),
            (Role::Ink, 0xF1_E8D4),
            (Role::FaintInk, 0xAD_A38C),
            (Role::RegionName, 0x87_8272),
            (Role::Hairline, 0x6F_6C63),
            (Role::Boundary, 0x2B_323C),
            (Role::Subject, 0xA0_7530),
            (Role::SubjectLate, 0xFB_EECB),
            (Role::Retrograde, 0xFA_6E4C),
            (Role::Companion, 0x6F_ADC4),
            (Role::Sun, 0x94_8F84),
            (Role::Star, 0xE9_E4D6),
            (Role::StarWarm, 0xFF_C38A),
            (Role::StarCool, 0xA9_CBFF),
            (Role::Skyline, 0x05_070B),
            (Role::Dusk, 0x3A_5A78),
            (Role::Caution, 0xFF_8A6B),
            (Role::Selection, 0x8C_C8FF),
            (Role::Night, 0x04_060A),
            (Role::Moonlight, 0x8F_98A3),
        ],
    );

    /// One hue, low light.
    pub const RED: Palette = Palette::of(
        "red",
        [
            (Role::Ground, 0x08_0000),
            (Role::Plate, 0x0E_0100),
            (Role::Ink, 0xDC_2A18),
            (Role::FaintInk, 0xA0_1E11),
            (Role::RegionName, 0x7A_170D),
            (Role::Hairline, 0x6A_140B),
            (Role::Boundary, 0x30_0804),
            (Role::Subject, 0x96_1C10),
            (Role::SubjectLate, 0xE8_2C19),
            (Role::Retrograde, 0xE0_2B18),
            (Role::Companion, 0x8A_1A0F),
            (Role::Sun, 0x76_160C),
            (Role::Star, 0xB8_2314),
            (Role::StarWarm, 0xB8_2314),
            (Role::StarCool, 0xB8_2314),
            (Role::Skyline, 0x03_0000),
            (Role::Dusk, 0x40_0B06),
            (Role::Caution, 0xF0_2E1A),
            (Role::Selection, 0xF0_2E1A),
            (Role::Night, 0x02_0000),
            (Role::Moonlight, 0x6A_140B),
        ],
    );

    pub const ALL: [Palette; 3] = [Palette::LIGHT, Palette::DARK, Palette::RED];

    /// Checked when compiled: every role once, in the order of its declaration.
    const fn of(name: &'static str, rows: [(Role, u32); Role::ALL.len()]) -> Self {
        let mut colours = [Rgb::hex(0); Role::ALL.len()];
        let mut row = 0;
        while row < rows.len() {
            assert!(rows[row].0 as usize == row, "roles out of order");
            colours[row] = Rgb::hex(rows[row].1);
            row += 1;
        }
        Palette { name, colours }
    }

    /// The theme of that name.
    #[must_use]
    pub fn named(name: &str) -> Option<Palette> {
        Palette::ALL
            .into_iter()
            .find(|palette| palette.name == name)
    }

    #[must_use]
    pub const fn colour(&self, role: Role) -> Rgb {
        // In bounds: `colours` has a place for every role.
        self.colours[role as usize]
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Lines that may lie beside each other and mean different things.
    const TRACKS: [Role; 5] = [
        Role::Subject,
        Role::SubjectLate,
        Role::Retrograde,
        Role::Companion,
        Role::Sun,
    ];

    /// sRGB to linear light, IEC 61966-2-1.
    fn linear(colour: Rgb) -> [f64; 3] {
        [colour.red, colour.green, colour.blue].map(|component| {
            let value = f64::from(component) / 255.0;
            if value <= 0.04045 {
                value / 12.92
            } else {
                libm::pow((value + 0.055) / 1.055, 2.4)
            }
        })
    }

    /// Relative luminance and contrast ratio as WCAG 2.2 defines them.
    fn contrast(a: Rgb, b: Rgb) -> f64 {
        let luminance = |colour| {
            let [r, g, b] = linear(colour);
            0.2126 * r + 0.7152 * g + 0.0722 * b
        };
        let (a, b) = (luminance(a) + 0.05, luminance(b) + 0.05);
        a.max(b) / a.min(b)
    }

    #[test]
    fn contrast_agrees_with_the_standard_on_its_extremes() {
        // WCAG 2.2, definition of contrast ratio: from 1 to 21.
        assert!((contrast(Rgb::hex(0), Rgb::hex(0xFF_FFFF)) - 21.0).abs() < 1e-9);
        assert_eq!(contrast(Rgb::hex(0x77_7777), Rgb::hex(0x77_7777)), 1.0);
    }

    /// WCAG 2.2, success criteria 1.4.3 (text, 4.5 : 1) and 1.4.11 (graphics, 3 : 1).
    #[test]
    fn text_and_tracks_stand_out_in_light_and_dark() {
        for palette in [Palette::LIGHT, Palette::DARK] {
            for behind in [Role::Ground, Role::Plate].map(|role| palette.colour(role)) {
                for role in Role::TEXT {
                    let ratio = contrast(palette.colour(role), behind);
                    assert!(ratio >= 4.5, "{} {role:?} {ratio:.2}", palette.name);
                }
                for role in TRACKS.into_iter().chain([Role::Star]) {
                    let ratio = contrast(palette.colour(role), behind);
                    assert!(ratio >= 3.0, "{} {role:?} {ratio:.2}", palette.name);
                }
            }
        }
    }

    /// Machado, Oliveira, Fernandes 2009, IEEE Trans. Vis. Comput. Graph. 15:1291, severity 1.0, on linear light
    /// (compared with the table in the Python package colorspacious 1.1.2);
    /// CIE 1976 L*a*b* distance for D65 (CIE 15). The least distance of 10, about four just noticeable
    /// differences, is our choice.
    #[test]
    fn tracks_are_told_apart_under_simulated_colour_blindness() {
        const SIGHT: [(&str, [[f64; 3]; 3]); 4] = [
            ("full", [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]]),
            (
                "protanopia",
                [
                    [0.152286, 1.052583, -0.204868],
                    [0.114503, 0.786281, 0.099216],
                    [-0.003882, -0.048116, 1.051998],
                ],
            ),
            (
                "deuteranopia",
                [
                    [0.367322, 0.860646, -0.227968],
                    [0.280085, 0.672501, 0.047413],
                    [-0.011820, 0.042940, 0.968881],
                ],
            ),
            (
                "tritanopia",
                [
                    [1.255528, -0.076749, -0.178779],
                    [-0.078411, 0.930809, 0.147602],
                    [0.004733, 0.691367, 0.303900],
                ],
            ),
        ];
        let lab = |colour: Rgb, matrix: &[[f64; 3]; 3]| {
            let apply = |rows: &[[f64; 3]; 3], v: [f64; 3]| {
                rows.map(|row| row[0] * v[0] + row[1] * v[1] + row[2] * v[2])
            };
            let seen = apply(matrix, linear(colour)).map(|value| value.clamp(0.0, 1.0));
            // IEC 61966-2-1, over the white of D65.
            let [x, y, z] = apply(
                &[
                    [0.4124, 0.3576, 0.1805],
                    [0.2126, 0.7152, 0.0722],
                    [0.0193, 0.1192, 0.9505],
                ],
                seen,
            );
            let f = |t: f64| {
                if t > 216.0 / 24389.0 {
                    libm::cbrt(t)
                } else {
                    (24389.0 / 27.0 * t + 16.0) / 116.0
                }
            };
            let (x, y, z) = (f(x / 0.9505), f(y), f(z / 1.089));
            [116.0 * y - 16.0, 500.0 * (x - y), 200.0 * (y - z)]
        };
        for palette in [Palette::LIGHT, Palette::DARK] {
            for (sight, matrix) in &SIGHT {
                for (index, &one) in TRACKS.iter().enumerate() {
                    for &other in &TRACKS[index + 1..] {
                        let (a, b) = (
                            lab(palette.colour(one), matrix),
                            lab(palette.colour(other), matrix),
                        );
                        let apart = ((a[0] - b[0]) * (a[0] - b[0])
                            + (a[1] - b[1]) * (a[1] - b[1])
                            + (a[2] - b[2]) * (a[2] - b[2]))
                            .sqrt();
                        assert!(
                            apart >= 10.0,
                            "{} {sight} {one:?} {other:?} {apart:.1}",
                            palette.name
                        );
                    }
                }
            }
        }
    }

    /// HSV hue of every colour of the red theme.
    #[test]
    fn the_red_theme_keeps_one_hue() {
        for role in Role::ALL {
            let Rgb { red, green, blue } = Palette::RED.colour(role);
            assert!(blue <= green && green <= red, "{role:?}");
            assert!(
                f64::from(green) <= 0.2 * f64::from(red),
                "{role:?} is not red"
            );
        }
    }
}
