#!/usr/bin/env python3
"""Makes tests/data/de440_states.csv and tests/data/nutation_iau2000a.csv, against which the ephemeris is tested.

    python assets/make_ephemeris_checks.py de440.bsp

States come from jplephem's own reader of the kernel, nutation from ERFA; nothing here is shared with
make_ephemeris.py. Needs numpy, jplephem and pyerfa.
"""

import sys
from importlib.metadata import version
from pathlib import Path

import erfa
import numpy as np
from jplephem.spk import SPK

AU_KM = 149597870.7  # IAU 2012 resolution B2
J2000 = 2451545.0
DATA = Path(__file__).resolve().parent.parent / "tests" / "data"
BODIES = ["Sun", "Mercury", "Venus", "EarthMoonBarycentre", "Mars", "Jupiter", "Saturn", "Uranus", "Neptune"]
SEGMENTS = {"Sun": 10, "Mercury": 1, "Venus": 2, "EarthMoonBarycentre": 3, "Mars": 4, "Jupiter": 5, "Saturn": 6,
            "Uranus": 7, "Neptune": 8}


def epochs(start, end, count):
    """The ends, and random days in steps of 1/64, which an f64 holds exactly."""
    random = np.random.default_rng(1550)
    inside = random.integers(int(start * 64), int(end * 64), count) / 64.0
    return [start, *sorted(float(t) for t in inside), end]


def main():
    kernel = SPK.open(sys.argv[1])
    start, end = kernel[0, 1].start_jd - J2000, kernel[0, 1].end_jd - J2000
    times = epochs(start, end, 40)

    def state(center, target, t):
        position, rate = kernel[center, target].compute_and_differentiate(J2000, t)
        return np.concatenate([position, rate]) / AU_KM

    with open(DATA / "de440_states.csv", "w") as out:
        out.write(f"# JPL DE440, kernel de440.bsp of NAIF (public), read with jplephem {version('jplephem')}.\n"
                  "# ICRS, geometric; au of 149597870.7 km and au per day of TDB; days of TDB since JD 2451545.0.\n"
                  "# From the solar-system barycentre; MoonFromEarth from the Earth's centre.\n"
                  "# Made by assets/make_ephemeris_checks.py.\n"
                  "days,target,x,y,z,vx,vy,vz\n")
        for t in times:
            rows = [(name, state(0, SEGMENTS[name], t)) for name in BODIES]
            rows.append(("MoonFromEarth", state(3, 301, t) - state(3, 399, t)))
            rows.append(("Earth", state(0, 3, t) + state(3, 399, t)))
            for name, values in rows:
                out.write(f"{t!r},{name}," + ",".join(f"{v:.16e}" for v in values) + "\n")

    with open(DATA / "nutation_iau2000a.csv", "w") as out:
        out.write(f"# Nutation IAU 2000A with the IAU 2006 adjustments: nut06a of ERFA {erfa.version.erfa_version}"
                  f" (SOFA {erfa.version.sofa_version}), pyerfa {version('pyerfa')}.\n"
                  "# Days of TT since JD 2451545.0; radians. Made by assets/make_ephemeris_checks.py.\n"
                  "days,longitude,obliquity\n")
        for t in times:
            longitude, obliquity = erfa.nut06a(J2000, t)
            out.write(f"{t!r},{float(longitude):.16e},{float(obliquity):.16e}\n")


if __name__ == "__main__":
    main()
