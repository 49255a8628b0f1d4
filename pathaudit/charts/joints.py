"""One joint along the path."""

import numpy as np

from ..arm import unit_of
from .along import along_path, limit_line, marks, note_on, numbered, stacked
from .look import LINE, for_file, lines_of, plain
from .places import joint_number

_ROW = {"joint speed": 2, "joint acceleration": 3}


def joint_over_time(audit, joint, *, along="time"):
    """Position, speed and acceleration of one joint with its travel and its limits, and where it is flagged.

    joint: a name, or a number from 0. along: "time" or "distance". Raises ValueError.

    >>> joint_over_time(audit, "j4").write_html("j4.html")  # doctest: +SKIP
    """
    arm = audit.cell.arm
    j = joint_number(arm, joint)
    scale, unit = unit_of(arm, j)
    name = arm.joint_names[j]
    values = scale * np.stack([audit.joints[:, j], audit.rates.joint_speed[:, j], audit.rates.joint_acceleration[:, j]], axis=1)
    limits = scale * np.array([[arm.lower[j], arm.upper[j]], [-arm.speed[j], arm.speed[j]], [-arm.acceleration[j], arm.acceleration[j]]])
    view = along_path(audit, along, values, numbered(audit, lambda f: f.joint == name or f.kind == "unreachable"))
    units = (unit, f"{unit}/s", f"{unit}/s2")
    titles = [f"{word}, {per}" for word, per in zip(("position", "speed", "acceleration"), units, strict=True)]
    traces = [_row(view, row, values[:, row], limits[row], titles[row], units[row]) for row in range(3)]
    below = lines_of(f"{audit.cell.name}. Dashed: ends of the travel, limits of speed and acceleration.")
    figure = stacked(view, titles, (170, 170, 130), traces, f"Joint {name} along the path", below, for_file("joint", name),
                     lambda f: f.kind.removeprefix("joint ") + (f" {f.joint}" if f.joint and f.joint != name else ""))
    for row in range(3):
        _scale(figure, row + 1, values[:, row], limits[row], units[row])
    return figure


def _row(view, row, values, limits, title, unit):
    word = title.split(",")[0]
    where = f"<br>{view.other_words}" if row == 0 else ""
    line = {"type": "scatter", "mode": "lines", "x": view.x, "y": view.drawn(values), "name": plain(word), "line": {"color": LINE, "width": 1.6},
            "hovertemplate": f"{word} %{{y:.2f}} {unit}{where}<extra></extra>", "showlegend": False}
    if row == 0:
        line["customdata"] = view.other
    bounds = [limit_line(view, limit, "limit", legend=bool(row == 1 and limit > 0)) for limit in limits if np.isfinite(limit)]
    worst = marks(view, lambda f: values[f.worst] if _ROW.get(f.kind, 1) == row + 1 else None)
    return [line, *bounds, *worst]


def _scale(figure, row, values, limits, unit):
    """The range of a row: all of the curve and its limits, with room for their words."""
    known = limits[np.isfinite(limits)]
    there = np.concatenate([values[np.isfinite(values)], known])
    if there.size:
        low, high = float(there.min()), float(there.max())
        room = 0.2 * (high - low) or 1.0
        figure.update_layout({f"yaxis{row if row > 1 else ''}": {"range": [low - room, high + room]}})
    word = ("end of travel", "limit", "limit")[row - 1]
    for limit in known:
        note_on(figure, row, limit, f"{word} {limit:.5g} {unit}", above=limit == known.max())
    if not known.size:
        note_on(figure, row, 0.0, "travel without end" if row == 1 else "no limit is stated")
