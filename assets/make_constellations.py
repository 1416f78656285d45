#!/usr/bin/env python3
"""Makes assets/constellations.rs: names, IAU regions, their edges, and where to write the names.

    python3 make_constellations.py --data .../astropy/coordinates/data [--out constellations.rs]

Sources, in the wheel astropy 8.0.2 (BSD-3-Clause), checked by SHA-256:
  constellation_data_roman87.dat  Roman 1987 (PASP 99, 695; CDS VI/42): 357 strips of the sky, right ascension and
                                  declination of the mean equator and equinox of B1875.0; a place belongs to the first
                                  strip whose lower declination lies at or below it and whose hours hold it
  constellation_names.dat         IAU abbreviations and Latin names (CDS VizieR)
Three misspelt names of the second file are set right (CORRECTED).
Genitives: the forms of the IAU's list of constellations, written from memory.

Edges are not in the table: the sky is cut along every hour and declination in it; an edge stands where two
neighbouring cells belong to different constellations; edges are joined into chains from one junction to the next.
Anchors: in each connected part of a constellation, the point of a grid of 0.5 degrees farthest from its edges.

The file holds Rust tables, so that the compiler checks them and no reader can fail: NAMES in alphabetical order of
abbreviations, with anchors (hours, degrees), one a connected part, largest first; STRIPS (hours from, hours to, lower
declination, index into NAMES) as in the source, which is in order of falling declination; CHAINS (two indices, corners
as (hours, degrees)): each step runs along one hour circle or one parallel, and hours run on over 24 where a chain
crosses 0h. Everything B1875.0.
"""

import argparse
import hashlib
import math
import sys
from collections import defaultdict
from pathlib import Path

SHA256 = {
    "constellation_data_roman87.dat": "17407174f8d1e2771e4e693bc007d542b69ae0b604cec311774c7e91e146f196",
    "constellation_names.dat": "905b9005b4fe86c81140dbb818c186b96cc7f6c1bebce75113434466b35f28b2",
}

CORRECTED = {"Cha": "Chamaeleon", "Oph": "Ophiuchus", "PsA": "Piscis Austrinus"}

GENITIVES = """And Andromedae|Ant Antliae|Aps Apodis|Aqr Aquarii|Aql Aquilae|Ara Arae|Ari Arietis|Aur Aurigae|Boo Boötis
Cae Caeli|Cam Camelopardalis|Cnc Cancri|CVn Canum Venaticorum|CMa Canis Majoris|CMi Canis Minoris|Cap Capricorni
Car Carinae|Cas Cassiopeiae|Cen Centauri|Cep Cephei|Cet Ceti|Cha Chamaeleontis|Cir Circini|Col Columbae
Com Comae Berenices|CrA Coronae Australis|CrB Coronae Borealis|Crv Corvi|Crt Crateris|Cru Crucis|Cyg Cygni
Del Delphini|Dor Doradus|Dra Draconis|Equ Equulei|Eri Eridani|For Fornacis|Gem Geminorum|Gru Gruis|Her Herculis
Hor Horologii|Hya Hydrae|Hyi Hydri|Ind Indi|Lac Lacertae|Leo Leonis|LMi Leonis Minoris|Lep Leporis|Lib Librae
Lup Lupi|Lyn Lyncis|Lyr Lyrae|Men Mensae|Mic Microscopii|Mon Monocerotis|Mus Muscae|Nor Normae|Oct Octantis
Oph Ophiuchi|Ori Orionis|Pav Pavonis|Peg Pegasi|Per Persei|Phe Phoenicis|Pic Pictoris|Psc Piscium
PsA Piscis Austrini|Pup Puppis|Pyx Pyxidis|Ret Reticuli|Sge Sagittae|Sgr Sagittarii|Sco Scorpii|Scl Sculptoris
Sct Scuti|Ser Serpentis|Sex Sextantis|Tau Tauri|Tel Telescopii|Tri Trianguli|TrA Trianguli Australis|Tuc Tucanae
UMa Ursae Majoris|UMi Ursae Minoris|Vel Velorum|Vir Virginis|Vol Volantis|Vul Vulpeculae"""


def vector(hours, degrees):
    ra, dec = math.radians(hours * 15), math.radians(degrees)
    return (math.cos(dec) * math.cos(ra), math.cos(dec) * math.sin(ra), math.sin(dec))


class Sky:
    """The sky cut into cells along every hour and declination of the table."""

    def __init__(self, rows):
        self.hours = sorted({row[0] for row in rows} | {row[1] % 24 for row in rows} | {0.0})
        self.decs = sorted({row[2] for row in rows} | {-90.0})
        self.columns, self.bands = len(self.hours), len(self.decs)
        self.ends = self.hours[1:] + [24.0]
        self.tops = self.decs[1:] + [90.0]
        self.cell = []
        for band in range(self.bands):
            line = []
            for column in range(self.columns):
                middle = (self.hours[column] + self.ends[column]) / 2
                line.append(next(r[3] for r in rows if r[2] <= self.decs[band] and r[0] <= middle < r[1]))
            self.cell.append(line)

    def edges(self):
        """(node, node, constellation pair); a node is (column, band) of its corner."""
        out = []
        for band in range(self.bands):
            for column in range(self.columns):
                here = self.cell[band][column]
                west = self.cell[band][column - 1]
                if here != west:
                    out.append(((column, band), (column, band + 1), tuple(sorted((here, west), key=str.lower))))
                if band > 0 and here != self.cell[band - 1][column]:
                    below = self.cell[band - 1][column]
                    out.append(((column, band), ((column + 1) % self.columns, band), tuple(sorted((here, below), key=str.lower))))
        return out

    def parts(self):
        """Connected sets of cells, by constellation, largest first."""
        seen, found = set(), defaultdict(list)
        for start in ((b, c) for b in range(self.bands) for c in range(self.columns)):
            if start in seen:
                continue
            name, todo, cells = self.cell[start[0]][start[1]], [start], []
            seen.add(start)
            while todo:
                b, c = todo.pop()
                cells.append((b, c))
                for nb, nc in ((b - 1, c), (b + 1, c), (b, (c - 1) % self.columns), (b, (c + 1) % self.columns)):
                    if 0 <= nb < self.bands and (nb, nc) not in seen and self.cell[nb][nc] == name:
                        seen.add((nb, nc))
                        todo.append((nb, nc))
            area = sum((self.ends[c] - self.hours[c]) * (math.sin(math.radians(self.tops[b]))
                       - math.sin(math.radians(self.decs[b]))) for b, c in cells)
            found[name].append((-round(area, 9), sorted(cells)))
        return {name: [cells for _, cells in sorted(parts)] for name, parts in found.items()}


def chains(edges):
    """Joins edges into chains between junctions (corners where not exactly two edges meet)."""
    at = defaultdict(list)
    for number, (a, b, _) in enumerate(edges):
        at[a].append(number)
        at[b].append(number)
    used, out = set(), []

    def walk(start, number):
        path, pair = [start], edges[number][2]
        while number is not None:
            used.add(number)
            a, b, _ = edges[number]
            path.append(b if path[-1] == a else a)
            here = path[-1]
            onward = [n for n in at[here] if n not in used]
            number = onward[0] if len(at[here]) == 2 and onward else None
        return pair, path

    for node in sorted(at):
        if len(at[node]) != 2:
            for number in at[node]:
                if number not in used:
                    out.append(walk(node, number))
    for number in range(len(edges)):
        if number not in used:
            out.append(walk(edges[number][0], number))
    return out


def corners(sky, path):
    """Places of a chain without the corners on a straight run; hours run on over 24."""
    places = []
    for column, band in path:
        hours, dec = sky.hours[column], sky.decs[band]
        if places:
            hours += 24 * round((places[-1][0] - hours) / 24)
        places.append((round(hours, 4), dec))
    if min(hours for hours, _ in places) < 0:
        places = [(round(hours + 24, 4), dec) for hours, dec in places]
    kept = places[:1]
    for before, here, after in zip(places, places[1:], places[2:]):
        if not (before[0] == here[0] == after[0] or before[1] == here[1] == after[1]):
            kept.append(here)
    return kept + places[-1:]


def samples(places):
    """Points at most 0.5 degrees apart along a chain."""
    for (h0, d0), (h1, d1) in zip(places, places[1:]):
        steps = max(1, math.ceil(max(abs(h1 - h0) * 15, abs(d1 - d0)) / 0.5))
        for i in range(steps + 1):
            yield vector(h0 + (h1 - h0) * i / steps, d0 + (d1 - d0) * i / steps)


def anchor(sky, cells, edge_points):
    inside = defaultdict(list)
    for band, column in cells:
        inside[band].append(column)
    best = (-1.0, None)
    for band, columns in sorted(inside.items()):
        for half in range(math.ceil(sky.decs[band] * 2), math.ceil(sky.tops[band] * 2)):
            dec = half / 2
            for column in columns:
                for tick in range(math.ceil(sky.hours[column] * 30), math.ceil(sky.ends[column] * 30)):
                    place = vector(tick / 30, dec)
                    nearest = max(sum(p * q for p, q in zip(place, point)) for point in edge_points)
                    score = round(1 - nearest, 9)
                    if score > best[0]:
                        best = (score, (tick / 30, dec))
    return round(best[1][0], 4), best[1][1]


def main():
    arguments = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    arguments.add_argument("--data", type=Path, required=True, help="astropy/coordinates/data of the wheel")
    arguments.add_argument("--out", type=Path, default=Path(__file__).parent / "constellations.rs")
    options = arguments.parse_args()
    texts = {}
    for name, expected in SHA256.items():
        content = (options.data / name).read_bytes()
        found = hashlib.sha256(content).hexdigest()
        if found != expected:
            sys.exit(f"{name}: SHA-256 is {found}, expected {expected}: another version of the source")
        texts[name] = [line for line in content.decode("utf-8").splitlines() if line and not line.startswith("#")]

    strips = [line.split() for line in texts["constellation_data_roman87.dat"]]
    rows = [(float(a), float(b), float(d), name) for a, b, d, name in strips]
    names = {line[:3]: line[4:].strip() for line in texts["constellation_names.dat"]}
    names.update(CORRECTED)
    genitives = dict(entry.split(" ", 1) for line in GENITIVES.splitlines() for entry in line.split("|"))
    assert len(names) == 88 and names.keys() == genitives.keys() == {row[3] for row in rows}

    assert [row[2] for row in rows] == sorted((row[2] for row in rows), reverse=True)

    sky = Sky(rows)
    lines = [(pair, corners(sky, path)) for pair, path in chains(sky.edges())]
    lines.sort(key=lambda line: ([name.lower() for name in line[0]], line[1]))
    near = defaultdict(list)
    for pair, places in lines:
        points = list(samples(places))
        for name in pair:
            near[name] += points

    order = sorted(names, key=str.lower)
    index = {name: i for i, name in enumerate(order)}
    out = ["// Made by make_constellations.py from Roman 1987 (CDS VI/42); origin and licence in assets/README.",
           "// Right ascensions in hours and declinations in degrees, B1875.0.", "",
           f"static NAMES: [Names; {len(order)}] = ["]
    parts = sky.parts()
    for name in order:
        spots = ", ".join(f"({h!r}, {d!r})" for h, d in (anchor(sky, cells, near[name]) for cells in parts[name]))
        out.append(f'    names("{name}", "{names[name]}", "{genitives[name]}", &[{spots}]),')
    out += ["];", "", f"static STRIPS: [(f64, f64, f64, u8); {len(rows)}] = ["]
    out += [f"    ({a!r}, {b!r}, {d!r}, {index[name]})," for a, b, d, name in rows]
    out += ["];", "", f"static CHAINS: [(u8, u8, &[Place]); {len(lines)}] = ["]
    for pair, places in lines:
        spots = ", ".join(f"({h!r}, {d!r})" for h, d in places)
        out.append(f"    ({index[pair[0]]}, {index[pair[1]]}, &[{spots}]),")
    out.append("];")
    text = "\n".join(out) + "\n"
    options.out.write_text(text, encoding="utf-8", newline="\n")
    print(f"{len(names)} constellations, {len(strips)} strips, {len(lines)} chains with "
          f"{sum(len(p) for _, p in lines)} corners, {len(text.encode())} bytes; several parts:",
          {n: len(p) for n, p in parts.items() if len(p) > 1})


if __name__ == "__main__":
    main()
