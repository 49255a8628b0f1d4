"""Cutter-location text in the words of ISO 4343 and ISO 3592: one statement a line, MAJOR/minor words and numbers.

Read: PARTNO REMARK UNITS FROM GOTO GODLTA MULTAX FEDRAT RAPID FINI, $ to go on in the next line, $$ before a comment. The vector i,j,k points from
the tip to the holder, so the tool's +Z is its opposite. All else is refused by name: what other words do differs between dialects.
"""

import math
import re

import numpy as np

from ..conventions import INCH, MM
from ..course import Course, Draft
from ..errors import ReadError, quoted
from .geometry import UNIT_OF, axis_asked, metres
from .sources import decode

EXPECTED = "cutter-location text"
ALLOWED = "PARTNO REMARK UNITS FROM GOTO GODLTA MULTAX FEDRAT RAPID FINI"
UNITS = {"MM": MM, "CM": 0.01, "INCHES": INCH, "FEET": 0.3048}
FEEDS = {"MMPM": MM / 60.0, "IPM": INCH / 60.0}
HOLDER = (0.0, 0.0, 1.0)
"""The vector from tip to holder where a file gives none."""

NUMBER = re.compile(r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[Ee][+-]?\d+)?", re.ASCII)
ARCS = "the arc as GOTO points: each processor writes arcs in its own way"
HINTS = {"CIRCLE": ARCS, "MOVARC": ARCS, "INDIRV": ARCS, "TLON": ARCS, "ARCMOV": ARCS, "ARCSLP": ARCS,
         "CYCLE": "the motion of the cycle as GOTO points",
         "PPRINT": "a file without PPRINT, which carries data that each post processor reads in its own way"}  # fmt: skip


def read_cutter_location(data: bytes, name, sha256: str, options) -> Course:
    """The moves of a file. options.units where the file has no UNITS; options.axis, the tool's +Z, where it has no vectors. Raises ReadError."""
    moves = _Moves(name, sha256, options.units, options.axis)
    for number, statement in _statements(name, decode(name, data, EXPECTED)):
        moves.take(number, statement)
    return moves.course()


def _statements(name, text):
    """(line number, statement) with comments gone and continued lines joined."""
    held, begun = [], 0
    for number, line in enumerate(text.split("\n"), 1):
        if not held and re.match(r"\s*(?:PARTNO|REMARK)", line, re.IGNORECASE):
            yield number, line.strip()
            continue
        line = line.split("$$", 1)[0]
        before, more, rest = line.partition("$")
        if rest.strip():
            raise ReadError(name, f"line {number}", f"{quoted(rest.strip())} after $", "nothing after $, which goes on in the next line, or $$ before a comment")
        if before.strip() or more:
            begun = begun if held else number
            held.append(before.strip())
        if held and not more and before.strip():
            yield begun, "".join(held)
            held = []
    if held:
        raise ReadError(name, f"line {begun}", "a statement that goes on with $ beyond the end of the file", "the rest of it")


class _Moves:
    """The state that statements leave to later ones, and the moves so far."""

    def __init__(self, name, sha256, units, axis):
        self.name, self.sha256, self.asked = name, sha256, axis
        self.unit = UNIT_OF.get(units)
        self.ended = self.rapid = self.rapids = self.vectors = self.multax = False
        self.holder = HOLDER if axis is None else tuple(-float(value) for value in axis)
        self.speed, self.place, self.draft, self.number = None, None, None, 0
        self.scaled = 0

    def refuse(self, found, expected):
        return ReadError(self.name, f"line {self.number}", found, expected)

    def take(self, number, statement):
        """Take one statement."""
        self.number = number
        if self.ended:
            raise self.refuse(f"{quoted(statement)} after FINI", "nothing after FINI")
        word, slash, rest = statement.partition("/")
        word = word.strip().upper()
        if re.match("PARTNO|REMARK", word):
            return
        act = {"UNITS": self._units, "FROM": self._from, "GOTO": self._goto, "GODLTA": self._godlta, "MULTAX": self._multax, "FEDRAT": self._fedrat,
               "RAPID": self._rapid, "FINI": self._fini}.get(word)  # fmt: skip
        if act is None:
            raise self.refuse(quoted(word or statement), HINTS.get(word, f"one of {ALLOWED}"))
        act([part.strip() for part in rest.split(",")] if slash else [])

    def _numbers(self, parts, counts, what):
        """The parts as floats, of which there must be as many as one of `counts`."""
        bad = next((part for part in parts if not NUMBER.fullmatch(part)), None)
        if bad is not None:
            raise self.refuse(f"{quoted(bad)} in {what}", "decimal numbers with commas between them")
        if len(parts) not in counts:
            raise self.refuse(f"{what} with {len(parts)} numbers", f"{' or '.join(map(str, counts))}")
        values = [float(part) for part in parts]
        if not np.isfinite(values).all():
            raise self.refuse(f"{what} with a number that is too large", "coordinates of the part")
        return values

    def _point(self, parts, what):
        """The point in m, and the vector from tip to holder that holds from here."""
        if self.unit is None:
            raise self.refuse(f"{what} before UNITS", "UNITS/MM or UNITS/INCHES before it, or units (--units mm or inch)")
        values = self._numbers(parts, (3, 6), what)
        if len(values) == 6:
            if not self.multax:
                raise self.refuse(f"{what} with 6 numbers", "3 numbers, or MULTAX/ON before it")
            if self.asked is not None:
                raise self.refuse(f"{what} with a vector, and the choice axis (--axis) as well", "one of them")
            self.holder, self.vectors = self._unit(values[3:], what), True
        elif not self.multax and self.vectors and self.holder != HOLDER:
            raise self.refuse(f"{what} after MULTAX/OFF with the tool tilted", "MULTAX/ON and a vector: what the tool does here differs between processors")
        return tuple(metres(value, self.unit) for value in values[:3])

    def _unit(self, vector, what):
        length = math.hypot(*vector)
        if not 1e-9 < length < 1e9:
            raise self.refuse(f"{what} with a vector of length {length:.3g}", "a vector from the tip to the holder")
        if abs(length - 1.0) > 1e-3 and not self.scaled:
            self.scaled = self.number
        return tuple(value / length for value in vector)

    def _begin(self, place):
        """The file's first point: from here on there is a course. The tool's +Z looks from the holder to the tip."""
        self.draft = Draft(self.name, self.sha256, True, place, self.number)
        self.draft.pose(self._axis())
        self.place = place

    def _axis(self):
        return tuple(0.0 - value for value in self.holder)

    def _from(self, parts):
        if self.draft is not None:
            raise self.refuse("FROM after the first point", "one FROM, before all moves")
        self._begin(self._point(parts, "FROM"))

    def _goto(self, parts):
        place = self._point(parts, "GOTO")
        if self.draft is None:
            self._begin(place)
            self.rapid = False
        else:
            self._move(place, "GOTO")

    def _godlta(self, parts):
        if self.draft is None:
            raise self.refuse("GODLTA from a point that is not known", "FROM or GOTO before it")
        values = self._numbers(parts, (1, 3), "GODLTA")
        step = np.array(values) if len(values) == 3 else values[0] * np.array(self.holder)
        self._move(tuple(a + metres(float(b), self.unit) for a, b in zip(self.place, step, strict=True)), "GODLTA")

    def _move(self, place, word):
        if self.speed is None and not self.rapid:
            raise self.refuse(f"{word} before any FEDRAT", "FEDRAT, such as FEDRAT/600,MMPM, or RAPID before it")
        air, self.rapid = self.rapid, False
        self.draft.line_to(place, self.number, pose=self.draft.pose(self._axis()), speed=np.nan if air else self.speed, air=air)
        self.place = place

    def _multax(self, parts):
        if [part.upper() for part in parts] not in ([], ["ON"], ["OFF"]):
            raise self.refuse(f"MULTAX/{','.join(parts)}"[:60], "MULTAX/ON or MULTAX/OFF")
        self.multax = not parts or parts[0].upper() == "ON"

    def _fedrat(self, parts):
        words = [part.upper() for part in parts]
        if any(word in ("IPR", "MMPR") for word in words):
            raise self.refuse("FEDRAT a revolution (IPR or MMPR)", "FEDRAT a minute: MMPM or IPM; nothing revolves here")
        if len(words) == 2 and words[0] in FEEDS:
            words.reverse()
        if len(words) != 2 or words[1] not in FEEDS:
            raise self.refuse(f"FEDRAT/{','.join(parts)}"[:60], "a number and its unit, such as FEDRAT/600,MMPM or FEDRAT/24,IPM")
        (feed,) = self._numbers(words[:1], (1,), "FEDRAT")
        if not feed > 0.0:
            raise self.refuse(f"FEDRAT/{feed:g}", "a feed above 0")
        self.speed = feed * FEEDS[words[1]]

    def _rapid(self, parts):
        if parts:
            raise self.refuse(f"RAPID/{','.join(parts)}"[:60], "RAPID alone, for the next motion")
        self.rapid = self.rapids = True

    def _units(self, parts):
        word = parts[0].upper() if len(parts) == 1 else ""
        if word not in UNITS:
            raise self.refuse(f"UNITS/{','.join(parts)}"[:60], f"UNITS/ with one of {', '.join(UNITS)}")
        if self.draft is not None and UNITS[word] != self.unit:
            raise self.refuse(f"UNITS/{word} after the first point", "one unit for the whole file, before its first point")
        self.unit = UNITS[word]

    def _fini(self, parts):
        if parts:
            raise self.refuse(f"FINI/{','.join(parts)}"[:60], "FINI alone")
        self.ended = True

    def course(self):
        if self.draft is None:
            raise ReadError(self.name, "", "no FROM and no GOTO", "a file that moves the tool")
        self.draft.notes += self._notes()
        return self.draft.finish()

    def _notes(self):
        if self.vectors:
            yield "The vectors i,j,k are taken to point from the tip to the holder, so the tool's +Z is their opposite; the turn about it is free."
        elif self.asked is None:
            yield "The file has no vectors: the holder is straight above the tip (0, 0, 1), as its words mean; the turn about the tool's axis is free."
        else:
            yield axis_asked(self.asked)
        if self.scaled:
            yield f"Vectors that are not of length 1, first in line {self.scaled}, are scaled to it."
        if self.rapids:
            yield "RAPID holds for the next motion, which is an air move in a straight line."
