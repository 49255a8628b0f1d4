"""Word-address programs (ISO 6983-1, DIN 66025): the words that mean the same on every control; each other word is refused by name.

Read: % N ( ) G00 G01 G02 G03 G04 G17 G18 G19 G70 G71 G90 G91 G94 M02 M30 X Y Z I J K F. A control's settings at the start of a program
differ, so nothing is assumed: units, distances, the plane of an arc and what F means must stand in the program before they are needed.
"""

import math
import re

from ..conventions import INCH, MM
from ..course import Course, Draft
from ..errors import ReadError, quoted
from .geometry import UNIT_OF, axis_asked, metres
from .sources import decode

EXPECTED = "machine code as text"
ALLOWED = "G00 G01 G02 G03 G04 G17 G18 G19 G70 G71 G90 G91 G94, M02 M30, X Y Z I J K F and N"
AXES = "XYZ"
CENTRE = "IJK"
GROUPS = {0: "motion", 1: "motion", 2: "motion", 3: "motion", 4: "dwell", 17: "plane", 18: "plane", 19: "plane", 70: "units", 71: "units",
          90: "distance", 91: "distance", 94: "feed", 20: "units", 21: "units"}  # fmt: skip
PLANES = {17: (0, 1, 2), 18: (2, 0, 1), 19: (1, 2, 0)}
"""First, second and third axis: an arc of G03 turns from the first to the second, seen from the positive end of the third."""
ARC_SLACK = 0.02 * MM
"""m between an arc's end and its circle that is taken for rounding in the file, and drawn in along the arc; and at most 1 % of the radius."""
SAME = 1e-9  # m: an arc that ends this near to its start is a full turn

WORD = re.compile(r"\s*([A-Za-z])\s*([+-]?(?:\d+(?:\.\d*)?|\.\d+))", re.ASCII)
HINTS = {
    "R": "I, J, K from the start point to the centre: the standard has no arcs by radius",
    "G20": "G70 for inch, or the option inch_codes (--inch-codes) where G20 means inch; on some controls it means something else",
    "G21": "G71 for millimetres, or the option inch_codes (--inch-codes) where G21 means millimetres; on some controls it means something else",
    "#": "numbers; variables are a control's own",
    "=": "numbers; variables are a control's own",
    "[": "numbers; expressions are a control's own",
    "/": "a program without blocks that may be skipped",
    ";": "comments in parentheses",
    "A": "no rotary axes: what they turn depends on the machine",
    "B": "no rotary axes: what they turn depends on the machine",
    "C": "no rotary axes: what they turn depends on the machine",
    "E": "decimal numbers",
}  # fmt: skip


def read_machine_code(data: bytes, name, sha256: str, options) -> Course:
    """The moves of a program. options.axis: the tool's +Z in the part frame, which no program of this kind tells. Raises ReadError."""
    program = _Program(name, sha256, options.inch_codes, options.units)
    axis = options.axis
    for number, line in enumerate(decode(name, data, EXPECTED).split("\n"), 1):
        program.block(number, line)
    if axis is None:
        raise ReadError(name, "", "machine code, which says nothing of how the tool stands", "axis (--axis i,j,k): the tool's +Z, towards the work, in the part frame")
    return program.course(axis)


class _Program:
    """The state that words leave to later blocks, and the moves so far. Positions in m."""

    def __init__(self, name, sha256, inch_codes, units):
        self.name, self.sha256, self.inch_codes = name, sha256, inch_codes
        self.motion = self.plane = self.distance = self.speed = self.perminute = None
        self.unit = UNIT_OF.get(units)
        self.place = [None, None, None]
        self.ended = self.percent = self.number = 0
        self.moves, self.begin, self.first_line = [], None, 0
        self.dwelt = self.rapids = False
        self.off, self.off_line, self.pointless, self.inches = 0.0, 0, 0, False

    def refuse(self, found, expected):
        return ReadError(self.name, f"line {self.number}", found, expected)

    def block(self, number, line):
        """Take one line."""
        self.number = number
        text = self._without_comments(line).strip()
        if text.startswith("%"):
            self.percent += 1
            self.ended = self.ended or self.percent > 1
            if text[1:].strip():
                raise self.refuse(f"{quoted(text)}", "a line of % alone")
            return
        if not text:
            return
        if self.ended:
            raise self.refuse(f"{quoted(text)} after the end of the program", "nothing after M02, M30 or the second %")
        self._act(*self._words(text))

    def _without_comments(self, line):
        if "(" not in line and ")" not in line:
            return line
        kept, depth = [], 0
        for letter in line:
            depth += letter == "("
            if depth == 0:
                kept.append(letter)
            depth -= letter == ")"
            if depth not in (0, 1):
                break
        if depth:
            raise self.refuse("a parenthesis without its other one, or one inside another", "comments such as (first seam), closed on their line")
        return "".join(kept)

    def _words(self, text):
        """G numbers by group, and the other words by letter."""
        codes, words, at, first = {}, {}, 0, True
        while at < len(text):
            found = WORD.match(text, at)
            if not found or text[found.end() : found.end() + 1] == ",":
                raise self._bad_word(text[at:].strip())
            letter, digits, at = found[1].upper(), found[2], found.end()
            if letter == "N":
                if not first or not digits.isdigit():
                    raise self.refuse(f"{quoted(found[0].strip())}", "N with a whole number, once, at the start of the block")
            elif letter == "G":
                group, code = self._code(digits, found[0].strip())
                if group in codes or (group in ("motion", "dwell") and codes.keys() & {"motion", "dwell"}):
                    raise self.refuse(f"{quoted(found[0].strip())} beside {'G%02d' % codes.get(group, codes.get('motion', codes.get('dwell')))}", "one of them in a block")
                codes[group] = code
            elif letter == "M":
                if digits not in ("2", "02", "30"):
                    raise self.refuse(quoted(found[0].strip()), f"one of {ALLOWED}")
                self.ended = True
            elif letter in "XYZIJKF":
                if letter in words:
                    raise self.refuse(f"{letter} twice", "each word once in a block")
                words[letter] = float(digits)
                if "." not in digits and letter != "F" and words[letter] and not self.pointless:
                    self.pointless = self.number
            else:
                raise self._bad_word(found[0].strip())
            first = False
        return codes, words

    def _bad_word(self, rest):
        word = re.match(r"[A-Za-z]?[^\sA-Za-z]*", rest)[0] or rest[:1]
        hint = HINTS.get(word[:1].upper()) or next((HINTS[mark] for mark in "#=[" if mark in word), None)
        if len(word) == 1 and word.isalpha() and not hint:
            return self.refuse(f"{quoted(word)} without a number", "a letter and a decimal number, such as X10.5")
        if "," in word:
            return self.refuse(quoted(word), "a decimal point, not a comma")
        return self.refuse(quoted(word), hint or f"one of {ALLOWED}")

    def _code(self, digits, word):
        code = int(digits) if digits.isdigit() and len(digits) <= 3 else None
        if code in (20, 21) and not self.inch_codes:
            raise self.refuse(quoted(word), HINTS[f"G{code}"])
        if code not in GROUPS:
            raise self.refuse(quoted(word), f"one of {ALLOWED}")
        return GROUPS[code], code

    def _act(self, codes, words):
        if "units" in codes:
            self.unit = INCH if codes["units"] in (70, 20) else MM
        self.plane = codes.get("plane", self.plane)
        self.distance = codes.get("distance", self.distance)
        self.perminute = codes.get("feed", self.perminute)
        if "dwell" in codes:
            return self._dwell(words)
        self.motion = codes.get("motion", self.motion)
        if "F" in words:
            self._feed(words.pop("F"))
        if not words:
            return None
        if self.motion is None:
            raise self.refuse(f"{next(iter(words))} before any motion word", "G00, G01, G02 or G03 in or before this block")
        offsets = [letter for letter in words if letter in CENTRE]
        if offsets and self.motion in (0, 1):
            raise self.refuse(f"{offsets[0]} in a block of G{self.motion:02d}", "I, J, K with G02 or G03 only")
        self._need(self.unit, "a coordinate before its unit", "G71 (millimetre) or G70 (inch) before it, or units (--units mm or inch)")
        self._need(self.distance, "a coordinate before G90 or G91", "G90 (from the origin) or G91 (from the last point) before it")
        return self._arc(words) if self.motion in (2, 3) else self._line(words)

    def _need(self, value, found, expected):
        if value is None:
            raise self.refuse(found, expected)

    def _dwell(self, words):
        if len(words) != 1 or not words.keys() <= {"F", "X"}:
            raise self.refuse(f"G04 with {' '.join(words) or 'nothing'}", "G04 with F or X, the time in seconds, alone in its block")
        seconds = next(iter(words.values()))
        if not 0.0 <= seconds <= 1e6:
            raise self.refuse(f"a dwell of {seconds:g} s", "0 to 1e6 seconds")
        self.dwelt = True
        self.moves.append(("dwell", self.number, seconds))

    def _feed(self, feed):
        self._need(self.unit, "F before its unit", "G71 (millimetre) or G70 (inch) before it, or units (--units mm or inch)")
        self._need(self.perminute, "F before G94", "G94 (feed a minute) in or before this block: without it F may mean feed a turn or a time")
        if not feed > 0.0:
            raise self.refuse(f"F{feed:g}", "a feed above 0")
        self.inches = self.inches or self.unit == INCH
        self.speed = feed * self.unit / 60.0

    def _target(self, words):
        """The block's end point; coordinates that are not known yet stay None."""
        place = list(self.place)
        for k, letter in enumerate(AXES):
            if letter in words:
                step = metres(words[letter], self.unit)
                if self.distance == 91 and place[k] is None:
                    raise self.refuse(f"{letter} from a point that is not known", f"{letter} once with G90 before it")
                place[k] = place[k] + step if self.distance == 91 else step
        return place

    def _line(self, words):
        self.place = self._target(words)
        if self.begin is None:
            return self._begin()
        if self.motion == 0:
            self.rapids = True
            self.moves.append(("air", self.number, tuple(self.place)))
        else:
            self._need(self.speed, "G01 before any F", "F, the feed, in or before this block")
            self.moves.append(("line", self.number, tuple(self.place), self.speed))
        return None

    def _begin(self):
        """The path begins at the first point of which all three coordinates are known."""
        if None not in self.place:
            self.begin, self.first_line = tuple(self.place), self.number
        elif self.motion == 1:
            missing = AXES[self.place.index(None)]
            raise self.refuse(f"G01 while {missing} is not known", f"{missing} in or before this block")

    def _arc(self, words):
        word = f"G{self.motion:02d}"
        self._need(self.plane, f"{word} before its plane", "G17 (XY), G18 (ZX) or G19 (YZ) in or before this block")
        self._need(self.begin, f"{word} from a point that is not known", "X, Y and Z of the start before it")
        self._need(self.speed, f"{word} before any F", "F, the feed, in or before this block")
        first, second, third = PLANES[self.plane]
        if CENTRE[third] in words:
            raise self.refuse(f"{CENTRE[third]} in a plane of G{self.plane}", f"{CENTRE[first]} and {CENTRE[second]}, from the start point to the centre")
        if not {CENTRE[first], CENTRE[second]} & words.keys():
            raise self.refuse(f"{word} without a centre", f"{CENTRE[first]} and {CENTRE[second]}, from the start point to the centre")
        start, self.place = self.place, self._target(words)
        centre, normal = list(start), [0.0, 0.0, 0.0]
        for k in (first, second):
            centre[k] = start[k] + metres(words.get(CENTRE[k], 0.0), self.unit)
        normal[third] = 1.0 if self.motion == 3 else -1.0
        sweep = self._sweep(start, centre, first, second)
        self.moves.append(("arc", self.number, tuple(self.place), tuple(centre), tuple(normal), sweep, self.speed))

    def _sweep(self, start, centre, first, second):
        """rad, above 0 and at most a full turn; the circle must pass the start and, but for rounding, the end."""
        a, b = start[first] - centre[first], start[second] - centre[second]
        c, d = self.place[first] - centre[first], self.place[second] - centre[second]
        radius, other = math.hypot(a, b), math.hypot(c, d)
        if not radius > SAME:
            raise self.refuse("an arc of radius 0", "a centre away from the start point")
        off = abs(other - radius)
        if not off <= min(ARC_SLACK, 0.01 * radius):
            raise self.refuse(f"an arc that begins {radius / MM:.6g} mm from its centre and ends {other / MM:.6g} mm from it",
                              f"the same radius, to {min(ARC_SLACK, 0.01 * radius) / MM:.2g} mm (I, J, K count from the start point)")  # fmt: skip
        if off > self.off:
            self.off, self.off_line = off, self.number
        if math.hypot(a - c, b - d) <= SAME:
            return 2.0 * math.pi
        turn = math.atan2(a * d - b * c, a * c + b * d)  # from the start to the end, anticlockwise
        return (turn if self.motion == 3 else -turn) % (2.0 * math.pi)

    def course(self, axis):
        if self.begin is None:
            raise ReadError(self.name, "", "no point with X, Y and Z", "a program that moves the tool")
        draft = Draft(self.name, self.sha256, True, self.begin, self.first_line)
        draft.pose(tuple(axis))
        for what, number, *rest in self.moves:
            if what == "air":
                draft.line_to(rest[0], number, air=True)
            elif what == "line":
                draft.line_to(rest[0], number, speed=rest[1])
            elif what == "arc":
                end, centre, normal, sweep, speed = rest
                draft.arc_about(end, centre, normal, sweep, number, speed=speed)
            else:
                draft.dwell(rest[0], number, air=draft.moves[-1][4] if draft.moves else True)
        draft.notes += self._notes(axis)
        return draft.finish()

    def _notes(self, axis):
        yield axis_asked(axis)
        if self.rapids:
            yield "G00 is an air move, taken as a straight line; on some machines the axes move independently."
        if self.dwelt:
            yield "The time of G04 is taken in seconds."
        if self.inches:
            yield "F is taken in inches a minute where lengths are in inches; on some controls it stays in mm."
        if self.pointless:
            yield f"Numbers without a decimal point, first in line {self.pointless}, are taken as whole {'millimetres' if self.unit == MM else 'inches'}."
        if self.off > 1e-7:
            yield f"Arcs end up to {self.off / MM:.2g} mm off their circle (line {self.off_line}), which is drawn in evenly along the arc."
