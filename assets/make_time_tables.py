#!/usr/bin/env python3
"""Makes assets/time_tables.rs: leap seconds, measured and predicted delta-T, and the historic delta-T spline.

Run with the packages the file's head names:

    pip install astropy-iers-data==0.2026.11.2.0.34.55 skyfield==1.55 numpy
    python assets/make_time_tables.py

The same package versions give the same bytes.

Sources
- Leap seconds: IERS `Leap_Second.dat`, in astropy-iers-data (BSD 3-clause; IERS data are free to use).
- Delta-T from 1962: IERS EOP 20 C04 (`eopc04.1962-now`), then IERS/USNO `finals2000A.all` with its predictions, in
  the same package. delta-T = 32.184 s + (TAI-UTC) - (UT1-UTC); it has no jumps, unlike UT1-UTC.
- TAI-UTC of 1962 to 1971, when UTC was steered in rate: the published table (IERS, `tai-utc.dat` of USNO).
- Delta-T before 1962: Stephenson, Morrison and Hohenkerk 2016 (Proc. R. Soc. A 472:20160404), table S15 in its 2020
  revision (HM Nautical Almanac Office), as shipped in skyfield (MIT).
"""

import datetime
import importlib.metadata
import pathlib

import astropy_iers_data
import numpy
import skyfield

FIRST_MEASURED_YEAR = 1962.0
STEP_DAYS = 3
UNIT_SECONDS = 1e-5
TT_MINUS_TAI = 32.184

# First MJD of validity, TAI-UTC there in seconds, reference MJD, drift in seconds a day (tai-utc.dat).
STEERED_UTC = [
    (37665, 1.8458580, 37665, 0.0011232),
    (38334, 1.9458580, 37665, 0.0011232),
    (38395, 3.2401300, 38761, 0.001296),
    (38486, 3.3401300, 38761, 0.001296),
    (38639, 3.4401300, 38761, 0.001296),
    (38761, 3.5401300, 38761, 0.001296),
    (38820, 3.6401300, 38761, 0.001296),
    (38942, 3.7401300, 38761, 0.001296),
    (39004, 3.8401300, 38761, 0.001296),
    (39126, 4.3131700, 39126, 0.002592),
    (39887, 4.2131700, 39126, 0.002592),
]

HERE = pathlib.Path(__file__).resolve().parent
IERS = pathlib.Path(astropy_iers_data.__file__).parent / "data"
SKYFIELD = pathlib.Path(skyfield.__file__).parent / "data"


def leap_seconds():
    """(MJD, TAI-UTC from then on) pairs and the expiry line of the file."""
    pairs, expires = [], ""
    for line in (IERS / "Leap_Second.dat").read_text().splitlines():
        if "expires on" in line:
            expires = line.split("expires on")[1].strip()
        elif line.strip() and not line.startswith("#"):
            fields = line.split()
            pairs.append((int(float(fields[0])), int(fields[4])))
    return pairs, expires


def ut1_minus_utc():
    """UT1-UTC in seconds by MJD, and the last MJD that is measured."""
    values, measured_to = {}, 0
    for line in (IERS / "finals2000A.all").read_text().splitlines():
        if line[58:68].strip():
            mjd = int(float(line[7:15]))
            values[mjd] = float(line[58:68])
            if line[57] == "I":
                measured_to = mjd
    for line in (IERS / "eopc04.1962-now").read_text().splitlines():
        if line.strip() and not line.startswith("#"):
            mjd = int(float(line[16:26]))
            values[mjd] = float(line[50:62])
            measured_to = max(measured_to, mjd)
    return values, measured_to


def tai_minus_utc(mjd, leaps):
    past_leaps = [offset for start, offset in leaps if start <= mjd]
    if past_leaps:
        return float(past_leaps[-1])
    _, offset, reference, drift = [row for row in STEERED_UTC if row[0] <= mjd][-1]
    return offset + (mjd - reference) * drift


def iso_date(mjd):
    return (datetime.date(1858, 11, 17) + datetime.timedelta(days=mjd)).isoformat()


def rows(items, per_line):
    lines = [items[i : i + per_line] for i in range(0, len(items), per_line)]
    return "\n".join("    " + ", ".join(line) + "," for line in lines)


def main():
    leaps, expires = leap_seconds()
    ut1_utc, measured_to = ut1_minus_utc()
    first = min(ut1_utc)
    last = first + (max(ut1_utc) - first) // STEP_DAYS * STEP_DAYS
    daily = numpy.array(
        [TT_MINUS_TAI + tai_minus_utc(mjd, leaps) - ut1_utc[mjd] for mjd in range(first, last + 1)]
    )
    units = [round(value / UNIT_SECONDS) for value in daily[::STEP_DAYS]]

    days = numpy.arange(len(daily))
    error = numpy.interp(days, days[::STEP_DAYS], numpy.array(units) * UNIT_SECONDS) - daily
    worst_ms, rms_ms = abs(error).max() * 1e3, numpy.sqrt((error**2).mean()) * 1e3

    splines = numpy.load(SKYFIELD / "delta_t.npz")["Table-S15.2020.txt"]
    splines = splines[:, splines[0] < FIRST_MEASURED_YEAR]
    spline_rows = [
        "    [" + ", ".join(f"{value:.3f}" for value in (column[0], column[1], *column[:1:-1])) + "],"
        for column in splines.T
    ]
    iers_version = importlib.metadata.version("astropy-iers-data")
    skyfield_version = importlib.metadata.version("skyfield")
    text = f"""\
// Made by assets/make_time_tables.py; do not edit.
// Origin: IERS Leap_Second.dat (expires {expires}), EOP 20 C04 and finals2000A.all, from astropy-iers-data
//   {iers_version} (BSD 3-clause, copyright the Astropy Team); Stephenson, Morrison and Hohenkerk 2016,
//   table S15 of 2020, from skyfield {skyfield_version} (MIT, copyright Brandon Rhodes).
// Linear interpolation of DELTA_T_UNITS meets the daily values within {worst_ms:.2f} ms (rms {rms_ms:.2f} ms).

/// Modified Julian Date of 0h UTC, and TAI-UTC in seconds from then on.
static LEAP_SECONDS: [(i32, i32); {len(leaps)}] = [
{rows([f"({mjd}, {offset})" for mjd, offset in leaps], 6)}
];

/// Modified Julian Date of the first entry of `DELTA_T_UNITS`.
const FIRST_MJD: i32 = {first};
/// Days between the entries of `DELTA_T_UNITS`.
const STEP_DAYS: i32 = {STEP_DAYS};
/// Last Modified Julian Date that is measured; later entries are IERS predictions.
const MEASURED_TO_MJD: i32 = {measured_to};
/// The same day as text, and the day of the last prediction.
const MEASURED_TO_DATE: &str = "{iso_date(measured_to)}";
const PREDICTED_TO_DATE: &str = "{iso_date(last)}";
/// Until when the IERS has said that there is no leap second.
const LEAP_SECONDS_TO_DATE: &str = "{datetime.datetime.strptime(expires, '%d %B %Y').date().isoformat()}";
/// Seconds per unit of `DELTA_T_UNITS`.
const UNIT_SECONDS: f64 = {UNIT_SECONDS:.5f};

/// TT-UT1 at 0h UTC.
static DELTA_T_UNITS: [i32; {len(units)}] = [
{rows([str(unit) for unit in units], 16)}
];

/// First and last year of each piece, then a0 to a3 of TT-UT1 = a0 + a1 t + a2 t^2 + a3 t^3 seconds, where t runs from
/// 0 to 1 within the piece.
static SPLINE: [[f64; 6]; {splines.shape[1]}] = [
{chr(10).join(spline_rows)}
];
"""
    (HERE / "time_tables.rs").write_text(text, encoding="ascii")
    print(f"{len(text)} bytes, worst {worst_ms:.2f} ms, rms {rms_ms:.2f} ms, measured to {measured_to}, last {last}")


if __name__ == "__main__":
    main()
