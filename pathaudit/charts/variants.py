"""Variants of one job side by side."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from ..findings import peak_shares
from .along import PATTERNS, shown_time
from .look import FAINT, LINE, SEVERITY, SOFT, lines_of, plain, turned_out

_BAR, _LEAST = 34, 110  # px: a variant, all of them at least
_WIDTHS = (1.0, 1.0, 1.0, 1.0, 1.5)
_ENDS = (2.0, 2.0, 2.0, 2.0, 2.9)  # times the longest bar: where a column ends, with room for the words


@dataclass(frozen=True)
class Figures:
    """What is compared of one audit; NaN where there is nothing: worst_share (of the joint speed limits) and where, least_sigma, reserve,
    duration s, fails, warns."""

    worst_share: float
    worst_where: str
    least_sigma: float
    reserve: float
    duration: float
    fails: int
    warns: int


def variants_compared(audits):
    """Audits side by side: worst joint speed share, least sigma_min, least reserve, duration, number of findings.

    audits: a mapping of names to audits, shown in its order. Raises ValueError.

    >>> variants_compared({"as programmed": audit, "retimed": audit.retime().audit()})  # doctest: +SKIP
    """
    import plotly.graph_objects as go

    if not isinstance(audits, Mapping) or not audits:
        raise ValueError(f"audits is {'an empty mapping' if isinstance(audits, Mapping) else type(audits).__name__}, expected a mapping of names to audits")
    found, limits = [figures_of(audit) for audit in audits.values()], [audit.cell.thresholds for audit in audits.values()]
    figure, columns, places = go.Figure(), _columns(found, limits), list(range(len(found)))
    ends = np.cumsum([0.0, *_WIDTHS]) / sum(_WIDTHS)
    for number, (title, bounds, words, bars) in enumerate(columns):
        axis = f"x{number + 1 if number else ''}"
        for bar in bars:
            figure.add_bar(y=places, orientation="h", xaxis=axis, **{"name": title, **bar})
        for bound in bounds:
            figure.add_shape(type="line", xref=axis, yref="paper", x0=bound, x1=bound, y0=0, y1=1, line={"color": SOFT, "width": 1.2, "dash": "dash"})
        most = _ENDS[number] * (max([*np.sum([bar["x"] for bar in bars], axis=0), *bounds]) or 1.0)
        figure.add_scatter(x=[most] * len(places), y=places, xaxis=axis, mode="text", text=words, textposition="middle left", hoverinfo="skip", showlegend=False)
        domain = [ends[number] + 0.012, ends[number + 1] - 0.012]
        figure.update_layout({f"xaxis{axis[1:]}": {"title": {"text": title, "standoff": 6}, "domain": domain, "range": [0.0, most], "gridcolor": FAINT, "nticks": 3, "tickangle": 0}})
    rows = {"tickvals": places, "ticktext": ["<br>".join(lines_of(name, 28)) for name in audits], "range": [len(found) - 0.5, -0.5],
            "automargin": True, "zeroline": False, "showgrid": False, "ticksuffix": " "}
    turned_out(figure, "Variants side by side", lines_of("Dashed: the bounds that a finding is judged by, where all variants have the same."), "variants",
               plot_height=max(_LEAST, _BAR * len(found)), bottom=74, yaxis=rows, barmode="stack", bargap=0.35, hovermode="closest")
    return figure.update_layout(legend={"x": 1, "xanchor": "right"})


def _columns(found, limits):
    """(title, bounds, words, bars) of each column: what stands at the end of each row, and the bars as keywords of traces."""
    shares = [100.0 * one.worst_share for one in found]
    counts = [f"{one.fails} fail, {one.warns} warn" if one.fails and one.warns else f"{one.fails} fail" if one.fails else f"{one.warns} warn" if one.warns else "none"
              for one in found]
    return [
        ("worst joint<br>speed, % of<br>its limit", _common(limits, lambda one: [100.0 * one.speed_share_fail]), *_bar(shares, ".0f", [one.worst_where for one in found])),
        ("least<br>sigma_min", _common(limits, lambda one: [one.sigma_min_warn, one.sigma_min_fail]), *_bar([one.least_sigma for one in found], ".3f")),
        ("least reserve,<br>times<br>programmed", [1.0], *_bar([one.reserve for one in found], ".2f")),
        ("duration, s", [], *_bar([one.duration for one in found], ".2f")),
        ("findings", [], counts, [_count("fail", [one.fails for one in found]), _count("warn", [one.warns for one in found])]),
    ]


def _bar(values, digits, where=None):
    words = [f"{value:{digits}}" if np.isfinite(value) else "no limit" if value == np.inf else "none" for value in values]
    told = words if where is None else [f"{word} %, {plain(place)}" for word, place in zip(words, where, strict=True)]
    return words, [{"x": [value if np.isfinite(value) else 0.0 for value in values], "customdata": told, "hovertemplate": "%{customdata}<extra></extra>",
                    "marker": {"color": LINE}, "showlegend": False}]


def _count(severity, counts):
    pattern = {"shape": PATTERNS[severity]["shape"], "fgcolor": SEVERITY[severity], "bgcolor": "white", "size": 7, "solidity": 0.35}
    edge = {"color": SEVERITY[severity], "width": [1.5 if count else 0.0 for count in counts]}
    return {"x": counts, "name": severity, "marker": {"color": SEVERITY[severity], "pattern": pattern, "line": edge}, "hovertemplate": f"%{{x}} {severity}<extra></extra>"}


def _common(limits, bounds):
    """The bounds (numbers) where they are the same for all variants, else none."""
    each = [bounds(one) for one in limits]
    return each[0] if all(one == each[0] for one in each) else []


def figures_of(audit) -> Figures:
    """What is compared of one audit."""
    rates, shares = audit.rates, peak_shares(audit.rates)
    reached = np.isfinite(shares).any()
    k, j = np.unravel_index(np.nanargmax(shares), shares.shape) if reached else (0, 0)
    where = f"joint {audit.cell.arm.joint_names[j]} at {shown_time(audit)[k]:.3f} s" if reached else "no pose is reached"
    severities = [finding.severity for finding in audit.finding_list]
    return Figures(float(shares[k, j]), where, _least(rates.sigma_min), _least(rates.reserve), audit.path.duration,
                   severities.count("fail"), severities.count("warn"))


def _least(values):
    values = values[~np.isnan(values)]
    return float(values.min()) if values.size else np.nan
