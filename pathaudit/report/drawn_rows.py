"""The rows of the still picture: the same arrangement as the live timeline's, on a surface (surfaces.py)."""

from dataclasses import dataclass

import numpy as np

from ..runs import runs
from .rows import nice_step
from .surfaces import FAINT, GROUND, INK, LANE, LINE, QUIET, SEVERITY, SOFT

HEAD, GAP, BLOCK, AXIS, LEFT, RIGHT, TITLE, PIN = 17, 7, 17, 26, 84, 10, 15, 18


@dataclass(frozen=True)
class Lane:
    """A row in its place: its number, what it is (rows.py), its top in px, what it is called, and the other rows that it stands for."""

    index: int
    row: dict
    y: float
    title: str
    away: tuple = ()


class Places:
    """Where pins, blocks, lanes and axis stand in a picture of the given width; `top` leaves room above. Groups are as they are shown at first.

    notes: placed notes (notes/placing.py), each with its flag on the strip.
    """

    def __init__(self, facts, width, top=0, notes=()):
        self.left, self.plot = LEFT, width - LEFT - RIGHT
        self.duration, self.offset = facts["duration_s"] or 1.0, facts["offset_s"]
        self.notes, self.pins = top + 10, notes
        self.strip = top + 14 + (PIN if notes else 0)
        self.blocks, levels = self._stack(facts["findings"])
        y = self.strip + (BLOCK + 2) * max(1, levels) + 19
        self.process = y - 10
        self.lanes, self.heads, self.titles = [], [], []
        y = self._arrange(facts, y)
        self.axis = y + 2
        self.bottom = y + AXIS

    def x(self, time):
        return self.left + self.plot * np.asarray(time) / self.duration

    def _arrange(self, facts, y):
        said = ""
        for group in facts["groups"]:
            if group["head"] != said:
                y += HEAD + GAP
                self.heads.append((group["head"], y - HEAD / 2 - 1))
            said, lanes = group["head"], group["lanes"]
            opened = len(lanes) > 1 and not group["folded"]
            if opened:
                self.titles.append((group["title"], y + TITLE / 2))
                y += TITLE
            for index in lanes if opened else (group["main"],):
                row = facts["rows"][index]
                self.lanes.append(Lane(index, row, y, row["title"] if opened else group["title"], () if opened else tuple(lanes)))
                y += row["height"] + 2
            y += 3 if opened else 0
        return y

    def _stack(self, findings):
        ends, blocks = [], []
        for finding in findings:
            from_x, to_x = float(self.x(finding["from_s"])), float(self.x(finding["to_s"]))
            width = max(18.0, to_x - from_x)
            start = float(np.clip((from_x + to_x - width) / 2, self.left, self.left + self.plot - width))
            free = [k for k, end in enumerate(ends) if end + 2 <= start]
            level = free[0] if free else len(ends) if len(ends) < 6 else int(np.argmin(ends))
            ends[level:level + 1] = [start + width]
            blocks.append((finding, start, width, level))
        return blocks, len(ends)


def height_of(row, y, value):
    """Where a value stands in its row, in px from the top of the picture."""
    low, high = row["low"], row["high"]
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.log(np.maximum(value, low) / low) / np.log(high / low) if row["log"] else (np.asarray(value) - low) / (high - low)
    return y + row["height"] * (1 - share)


def draw_rows(surface, places, facts, arrays):
    _draw_strip(surface, places, facts)
    _draw_pins(surface, places, arrays)
    for words, y in places.heads:
        surface.text(places.left, y, words)
    for words, y in places.titles:
        surface.text(10, y, shortened(surface, words, places.left + places.plot, 12), INK, size=12, bold=True)
    for lane in places.lanes:
        draw_lane(surface, places, facts, arrays, lane)
    for start, end in facts["gaps"]:
        if places.x(end) - places.x(start) > 70:
            _label(surface, float(places.x(0.5 * (start + end))), places.lanes[0].y + places.lanes[0].row["height"] / 2, "not reached")
    draw_axis(surface, places)


def shortened(surface, words, room, size=11):
    """The words as far as there is room for them."""
    end = len(words)
    while end > 1 and surface.text_width(words[:end] + ".." * (end < len(words)), size) > room:
        end -= 1
    return words if end == len(words) else words[:end] + ".."


def _label(surface, x, y, words, colour=INK):
    half = surface.text_width(words) / 2 + 4
    surface.rect(x - half, y - 8, 2 * half, 16, fill=GROUND)
    surface.text(x, y, words, colour, "centre")


def _draw_strip(surface, places, facts):
    surface.text(places.left - 8, places.strip + BLOCK / 2, "findings", align="right")
    if not places.blocks:
        surface.text(places.left + 2, places.strip + BLOCK / 2, "none")
    for finding, x, width, level in places.blocks:
        y, severity = places.strip + level * (BLOCK + 2), finding["severity"]
        surface.hatch(x, y, width, BLOCK, severity, SEVERITY[severity])
        surface.rect(x, y, width, BLOCK, stroke=SEVERITY[severity], width=2 if severity == "fail" else 1, dash=() if severity == "fail" else (3, 2))
        _label(surface, x + width / 2, y + BLOCK / 2, f"{finding['number']} {severity}" if width > 64 else str(finding["number"]))
    surface.text(places.left - 8, places.process, "process", align="right")
    surface.rect(places.left, places.process - 2, places.plot, 4, fill=SOFT)
    for start, end in facts["air"]:
        x, width = float(places.x(start)), max(1.0, float(places.x(end) - places.x(start)))
        surface.rect(x, places.process - 3, width, 6, fill=GROUND)
        surface.line([(x, places.process), (x + width, places.process)], SOFT, 1, (2, 3))
        if width > 34:
            _label(surface, x + width / 2, places.process, "air", SOFT)


def _draw_pins(surface, places, arrays):
    """A small flag for each note: filled while it is open, hollow when settled, with a question mark where its place has changed."""
    if not places.pins:
        return
    surface.text(places.left - 8, places.notes, "notes", align="right")
    feet = places.x(np.interp([note.sample for note in places.pins], arrays["sample"], arrays["time_s"]))
    room, end = min(20.0, places.plot / len(feet)), -np.inf
    for behind, k in zip(range(len(feet) - 1, -1, -1), np.argsort(feet, kind="stable").tolist()):
        note, foot = places.pins[k], float(feet[k])
        x = end = min(max(end + room, foot), places.left + places.plot - 16 - room * behind)
        surface.line([(x, places.notes - 7), (x, places.notes + 6), (foot, places.strip - 1)], SOFT)
        surface.rect(x, places.notes - 7, 16, 13, GROUND if note.note.status.settled else INK, INK)
        surface.text(x + 8, places.notes, f"{k + 1}{'?' if note.stale else ''}", INK if note.note.status.settled else GROUND, "centre", 10)


def draw_lane(surface, places, facts, arrays, lane):
    left, plot, height, row, y = places.left, places.plot, lane.row["height"], lane.row, lane.y
    surface.rect(left, y, plot, height, fill=LANE)
    for start, end in facts["air"]:
        surface.rect(float(places.x(start)), y, float(places.x(end) - places.x(start)), height, fill=GROUND)
    surface.rect(left, y, plot, height, stroke=FAINT)
    if row["ticks"]:
        for value, words in row["ticks"]:
            surface.text(left - 8, float(np.clip(height_of(row, y, value), y + 5, y + height - 5)), words, align="right")
    else:
        surface.text(left - 8, y + height / 2, shortened(surface, lane.title, left - 12), INK, "right")
    for finding in facts["findings"]:
        if finding["row"] == lane.index or finding["row"] in lane.away:
            x, foot = float(places.x(finding["from_s"])), finding["row"] != lane.index
            width = max(2.0, float(places.x(finding["to_s"])) - x)
            colour = SEVERITY[finding["severity"]]
            surface.hatch(x, y + height - 4 if foot else y, width, 4 if foot else height, finding["severity"], colour, 1.0 if foot else 0.4)
    for value, severity in () if row["word"] else row["bounds"]:
        at = float(height_of(row, y, value))
        if y < at < y + height:
            surface.line([(left, at), (left + plot, at)], QUIET, 1, (1, 3) if severity == "warn" else ())
    _draw_lines(surface, places, arrays, row, y)
    for start, end in facts["gaps"]:
        x, far = float(places.x(start)), float(places.x(end))
        surface.hatch(x, y, max(2.0, far - x), height, "gap", SOFT)
    if row["word"]:
        surface.text(left + 6, y + height / 2, row["word"])


def _draw_lines(surface, places, arrays, row, y):
    time = arrays["time_s"].astype(float)
    values = [arrays[name].reshape(len(time), -1)[:, column].astype(float) for name, column, _ in row["lines"]]
    if row["lines"][0][2] == "ceiling":
        _draw_shortage(surface, places, row, y, time, *(np.minimum(v, row["high"]) for v in (values[0], values[-1])))
    for value, (name, column, style) in zip(values, row["lines"]):
        shown = np.clip(value, row["low"], row["high"])
        if style == "band":
            _draw_band(surface, places, row, y, time, shown, np.clip(_upper(arrays[name], column).astype(float), row["low"], row["high"]))
            continue
        if style != "main":
            colour, width, dash = (SOFT, 1.2, (6, 3)) if style == "ceiling" else (INK, 1.1, (1.5, 2.5))
            for t, v in pieces(time, value <= row["high"], shown):
                surface.line(thinned(places.x(t), height_of(row, y, v)), colour, width, dash)
            continue
        for t, v in pieces(time, np.isfinite(shown), shown):
            surface.line(thinned(places.x(t), height_of(row, y, v)), LINE, 1.4)
        for bound, severity in row["bounds"]:
            bad = row["bad"] if row["bad"] != "outside" else "above" if bound > 50 else "below"
            for t, v in beyond(time, shown, bound, bad):
                surface.line(thinned(places.x(t), height_of(row, y, v)), SEVERITY[severity], 2.4 if severity == "fail" else 1.8)


def _upper(band, column):
    """The upper edge that belongs to a band's lower one (rows.Row)"""
    return band[:, column + band.shape[1] // 2]


def _draw_band(surface, places, row, y, time, low, high):
    """What the draws of a study lie in, as far as poses are reached."""
    for t, below, above in pieces(time, np.isfinite(low), low, high):
        if len(t) > 1:
            edges = [thinned(places.x(t), height_of(row, y, v)) for v in (below, above)]
            surface.wash(np.vstack([edges[0], edges[1][::-1]]))


def _draw_shortage(surface, places, row, y, time, ceiling, speed):
    """Where the tool speed lies above the largest possible."""
    for t, _ in beyond(time, speed - ceiling, 0.0, "above"):
        edges = [np.column_stack([places.x(t), height_of(row, y, np.interp(t, time, v))]) for v in (speed, ceiling)]
        surface.area(np.vstack([edges[0], edges[1][::-1]]), "fail", SEVERITY["fail"])


def pieces(time, mask, *values):
    """For every unbroken run of mask: (time, value, ...) of it."""
    for first, last in runs(mask):
        yield (time[first : last + 1], *(value[first : last + 1] for value in values))


def beyond(time, value, bound, bad):
    """(time, value) of each stretch on the bad side of bound, with the crossings put in at both ends."""
    side = value - bound if bad == "above" else bound - value
    crossing = np.flatnonzero((side[:-1] * side[1:] < 0))
    share = side[crossing] / (side[crossing] - side[crossing + 1])
    at = np.r_[np.arange(len(time)), crossing + share]
    order = np.argsort(at, kind="stable")
    t = np.r_[time, time[crossing] + share * (time[crossing + 1] - time[crossing])][order]
    v = np.r_[value, np.full(len(crossing), bound)][order]
    return pieces(t, np.r_[side >= 0, np.ones(len(crossing), dtype=bool)][order], v)


def thinned(x, y, tolerance=0.3):
    """(K, 2) the polyline with the points left out that lie within `tolerance` px of it (Douglas and Peucker 1973); extremes of a column stay."""
    points = np.column_stack([x, y])
    keep = np.zeros(len(points), dtype=bool)
    keep[[0, -1]] = True
    waiting = [(0, len(points) - 1)]
    while waiting:
        first, last = waiting.pop()
        if last - first < 2:
            continue
        chord, rest = points[last] - points[first], points[first + 1:last] - points[first]
        length = np.hypot(*chord)
        off = np.abs(chord[0] * rest[:, 1] - chord[1] * rest[:, 0]) / length if length > 1e-9 else np.hypot(rest[:, 0], rest[:, 1])
        worst = int(off.argmax())
        if off[worst] > tolerance:
            keep[first + 1 + worst] = True
            waiting += [(first, first + 1 + worst), (first + 1 + worst, last)]
    return points[keep]


def draw_axis(surface, places, name="time, s"):
    step = nice_step(places.duration, places.plot / 80)
    digits = max(0, -int(np.floor(np.log10(step) + 1e-9)))
    first, last = places.offset / step, (places.offset + places.duration) / step
    for k in range(int(np.ceil(first - 1e-4)), int(np.floor(last + 1e-4)) + 1):
        x = float(places.left + places.plot * (k * step - places.offset) / places.duration)
        surface.line([(x, places.axis), (x, places.axis + 4)], SOFT)
        surface.text(x, places.axis + 13, f"{k * step:.{digits}f}", align="centre")
    surface.text(places.left - 16, places.axis + 13, name, align="right")
