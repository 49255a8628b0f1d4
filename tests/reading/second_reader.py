"""A second, independent reader of machine code: letters by str.split, arcs by complex numbers, no code shared with the package.

`points(program, n)` gives for each motion n + 1 points along it, in mm, and whether it is rapid, and its feed.
"""

import cmath
import math


def words(block):
    while "(" in block:
        before, _, rest = block.partition("(")
        block = before + rest.partition(")")[2]
    spaced = "".join(f" {c}" if c.isalpha() else c for c in block.replace(" ", ""))
    return [(piece[0], float(piece[1:])) for piece in spaced.split()]


def points(program, n=16):
    here, motion, plane, absolute, scale, feed = {"X": None, "Y": None, "Z": None}, None, None, True, 1.0, None
    out = []
    for block in program.splitlines():
        if not block.strip() or block.startswith("%"):
            continue
        given = words(block)
        codes = {int(value) for letter, value in given if letter == "G"}
        value = {letter: number for letter, number in given if letter not in "GNM"}
        motion = next((code for code in codes if code in (0, 1, 2, 3)), motion)
        plane = next(({17: "XYZ", 18: "ZXY", 19: "YZX"}[code] for code in codes if code in (17, 18, 19)), plane)
        scale = 25.4 if codes & {70, 20} else 1.0 if codes & {71, 21} else scale
        absolute = True if 90 in codes else False if 91 in codes else absolute
        if 4 in codes:
            continue
        feed = value["F"] * scale if "F" in value else feed
        if not value.keys() & set("XYZIJK"):
            continue
        there = dict(here)
        for axis in "XYZ":
            if axis in value:
                there[axis] = value[axis] * scale + (0.0 if absolute else here[axis])
        if None not in here.values():
            out.append((way(here, there, motion, plane, value, scale, n), motion == 0, feed))
        here = there
    return out


def way(here, there, motion, plane, value, scale, n):
    shares = [k / n for k in range(n + 1)]
    if motion in (0, 1):
        return [[here[c] + share * (there[c] - here[c]) for c in "XYZ"] for share in shares]
    real, imaginary, along = plane
    offset = complex(*(scale * value.get("IJK"["XYZ".index(c)], 0.0) for c in (real, imaginary)))
    start, end = complex(here[real], here[imaginary]), complex(there[real], there[imaginary])
    centre = start + offset
    sense = 1.0 if motion == 3 else -1.0
    turn = sense * cmath.phase((end - centre) / (start - centre))
    if abs(end - start) < 1e-6:
        turn = 2.0 * math.pi
    elif turn < 0.0:
        turn += 2.0 * math.pi
    rows = []
    for share in shares:
        place = centre + (start - centre) * cmath.exp(1j * sense * turn * share)
        row = {real: place.real, imaginary: place.imag, along: here[along] + share * (there[along] - here[along])}
        rows.append([row[c] for c in "XYZ"])
    return rows
