"""Short fails drawn large, below the rows of the still picture: at the scale of the whole path they would be needles."""

from dataclasses import dataclass, replace

import numpy as np

from .drawn_rows import HEAD, Lane, draw_axis, draw_lane
from .surfaces import INK

SHORT = 30      # px in the rows: a fail that is narrower is drawn large as well
MOST = 3        # windows, and lanes in each
LEFT, GAP, LANE, AXIS = 84, 16, 40, 26


@dataclass(frozen=True)
class Window:
    """A piece of the path from `start` to `end` (s after the first sample) in its place; `numbers` of the findings that it shows."""

    numbers: tuple
    lanes: tuple
    start: float
    end: float
    left: float = 0.0
    plot: float = 0.0
    offset: float = 0.0
    axis: float = 0.0

    @property
    def duration(self):
        return self.end - self.start

    def x(self, time):
        """px of a time, at most the window's edge."""
        return self.left + self.plot * np.clip((np.asarray(time) - self.start) / self.duration, 0.0, 1.0)


def windows_of(facts, places):
    """At most MOST windows around the fails that are too short to be seen in the rows, and how many fails are left without one."""
    short = [f for f in facts["findings"] if f["severity"] == "fail" and f["row"] >= 0 and places.x(f["to_s"]) - places.x(f["from_s"]) < SHORT]
    found = []
    for finding in sorted(short, key=lambda f: f["from_s"]):
        middle, size = 0.5 * (finding["from_s"] + finding["to_s"]), max(4.0 * (finding["to_s"] - finding["from_s"]), places.duration / 2000)
        start, end = max(0.0, middle - size / 2), min(places.duration, middle + size / 2)
        number, lane = finding["number"], finding["row"]
        if found and start < found[-1].end:
            last = found[-1]
            lanes = last.lanes if lane in last.lanes else (*last.lanes, lane)
            found[-1] = replace(last, numbers=(*last.numbers, number), lanes=lanes, start=min(start, last.start), end=max(end, last.end))
        else:
            found.append(Window((number,), (lane,), start, end))
    return tuple(found[:MOST]), sum(len(w.numbers) for w in found[MOST:])


def height_of_windows(windows):
    return HEAD + 4 + max(min(len(w.lanes), MOST) for w in windows) * (LANE + 3) + AXIS if windows else 0


def draw_windows(surface, facts, arrays, windows, left_out, top, right):
    """Draw the windows side by side from LEFT to `right`, their words above them at `top`."""
    for k, window in enumerate(windows):
        share = (right - LEFT - GAP * (len(windows) - 1)) / len(windows)
        lanes = window.lanes[:MOST]
        bottom = top + HEAD + len(lanes) * (LANE + 3)
        placed = replace(window, left=LEFT + k * (share + GAP), plot=share, offset=facts["offset_s"] + window.start, axis=bottom)
        cut = _cut(arrays, window.start, window.end)
        for j, index in enumerate(lanes):
            row, y = {**facts["rows"][index], "height": LANE, "ticks": ()}, top + HEAD + j * (LANE + 3)
            draw_lane(surface, placed, facts, cut, Lane(index, row, y, ""))
            surface.text(placed.left + 4, y + 8, name_of(facts, index), INK, size=10)
        surface.text(placed.left, top + HEAD / 2 - 1, _words(window.numbers))
        draw_axis(surface, placed, "")
    if left_out:
        surface.text(LEFT - 8, top + HEAD / 2 - 1, f"+ {left_out} more", align="right")
    surface.text(LEFT - 8, top + HEAD + min(len(windows[0].lanes), MOST) * (LANE + 3) + 13, "time, s", align="right")


def _words(numbers):
    shown = ", ".join(map(str, numbers[:6])) + (" ..." if len(numbers) > 6 else "")
    return f"finding{'s' if len(numbers) > 1 else ''} {shown} magnified"


def name_of(facts, index):
    """What a lane is called where nothing stands beside it: the joint and what is measured."""
    group = next(g for g in facts["groups"] if index in g["lanes"])
    return f"{group['title']} {facts['rows'][index]['title']}" if len(group["lanes"]) > 1 else group["title"]


def _cut(arrays, start, end):
    """The columns between two times, with values put in at both ends."""
    time = arrays["time_s"].astype(float)
    inside = time[(time > start) & (time < end)]
    at = np.r_[start, inside, end]
    columns = {name: values.reshape(len(time), -1).astype(float) for name, values in arrays.items() if len(values) == len(time)}
    return {name: np.column_stack([np.interp(at, time, column) for column in values.T]) if name != "time_s" else at for name, values in columns.items()}
