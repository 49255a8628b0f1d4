"""The rows of the still picture: the same arrangement as the live timeline's, on a surface (surfaces.py)."""

import numpy as np

from .rows import nice_step
from .surfaces import FAINT, GROUND, INK, LANE, LINE, QUIET, SEVERITY, SOFT

HEAD, GAP, BLOCK, AXIS, LEFT, RIGHT = 17, 7, 17, 26, 70, 10


class Places:
    """Where rows, blocks and axis stand in a picture of the given width; `top` leaves room above."""

    def __init__(self, facts, width, top=0):
        self.left, self.plot = LEFT, width - LEFT - RIGHT
        self.duration, self.offset = facts["duration_s"] or 1.0, facts["offset_s"]
        self.strip = top + 14
        self.blocks, levels = self._stack(facts["findings"])
        y = self.strip + (BLOCK + 2) * max(1, levels) + 19
        self.process = y - 10
        self.rows = []
        for row in facts["rows"]:
            y += HEAD + GAP if row["head"] else 0
            self.rows.append((row, y))
            y += row["height"] + 2
        self.axis = y + 2
        self.bottom = y + AXIS

    def x(self, time):
        return self.left + self.plot * np.asarray(time) / self.duration

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
    for index, (row, y) in enumerate(places.rows):
        _draw_row(surface, places, facts, arrays, index, row, y)
    top, bottom = places.rows[0][1], places.axis - 4
    for start, end in facts["gaps"]:
        x, width = float(places.x(start)), max(2.0, float(places.x(end) - places.x(start)))
        surface.hatch(x, top, width, bottom - top, "gap", SOFT)
        if width > 70:
            _label(surface, x + width / 2, top + 12, "not reached")
    _draw_axis(surface, places)


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


def _draw_row(surface, places, facts, arrays, index, row, y):
    left, plot, height = places.left, places.plot, row["height"]
    if row["head"]:
        surface.text(left, y - HEAD / 2 - 1, row["head"])
    surface.rect(left, y, plot, height, fill=LANE)
    for start, end in facts["air"]:
        surface.rect(float(places.x(start)), y, float(places.x(end) - places.x(start)), height, fill=GROUND)
    surface.rect(left, y, plot, height, stroke=FAINT)
    if row["ticks"]:
        for value, words in row["ticks"]:
            surface.text(left - 8, float(np.clip(height_of(row, y, value), y + 5, y + height - 5)), words, align="right")
    else:
        surface.text(left - 8, y + height / 2, row["title"], INK, "right")
    for finding in facts["findings"]:
        if finding["row"] == index:
            x = float(places.x(finding["from_s"]))
            width = max(2.0, float(places.x(finding["to_s"])) - x)
            surface.hatch(x, y, width, height, finding["severity"], SEVERITY[finding["severity"]], 0.4)
    for value, severity in row["bounds"]:
        at = float(height_of(row, y, value))
        if y < at < y + height:
            surface.line([(left, at), (left + plot, at)], QUIET, 1, (1, 3) if severity == "warn" else ())
    _draw_lines(surface, places, arrays, row, y)


def _draw_lines(surface, places, arrays, row, y):
    time = arrays["time_s"].astype(float)
    values = [arrays[name].reshape(len(time), -1)[:, column].astype(float) for name, column, _ in row["lines"]]
    if len(values) == 2:
        ceiling, speed = (np.minimum(v, row["high"]) for v in values)
        for t, _ in beyond(time, speed - ceiling, 0.0, "above"):
            edges = [np.column_stack([places.x(t), height_of(row, y, np.interp(t, time, v))]) for v in (speed, ceiling)]
            surface.area(np.vstack([edges[0], edges[1][::-1]]), "fail", SEVERITY["fail"])
    for value, (_, _, style) in zip(values, row["lines"]):
        if style == "ceiling":
            for t, v in pieces(time, value <= row["high"], value):
                surface.line(thinned(places.x(t), height_of(row, y, v)), SOFT, 1.2, (6, 3))
            continue
        shown = np.minimum(value, row["high"])
        for t, v in pieces(time, np.isfinite(shown), shown):
            surface.line(thinned(places.x(t), height_of(row, y, v)), LINE, 1.4)
        for bound, severity in row["bounds"]:
            for t, v in beyond(time, shown, bound, row["bad"]):
                surface.line(thinned(places.x(t), height_of(row, y, v)), SEVERITY[severity], 2.4 if severity == "fail" else 1.8)


def pieces(time, mask, *values):
    """For every unbroken run of mask: (time, value, ...) of it."""
    edges = np.flatnonzero(np.diff(np.r_[False, mask, False]))
    for first, end in zip(edges[::2], edges[1::2]):
        yield (time[first:end], *(value[first:end] for value in values))


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


def _draw_axis(surface, places):
    step = nice_step(places.duration, places.plot / 80)
    digits = max(0, -int(np.floor(np.log10(step) + 1e-9)))
    first, last = places.offset / step, (places.offset + places.duration) / step
    for k in range(int(np.ceil(first - 1e-4)), int(np.floor(last + 1e-4)) + 1):
        x = float(places.x(k * step - places.offset))
        surface.line([(x, places.axis), (x, places.axis + 4)], SOFT)
        surface.text(x, places.axis + 13, f"{k * step:.{digits}f}", align="centre")
    surface.text(places.left - 8, places.axis + 13, "time, s", align="right")
