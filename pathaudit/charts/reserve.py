"""The reserve along the path."""

import numpy as np

from .along import along_path, limit_line, marks, note_on, numbered, stacked
from .look import GREEN, LINE, for_file, lines_of, plain

_MOST = 1000.0  # a reserve above it is no news: the tool almost rests
_TICKS = [digit * 10.0**power for power in range(-3, 4) for digit in (1, 2, 5)]


def reserve_along_path(audit, *, along="time"):
    """How many times the programmed speed the joint speed limits allow, on a scale of powers of ten, and which joint is loaded most.

    1 is at the limit. A gap where the pose is not reached or the arm rests. along: "time" or "distance". Raises ValueError.
    """
    rates, arm = audit.rates, audit.cell.arm
    share = np.where(np.isfinite(rates.speed_share), rates.speed_share, -1.0)
    joint, most = share.argmax(axis=1), 100.0 * share.max(axis=1)
    moves = most > 0.0
    view = along_path(audit, along, np.column_stack([rates.reserve, np.where(moves, most, np.nan)]), numbered(audit, lambda f: True))
    reserve = view.drawn(rates.reserve)
    names = [plain(name) for name in arm.joint_names]
    line = {"type": "scatter", "mode": "lines", "x": view.x, "y": reserve, "customdata": view.other, "name": "reserve", "line": {"color": LINE, "width": 1.6},
            "hovertemplate": f"reserve %{{y:.2f}}<br>{view.other_words}<extra></extra>", "showlegend": False}
    loaded = {"type": "scatter", "mode": "markers", "x": view.x, "y": view.drawn(np.where(moves, joint, np.nan)), "name": "joint that is loaded most",
              "customdata": view.drawn(most), "text": [names[k] for k in joint[view.samples]], "marker": {"symbol": "square", "size": 5, "color": GREEN},
              "hovertemplate": "most loaded: %{text}, %{customdata:.1f} % of its speed limit<extra></extra>"}
    worst = marks(view, lambda f: rates.reserve[f.worst])
    below = lines_of(f"{audit.cell.name}. How many times as fast the joint speed limits would let the tool go; 1 is at the limit, below it is too fast.")
    figure = stacked(view, ("reserve, times the<br>programmed speed", "joint loaded most"), (260, max(60, 17 * arm.n)),
                     ([line, limit_line(view, 1.0, "at the limit"), *worst], [loaded]), "Reserve along the path", below, for_file("reserve-by", along),
                     lambda f: f"{f.kind} {f.joint or ''}".strip())
    there = reserve[np.isfinite(reserve) & (reserve > 0)]
    low, high = (min(0.5, 0.8 * there.min()), min(_MOST, max(3.0, 1.3 * there.max()))) if there.size else (0.5, 3.0)
    figure.update_layout(yaxis={"type": "log", "range": [float(np.log10(low)), float(np.log10(high))], "tickvals": _TICKS, "ticktext": [f"{tick:g}" for tick in _TICKS]},
                         yaxis2={"tickvals": list(range(arm.n)), "ticktext": names, "range": [arm.n - 0.5, -0.5], "zeroline": False})
    note_on(figure, 1, 0.0, "at the limit", above=False)
    return figure
