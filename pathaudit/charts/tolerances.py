"""What tolerances do: how much each dimension tells, and bands along the path."""

import numpy as np

from .along import along_path, limit_line, note_on, numbered, stacked
from .look import LINE, SKY, for_file, lines_of, plain, turned_out

_ROW, _MOST = 24, 15  # px a bar, bars


def sensitivities(study, *, finding=None):
    """Bars: the share of the variance of what is watched that each dimension makes, to first order. The longest is what to measure better first.

    finding: its name, such as "joint speed, j4"; without one the finding that is nearest to failing by how much it varies. At most 15 bars, the rest in
    one. Raises ValueError where there is no such finding.
    """
    import plotly.graph_objects as go

    i = _number(study, finding)
    w, told = study.watched[i], [s for s in study.sensitivities(i) if s.share > 0.0]
    shown, rest = (told, 0.0) if len(told) <= _MOST else (told[: _MOST - 1], sum(s.share for s in told[_MOST - 1 :]))
    names = [plain(s.dimension.name) for s in shown] + ([f"{len(told) - len(shown)} more"] if rest else [])
    slopes = [f"{s.slope:+.3g} {plain(w.unit)} per {s.dimension.unit}, stated {s.dimension.words}" for s in shown] + ([""] if rest else [])
    shares = [100.0 * s.share for s in shown] + ([100.0 * rest] if rest else [])
    bars = {"type": "bar", "orientation": "h", "y": names, "x": shares, "customdata": slopes, "text": [f"{share:.1f} %" for share in shares], "textposition": "auto",
            "hovertemplate": "%{y}: %{x:.1f} % of the variance<br>%{customdata}<extra></extra>", "marker": {"color": LINE}, "name": "share of the variance"}
    name, straight = plain(study.name(i)), study.straight[i]
    below = lines_of(f"{study.audit.cell.name}. {study.draws:,} draws; standard deviation {study.spread[i] * w.scale:.3g} {w.unit}, {study.first_order[i] * w.scale:.3g} to first order. "
                     f"The slopes explain {100 * max(straight, 0.0):.0f} % of the variance.")
    across = {"title": {"text": "share of the variance, %", "standoff": 8}, "range": [0, 1.08 * max([*shares, 1.0])]}
    return turned_out(go.Figure([bars]), f"What to measure better first: {name}", below, for_file("sensitivities", study.name(i)), plot_height=_ROW * max(len(names), 3) + 20,
                      legend=False, xaxis=across, yaxis={"autorange": "reversed", "automargin": True}, bargap=0.3)


def _number(study, finding):
    if finding is None:
        return study.deciding
    names = [study.name(i) for i in range(len(study.watched))]
    if finding not in names:
        raise ValueError(f"finding is {finding!r}, expected one of {', '.join(names)}")
    return names.index(finding)


def bands_along_path(study, *, along="time"):
    """The busiest joint's share of its speed limit, and sigma_min, along the path: the cell as stated as a line, and the band that holds 90 % of the draws.

    At each place by itself 5 % of the draws lie below the band and 5 % above. along: "time" or "distance". Raises ValueError.
    """
    audit, limits = study.audit, study.audit.cell.thresholds
    busiest = 100.0 * np.fmax.reduce(audit.rates.speed_share, axis=1)
    bands = study.bands.at(np.arange(audit.path.samples))
    sigma, share = bands.sigma_min, np.where(np.isfinite(bands.busiest), 100.0 * bands.busiest, np.nan)
    view = along_path(audit, along, np.column_stack([busiest, audit.rates.sigma_min, share.T, sigma.T]), numbered(audit, lambda f: f.kind in ("near-singular", "joint speed")))
    rows = (_row(view, share, busiest, "%{y:.1f} % of the speed limit", limits.speed_share_warn * 100.0, limits.speed_share_fail * 100.0),
            _row(view, sigma, audit.rates.sigma_min, "sigma_min %{y:.4f}", limits.sigma_min_warn, limits.sigma_min_fail))
    below = lines_of(f"{audit.cell.name}. {study.draws:,} draws of {len(study.dimensions)} dimensions, seed {study.seed}. Of these, 90 % lie in the band, at each place by itself.")
    figure = stacked(view, ("busiest joint,<br>% of its speed limit", "sigma_min"), (240, 200), rows, "Under tolerances", below, for_file("tolerances-by", along),
                     lambda f: f"{f.kind} {f.joint or ''}".strip())
    for row, bounds in enumerate(((100.0 * limits.speed_share_warn, 100.0 * limits.speed_share_fail), (limits.sigma_min_warn, limits.sigma_min_fail)), 1):
        for bound, word in zip(bounds, ("warn", "fail"), strict=True):
            note_on(figure, row, bound, word)
    return figure.update_layout(yaxis={"rangemode": "tozero"}, yaxis2={"rangemode": "tozero"})


def _row(view, band, stated, hover, warn, fail):
    low, middle, high = (view.drawn(values) for values in band)
    edge = {"type": "scatter", "mode": "lines", "x": view.x, "line": {"width": 0, "color": SKY}}
    return [
        {**edge, "y": low, "name": "5 % of the draws are below", "showlegend": False, "hovertemplate": f"5 % below: {hover}<extra></extra>"},
        {**edge, "y": high, "name": "90 % of the draws", "fill": "tonexty", "fillcolor": "rgba(86,180,233,0.35)", "hovertemplate": f"5 % above: {hover}<extra></extra>"},
        {"type": "scatter", "mode": "lines", "x": view.x, "y": middle, "name": "middle of the draws", "line": {"width": 1.2, "color": SKY, "dash": "dot"},
         "hovertemplate": f"middle: {hover}<extra></extra>"},
        {"type": "scatter", "mode": "lines", "x": view.x, "y": view.drawn(stated), "customdata": view.other, "name": "as stated", "line": {"width": 1.6, "color": LINE},
         "hovertemplate": f"as stated: {hover}<br>{view.other_words}<extra></extra>"},
        limit_line(view, warn, "warn", legend=False), limit_line(view, fail, "fail", legend=False),
    ]  # fmt: skip
