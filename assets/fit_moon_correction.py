#!/usr/bin/env python3
"""Prints MOON_CORRECTION_ARCSEC of src/sky/remote.rs, and what is left of the Moon's error with it.

    pip install pyerfa==2.0.1.5 jplephem==2.24 de406==1997.1 numpy
    python assets/fit_moon_correction.py

Least squares of the longitude on the ecliptic of J2000, DE406 minus erfa moon98 (Meeus 1998, chapter 47), at 60 000
epochs over the years -2000 to 3000.
"""

import de406
import erfa
import numpy
from jplephem.ephem import Ephemeris

AU_KM = 149_597_870.7
ARCSEC = 206_264.806_247
MOON_ARCSEC_A_DAY = 1_732_559_343.0 / 36_525.0
OBLIQUITY = 84_381.406 / ARCSEC

ephemeris = Ephemeris(de406)
# Steps by the golden section: an even grid would beat with the month.
years = numpy.sort(-2000.0 + 4999.9 * numpy.remainder(numpy.arange(60_000) * 0.618_033_988_749_895, 1.0))
days = (years - 2000.0) * 365.25
centuries = days / 36_525.0
wanted = ephemeris.position("moon", 2_451_545.0 + days)


def series(at):
    return numpy.array([erfa.moon98(2_451_545.0, day)["p"] for day in at]).T * AU_KM


def longitude(place):
    x, y, z = place
    return numpy.arctan2(y * numpy.cos(OBLIQUITY) + z * numpy.sin(OBLIQUITY), x)


difference = longitude(wanted) - longitude(series(days))
difference = (numpy.remainder(difference + numpy.pi, 2.0 * numpy.pi) - numpy.pi) * ARCSEC
correction = numpy.polynomial.polynomial.polyfit(centuries, difference, 4)
print("correction", ", ".join(f"{value:.4e}" for value in correction))

shift = numpy.polynomial.polynomial.polyval(centuries, correction) / MOON_ARCSEC_A_DAY
ours = series(days + shift)
across = numpy.linalg.norm(numpy.cross(ours.T, wanted.T), axis=1)
off = numpy.arctan2(across, (ours * wanted).sum(axis=0)) * ARCSEC
for first, last in ((-2000, -1000), (-1000, 0), (0, 1000), (1000, 3000)):
    part = off[(years >= first) & (years < last)]
    print(f"{first} to {last}: at most {part.max():.1f} arcsec, rms {numpy.sqrt((part**2).mean()):.1f}")
