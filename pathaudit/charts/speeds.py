"""Tool speeds along the path: as programmed, retimed, and the most that the joints allow."""

import numpy as np

from .along import along_path, numbered, stacked
from .look import INK, LINE, SOFT, for_file, lines_of, plain

_SHOWN = ("joint speed", "joint acceleration", "tool speed", "unreachable")  # what other times can cure, and where nothing can


def speeds_along_path(audit, retiming=None, *, along="time"):
    """The programmed tool speed, that of a retiming (the suggestion where none is given), the largest that the joint speed limits allow,
    and the retiming's factor, at the places of the path; along programmed "time" or "distance". Raises ValueError.
    """
    retiming = audit.suggestion if retiming is None else retiming
    samples, factor = audit.path.samples, np.asarray(getattr(retiming, "factor", ()), dtype=float)
    if factor.shape != (samples,):
        raise ValueError(f"retiming is {type(retiming).__name__} with {factor.size} factors, expected a retiming of this path, of {samples} samples")
    programmed = 1e3 * audit.rates.tool_speed
    retimed, most = factor * programmed, 1e3 * audit.rates.tool_speed_limit
    view = along_path(audit, along, np.column_stack([programmed, retimed, most, factor]), numbered(audit, lambda f: f.kind in _SHOWN))
    lines = [
        _line(view, most, "largest that the joint speeds allow", f"most %{{y:.1f}} mm/s<br>{view.other_words}", {"color": SOFT, "width": 1.3, "dash": "dash"}, customdata=view.other),
        _line(view, retimed, "retimed", "retimed %{y:.1f} mm/s", {"color": LINE, "width": 2}),
        _line(view, programmed, "programmed", "programmed %{y:.1f} mm/s", {"color": INK, "width": 1.2, "dash": "dot"}),
    ]
    limiting = [plain(words) or "nothing" for words in np.asarray(getattr(retiming, "binding", ("",) * samples), dtype=object)[view.samples]]
    below_row = _line(view, 100.0 * factor, "factor", "factor %{y:.1f} %<br>limited by: %{text}", {"color": LINE, "width": 1.6}, text=limiting, showlegend=False)
    seconds = f"{retiming.time[-1] - retiming.time[0]:.2f} s retimed, {audit.path.duration:.2f} s as programmed"
    below = lines_of(f"{audit.cell.name}: {seconds}. {retiming.why}")
    figure = stacked(view, ("tool speed, mm/s", "factor, % of<br>programmed"), (260, 100), (lines, [below_row]), "Tool speed along the path", below,
                     for_file("tool-speed-by", along), lambda f: f"{f.kind} {f.joint or ''}".strip())
    figure.update_layout(yaxis={"range": [0.0, _top(audit, programmed)]}, yaxis2={"range": [0.0, 110.0]})
    if along == "time":
        figure.update_xaxes(title_text="programmed time, s")
    return figure


def _line(view, values, name, hover, line, **more):
    return {"type": "scatter", "mode": "lines", "x": view.x, "y": view.drawn(values), "name": name, "line": line, "hovertemplate": f"{hover}<extra></extra>", **more}


def _top(audit, programmed):
    """Scaled to the process: air moves and the joints' own most may leave the row at its top."""
    process = audit.path.process
    there = programmed[process] if process.any() else programmed
    return 1.6 * float(np.max(there, initial=1e-3))
