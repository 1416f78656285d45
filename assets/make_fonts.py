#!/usr/bin/env python3
"""Makes assets/fonts/*.ttf: small fonts for charts, cut from fonts under the SIL Open Font License 1.1.

    python3 make_fonts.py [--root /] [--out assets/fonts]

`--root` is the directory under which the Debian packages below are unpacked (`/` when they are installed; otherwise
`apt-get download fonts-noto-core` and `dpkg -x`). Sources, checked by SHA-256:
  fonts-lato 2.0-2.1                              Lato 2.007 / 2.006
  fonts-ebgaramond 0.016+git20210310.42d4f9f2-1   EB Garamond 12 Italic 0.016
  fonts-noto-core 20201225-1                      Noto Sans Symbols 2.001, Noto Sans Symbols 2 2.003
Needs fontTools 4.68.0 (PyPI); another version may order tables differently. Same input, same bytes: no clock is read.

What is changed, which is why the fonts bear names of their own ("Lato" is a reserved font name):
  - only the characters in TEXT or SIGNS are kept; hinting, kerning, ligatures and all other layout tables are dropped,
    so that the width of a text is the sum of its advances for every reader;
  - the digits are lining and of one width (figures in a column align);
  - the italic's cubic outlines become quadratic, within one thousandth of the em;
  - composite glyphs become plain outlines.
"""

import argparse
import hashlib
import sys
from pathlib import Path

from fontTools.fontBuilder import FontBuilder
from fontTools.pens.cu2quPen import Cu2QuPen
from fontTools.pens.recordingPen import DecomposingRecordingPen
from fontTools.pens.ttGlyphPen import TTGlyphPen
from fontTools.ttLib import TTFont

# Seconds from 1904 to 2025-01-01, the date written into every font.
FIXED_DATE = 3818534400

LATO = "usr/share/fonts/truetype/lato/"
GARAMOND = "usr/share/fonts/opentype/ebgaramond/"
NOTO = "usr/share/fonts/truetype/noto/"

SOURCES = {
    LATO + "Lato-Regular.ttf": "0ad460bd756454f8485609747b25c5644a54d307a65daabbb24c646c112ed541",
    LATO + "Lato-Semibold.ttf": "daba97eac5f3e95159ecb23264a7cb9c3719b9bc9a91a5fbf121ba4636661eb5",
    GARAMOND + "EBGaramond12-Italic.otf": "ce6bf781c71358408102ebd62557ae11852f122364666bc034b2e70dcc972790",
    NOTO + "NotoSansSymbols-Regular.ttf": "24b615ceb7d50a2c09060664ca9e24a160c9beb6bfca0563e8359369a4bc0993",
    NOTO + "NotoSansSymbols2-Regular.ttf": "876598db5f1e3bef2bc77c4d94c5b0d5d2c1620be4878a06f18fb5434e331688",
}


def span(first, last):
    return list(range(first, last + 1))


TEXT = (
    span(0x20, 0x7E)  # basic Latin
    + span(0xA0, 0x17F)  # Latin-1, Latin Extended-A
    + [0x192, 0x1E6, 0x1E7, 0x218, 0x219, 0x21A, 0x21B]  # Romanian and a few more
    + [0x2BB, 0x2BC, 0x2C6, 0x2C7, 0x2D8, 0x2D9, 0x2DA, 0x2DB, 0x2DC, 0x2DD]  # okina, spacing accents
    + [0x1E9E]
    + span(0x384, 0x3CE) + [0x3D1, 0x3D5, 0x3D6]  # Greek, with the variants used as letters of stars
    + span(0x400, 0x45F) + [0x490, 0x491]  # Cyrillic
    + [0x2002, 0x2003, 0x2007, 0x2008, 0x2009, 0x200A, 0x202F]  # spaces
    + span(0x2010, 0x2015) + span(0x2018, 0x201E) + [0x2020, 0x2021, 0x2022, 0x2026, 0x2030]
    + [0x2032, 0x2033, 0x2034, 0x2039, 0x203A, 0x2044]  # primes, quotes, fraction slash
    + [0x2070] + span(0x2074, 0x2079) + [0x207A, 0x207B] + span(0x2080, 0x2089)  # raised and lowered figures
    + [0x20AC, 0x2116, 0x2122] + span(0x2150, 0x215E)  # euro, numero, fractions
    + span(0x2190, 0x2199)  # arrows
    + [0x2206, 0x2211, 0x2212, 0x2213, 0x2215, 0x2219, 0x221A, 0x221E, 0x2248, 0x2260, 0x2264, 0x2265]
    + [0x25CA, 0x25CB, 0x25CF, 0x2713]
)

SIGNS = {
    NOTO + "NotoSansSymbols-Regular.ttf": (
        [0x263D, 0x263E, 0x263F, 0x2640, 0x2641, 0x2642, 0x2643, 0x2644, 0x2645, 0x2646, 0x26E2]  # Moon, planets
        + [0x260A, 0x260B, 0x260C, 0x260D]  # nodes, conjunction, opposition
        + span(0x2648, 0x2653)  # signs of the zodiac
    ),
    NOTO + "NotoSansSymbols2-Regular.ttf": (
        [0x2609, 0x2605, 0x2606, 0x25A1, 0x25B3, 0x25CB, 0x25CF, 0x25D0, 0x25D1]  # Sun, stars, quadrature, phases
    ),
}

LICENCE = "This font is licensed under the SIL Open Font License, Version 1.1: https://openfontlicense.org"

FONTS = {
    "sans-regular.ttf": dict(
        source=LATO + "Lato-Regular.ttf", family="Loopwright Sans", style="Regular", weight=400, italic=False,
        copyright="Cut from Lato 2.007, Copyright (c) 2010-2014 by tyPoland Lukasz Dziedzic with Reserved Font Name "
                  '"Lato". Licensed under the SIL Open Font License, Version 1.1.',
    ),
    "sans-semibold.ttf": dict(
        source=LATO + "Lato-Semibold.ttf", family="Loopwright Sans", style="SemiBold", weight=600, italic=False,
        copyright="Cut from Lato 2.006, Copyright (c) 2010-2014 by tyPoland Lukasz Dziedzic with Reserved Font Name "
                  '"Lato". Licensed under the SIL Open Font License, Version 1.1.',
    ),
    "serif-italic.ttf": dict(
        source=GARAMOND + "EBGaramond12-Italic.otf", family="Loopwright Serif", style="Italic", weight=400, italic=True,
        copyright="Cut from EB Garamond 0.016, Copyright (c) 2010-2013, Georg A. Duffner "
                  "(http://www.georgduffner.at/ebgaramond). Licensed under the SIL Open Font License, Version 1.1.",
    ),
    "signs.ttf": dict(
        source=None, family="Loopwright Signs", style="Regular", weight=400, italic=False,
        copyright="Cut from Noto Sans Symbols 2.001 and Noto Sans Symbols 2 2.003, Copyright 2016 Google LLC, "
                  "Copyright 2017 Google Inc. Licensed under the SIL Open Font License, Version 1.1.",
    ),
}


def single_substitutions(font, feature):
    """The glyph-for-glyph table of one feature, whatever the script."""
    table = font["GSUB"].table
    out = {}
    for record in table.FeatureList.FeatureRecord:
        if record.FeatureTag != feature:
            continue
        for index in record.Feature.LookupListIndex:
            for sub in table.LookupList.Lookup[index].SubTable:
                sub = getattr(sub, "ExtSubTable", sub)
                if sub.LookupType == 1:
                    out.update(sub.mapping)
    return out


def pick(font, characters):
    """Character -> glyph name, digits tabular and lining, spaces filled in where the font has none."""
    cmap = font.getBestCmap()
    chosen = {c: cmap[c] for c in characters if c in cmap}
    if "GSUB" in font:
        lining, tabular = single_substitutions(font, "lnum"), single_substitutions(font, "tnum")
        for c in set(span(0x30, 0x39)) & chosen.keys():
            name = lining.get(chosen[c], chosen[c])
            chosen[c] = tabular.get(name, name)
    for missing, stand_in in ((0x202F, 0x2009), (0x2011, 0x2010)):  # no-break forms of thin space and hyphen
        if missing in characters and stand_in in chosen:
            chosen.setdefault(missing, chosen[stand_in])
    return chosen


def outline(font, name, scale):
    """One glyph as a quadratic outline without components, and its advance."""
    glyphs = font.getGlyphSet()
    recording = DecomposingRecordingPen(glyphs)
    glyphs[name].draw(recording)
    target = TTGlyphPen(None)
    if "glyf" in font:
        recording.replay(target)
    else:
        recording.replay(Cu2QuPen(target, max_err=scale / 1000, reverse_direction=True))
    return target.glyph(), font["hmtx"][name][0]


def build(parts, spec, path):
    """`parts` is a list of (font, character -> glyph name); the first gives the metrics of the line."""
    first = parts[0][0]
    em = first["head"].unitsPerEm
    order, glyphs, advances, cmap = [".notdef"], {}, {}, {}
    glyphs[".notdef"], advances[".notdef"] = outline(first, ".notdef", em)
    for number, (font, chosen) in enumerate(parts):
        assert font["head"].unitsPerEm == em
        seen = {}
        for character in sorted(chosen):
            source = chosen[character]
            if source not in seen:
                name = f"g{number}.{character:04X}"
                seen[source] = name
                order.append(name)
                glyphs[name], advances[name] = outline(font, source, em)
            cmap[character] = seen[source]
    digits = [cmap[c] for c in span(0x30, 0x39) if c in cmap]
    widths = {advances[name] for name in digits}
    if len(widths) > 1:  # the italic's tabular digits differ by up to 4 thousandths of the em: all take the widest
        assert max(widths) - min(widths) <= em * 0.005, f"{path.name}: digits of different widths {sorted(widths)}"
        advances.update(dict.fromkeys(digits, max(widths)))

    builder = FontBuilder(em, isTTF=True)
    builder.updateHead(created=FIXED_DATE, modified=FIXED_DATE, fontRevision=1.0,
                       macStyle=2 if spec["italic"] else 0)
    builder.font.recalcTimestamp = False
    builder.setupGlyphOrder(order)
    builder.setupCharacterMap(cmap)
    builder.setupGlyf(glyphs)
    table = builder.font["glyf"]
    builder.setupHorizontalMetrics(
        {name: (advances[name], getattr(table[name], "xMin", 0) or 0) for name in order})
    line = first["hhea"]
    builder.setupHorizontalHeader(ascent=line.ascent, descent=line.descent, lineGap=line.lineGap)
    plain = spec["style"] in ("Regular", "Italic")
    full = spec["family"] + " " + spec["style"]
    names = dict(
        copyright=spec["copyright"],
        familyName=spec["family"] if plain else full,
        styleName=spec["style"] if plain else "Regular",
        uniqueFontIdentifier="1.0;" + full.replace(" ", ""),
        fullName=full,
        version="Version 1.0",
        psName=spec["family"].replace(" ", "") + "-" + spec["style"],
        licenseDescription=LICENCE,
        licenseInfoURL="https://openfontlicense.org",
    )
    if not plain:
        names.update(typographicFamily=spec["family"], typographicSubfamily=spec["style"])
    builder.setupNameTable(names, mac=False)
    old = first["OS/2"]
    builder.setupOS2(
        version=4, usWeightClass=spec["weight"], fsType=0,
        fsSelection=(0x01 if spec["italic"] else 0x40) | 0x80,
        sTypoAscender=line.ascent, sTypoDescender=line.descent, sTypoLineGap=line.lineGap,
        usWinAscent=old.usWinAscent, usWinDescent=old.usWinDescent,
        sxHeight=getattr(old, "sxHeight", 0), sCapHeight=getattr(old, "sCapHeight", 0),
        xAvgCharWidth=old.xAvgCharWidth, achVendID="NONE",
    )
    builder.setupPost(keepGlyphNames=False, italicAngle=first["post"].italicAngle,
                      underlinePosition=first["post"].underlinePosition,
                      underlineThickness=first["post"].underlineThickness)
    builder.save(path)
    print(f"{path.name}: {len(cmap)} characters, {path.stat().st_size} bytes")


def main():
    arguments = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    arguments.add_argument("--root", type=Path, action="append", help="where the packages are unpacked; may be repeated")
    arguments.add_argument("--out", type=Path, default=Path(__file__).parent / "fonts")
    options = arguments.parse_args()
    fonts = {}
    for name, expected in SOURCES.items():
        candidates = [root / name for root in options.root or [Path("/")]]
        path = next((c for c in candidates if c.exists()), None)
        if path is None:
            sys.exit(f"{name} not found under {[str(c) for c in options.root or ['/']]}: unpack its package, see the head")
        found = hashlib.sha256(path.read_bytes()).hexdigest()
        if found != expected:
            sys.exit(f"{path}: SHA-256 is {found}, expected {expected}: another version of the font")
        fonts[name] = TTFont(path)
    options.out.mkdir(parents=True, exist_ok=True)
    for file, spec in FONTS.items():
        if spec["source"]:
            parts = [(fonts[spec["source"]], pick(fonts[spec["source"]], TEXT))]
            absent = [f"U+{c:04X}" for c in TEXT if c not in parts[0][1]]
            print(f"{file}: the source has no", " ".join(absent) or "gap")
        else:
            parts = [(fonts[name], pick(fonts[name], characters)) for name, characters in SIGNS.items()]
        build(parts, spec, options.out / file)


if __name__ == "__main__":
    main()
