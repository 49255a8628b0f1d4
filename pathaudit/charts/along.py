"""Measures along the path: which samples are drawn, the axis of time or distance, rows that share it, and findings as bands."""

from dataclasses import dataclass

import numpy as np

from ..report.scene import clock_offset, worst_text
from ..report.thinning import kept_of_path
from .look import FAINT, SEVERITY, SOFT, lines_of, plain, turned_out

MOST_SAMPLES = 5000
PATTERNS = {"warn": {"shape": "/", "size": 8, "solidity": 0.16}, "fail": {"shape": "x", "size": 6, "solidity": 0.22}}
SYMBOLS = {"warn": "triangle-up", "fail": "x"}
_GAP, _BOTTOM, _LABEL = 18, 54, 15  # px between rows, below them, a line of labels
_WIDTH, _SIGN = 660.0, 6.4  # px: a plot in a notebook beside a side bar, a sign of a label; labels are kept apart by them
_LEVELS = 4


@dataclass(frozen=True, eq=False)
class Along:
    """samples (M,): sample numbers that are drawn; x (M,) s or mm, as the axis says. findings: (number, Finding) pairs that are shown."""

    audit: object
    samples: np.ndarray
    by_time: bool
    findings: tuple

    @property
    def x(self):
        return shown_time(self.audit)[self.samples] if self.by_time else 1e3 * self.audit.path.distance[self.samples]

    @property
    def other(self):
        """(M,) what the axis does not show: mm, or s"""
        return 1e3 * self.audit.path.distance[self.samples] if self.by_time else shown_time(self.audit)[self.samples]

    @property
    def other_words(self):
        """How a hover label shows `other` where it is the trace's customdata"""
        return "at %{customdata:.1f} mm" if self.by_time else "at %{customdata:.3f} s"

    def ends(self, finding):
        """Where the band of a finding starts and ends"""
        if not self.by_time:
            return finding.from_mm, finding.to_mm
        back = self.audit.time[0] - clock_offset(self.audit)
        return finding.t_start - back, finding.t_end - back

    def drawn(self, values):
        """values (N,) at the samples that are drawn, infinite ones as NaN, which leaves a gap"""
        values = np.asarray(values, dtype=float)[self.samples]
        return np.where(np.isfinite(values), values, np.nan)


def along_path(audit, along, series, findings):
    """What to draw of an audit: series (N, S) are the values whose peaks have to stay; findings: (number, Finding) pairs."""
    if along not in ("time", "distance"):
        raise ValueError(f"along is {along!r}, expected 'time' or 'distance'")
    kept = kept_of_path(audit.motion.reached, series, MOST_SAMPLES, [f.worst for _, f in findings])
    return Along(audit, kept, along == "time", tuple(findings))


def shown_time(audit):
    """(N,) s, as every report writes it: the path's own, or from the first sample on where that is a clock's date"""
    return audit.time - audit.time[0] + clock_offset(audit)


def numbered(audit, wanted):
    """(number, Finding) pairs of the findings that `wanted` keeps; the numbers are those of every report."""
    return [(number, finding) for number, finding in enumerate(audit.finding_list, 1) if wanted(finding)]


def stacked(view, titles, heights, traces, title, below, file_name, words):
    """A figure of rows that share the axis of `view`, topmost first: their titles, heights (px) and lists of traces.

    words(finding) -> a short label for its band.
    """
    import plotly.graph_objects as go

    plot = sum(heights) + _GAP * (len(heights) - 1)
    figure, y, named = go.Figure(), 1.0, set()
    for row, (name, height, lines) in enumerate(zip(titles, heights, traces, strict=True), 1):
        axis = {"title": {"text": name, "standoff": 8}, "domain": [max(0.0, y - height / plot), y], "gridcolor": FAINT, "zerolinecolor": FAINT, "automargin": True}
        figure.update_layout({f"yaxis{row if row > 1 else ''}": axis})
        for line in lines:
            once = {"showlegend": False} if line["name"] in named else {}
            named |= {line["name"]} if line.get("showlegend", True) else set()
            figure.add_trace({"xaxis": "x", "yaxis": f"y{row if row > 1 else ''}", **line, **once})
        y -= (height + _GAP) / plot
    _add_bands(figure, view, len(heights))
    levels = _add_labels(figure, view, words)
    name, digits, unit = ("time, s", 3, "s") if view.by_time else ("distance along the path, mm", 1, "mm")
    across = {"title": {"text": name, "standoff": 8}, "anchor": f"y{len(heights)}" if len(heights) > 1 else "y", "gridcolor": FAINT, "zeroline": False,
              "hoverformat": f".{digits}f", "ticksuffix": f" {unit}", "showticksuffix": "last", "range": [float(view.x[0]), float(view.x[-1])]}
    return turned_out(figure, title, below, file_name, plot_height=plot, top=_LABEL * levels, bottom=_BOTTOM, xaxis=across,
                      hovermode="x unified", hoversubplots="axis")


def marks(view, y_of):
    """Traces with a symbol at the worst place of each finding that y_of (finding -> a value, or None) has a place for; its sentence on hover."""
    traces = []
    for severity in ("warn", "fail"):
        found = [(n, f, y_of(f)) for n, f in view.findings if f.severity == severity]
        found = [(n, f, y) for n, f, y in found if y is not None and np.isfinite(y)]
        if found:
            at = np.searchsorted(view.samples, [f.worst for _, f, _ in found])
            words = ["<br>".join([plain(f"{n} {severity}: {f.kind} {f.joint or ''} {worst_text(f)}"), *lines_of(f.why, 60)]) for n, f, _ in found]
            traces.append({"type": "scatter", "mode": "markers", "x": view.x[at], "y": [y for _, _, y in found], "text": words, "name": f"{severity}: worst place",
                           "hovertemplate": "%{text}<extra></extra>", "legendgroup": severity,
                           "marker": {"symbol": SYMBOLS[severity], "size": 9, "color": SEVERITY[severity], "line": {"color": "white", "width": 1}}})
    return traces


def limit_line(view, value, name, legend=True):
    """A trace: a dashed line at `value` over the whole path."""
    return {"type": "scatter", "mode": "lines", "x": [view.x[0], view.x[-1]], "y": [value, value], "name": name, "hoverinfo": "skip",
            "line": {"color": SOFT, "width": 1.2, "dash": "dash"}, "legendgroup": name, "showlegend": legend}


def note_on(figure, row, y, text, above=True):
    """Words at the right end of a row, at the height y."""
    figure.add_annotation(text=plain(text), x=1, xref="paper", xanchor="right", y=y, yref=f"y{row if row > 1 else ''}", yanchor="bottom" if above else "top",
                          showarrow=False, font={"size": 11, "color": SOFT}, bgcolor="rgba(255,255,255,0.75)")


def _add_bands(figure, view, rows):
    """Hatched bands behind the lines, in each row on a second axis from 0 to 1."""
    span = _span(view)
    for severity in ("warn", "fail"):
        x, y = [], []
        for _, finding in view.findings:
            if finding.severity == severity:
                start, end = _wide_enough(*view.ends(finding), 0.004 * span)
                x += [start, start, end, end, None]
                y += [0, 1, 1, 0, None]
        for row in range(rows if x else 0):
            figure.add_scatter(x=x, y=y, yaxis=f"y{rows + row + 1}", mode="lines", fill="toself", hoverinfo="skip", name=f"{severity}: flagged stretch", zorder=-1,
                               line={"color": SEVERITY[severity], "width": 1, "dash": "dot" if severity == "warn" else "solid"}, opacity=0.6, legendgroup=severity,
                               fillpattern={"fgcolor": SEVERITY[severity], "bgcolor": "rgba(0,0,0,0)", "fillmode": "overlay", **PATTERNS[severity]}, showlegend=row == 0)
    for row in range(rows if view.findings else 0):
        over = {"overlaying": f"y{row + 1 if row else ''}", "range": [0, 1], "visible": False, "fixedrange": True, "anchor": "x"}
        figure.update_layout({f"yaxis{rows + row + 1}": over})


def _span(view):
    return float(view.x[-1] - view.x[0]) or 1.0


def _wide_enough(start, end, least):
    middle, half = (start + end) / 2, max(end - start, least) / 2
    return middle - half, middle + half


def _add_labels(figure, view, words):
    """A label above each band where there is room for it, failures first; how many lines the labels take."""
    span, taken = _span(view), [[] for _ in range(_LEVELS)]
    for number, finding in sorted(view.findings, key=lambda pair: (pair[1].severity != "fail", pair[0])):
        text = f"{number} {finding.severity}: {words(finding)}"
        middle, half = (sum(view.ends(finding)) / 2 - view.x[0]) / span, 0.5 * _SIGN * len(text) / _WIDTH
        middle = min(max(middle, half), 1 - half) if half < 0.5 else 0.5
        level = next((k for k, spans in enumerate(taken) if all(abs(middle - m) > half + h for m, h in spans)), None)
        if level is None:
            continue
        taken[level].append((middle, half))
        figure.add_annotation(text=plain(text), x=middle, xref="paper", xanchor="center", y=1, yref="paper", yanchor="bottom", yshift=_LABEL * level + 1,
                              showarrow=False, font={"size": 11})
    return sum(1 for spans in taken if spans)
