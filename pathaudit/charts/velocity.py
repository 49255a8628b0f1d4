"""Which tool speeds the joints allow at a place, and whether the programmed one is among them."""

import numpy as np

from .. import capacity
from .look import GREEN, INK, LINE, SEVERITY, SKY, SOFT, for_file, lines_of, turned_out
from .places import place_words, plane_rows, posture_at
from .solids import drawn_ellipsoid, drawn_polytope, equal_axes


def velocity_capacity(audit, time=None, *, sample=None, plane=None, axes="part", span_mm_s=None):
    """The speeds of the tool point that the joint speed limits allow at one place, and the programmed one among them, mm/s.

    The outer polytope holds every speed of the tool point, however the tool turns meanwhile; the ellipsoid in it those from joint
    speeds whose shares of the limits have the square sum 1. The inner polytope is what decides: the speeds while the tool goes on
    turning as programmed (in a plane: and moving across it as programmed). The programmed speed lies in it just where the reserve is
    1 or more.

    time (s, the nearest sample is taken) or sample: the place. plane: "xy", "xz", "yz", or None for all three directions. axes: "part"
    or "tool". span_mm_s: show no more than this each way. Raises ValueError.

    >>> velocity_capacity(audit, 27.525, plane="xy").show()  # doctest: +SKIP
    """
    import plotly.graph_objects as go

    rows, posture = plane_rows(plane), posture_at(audit, time, sample, axes)
    if span_mm_s is not None and not span_mm_s > 0:
        raise ValueError(f"span_mm_s is {span_mm_s!r}, expected a number above 0")
    speed, jacobian = audit.cell.arm.speed, posture.jacobian * np.r_[1e3, 1e3, 1e3, np.ones(len(posture.jacobian) - 3)][:, None]
    twist = posture.twist * np.r_[1e3, 1e3, 1e3, np.ones(len(jacobian) - 3)]
    whole = capacity.velocity_polytope(jacobian[rows], speed)
    cut = capacity.velocity_cut(jacobian, speed, rows, twist)
    ellipsoid = capacity.velocity_ellipsoid(jacobian[rows] * speed)
    held = "turning as programmed" if plane is None else "turning and leaving the plane as programmed"
    wide = 1 if plane else 2
    word = "fits" if audit.rates.reserve[posture.sample] >= 1.0 else "does not fit"
    figure = go.Figure([
        *drawn_polytope(whole, "polytope: the tool turns as it likes", SKY, width=1.5 * wide, opacity=0.12),
        *drawn_ellipsoid(ellipsoid, "ellipsoid in it", LINE),
        *drawn_polytope(cut, f"with the tool {held}", GREEN, width=2.5 * wide, opacity=0.25),
        _programmed(twist[rows], word),
    ])
    told = f"At {place_words(audit, posture.sample)}. {_told(audit, posture.sample, len(cut.vertices) > 0)}"
    show = equal_axes("speed", axes, rows, "mm/s", [_label(twist[rows], word)], span_mm_s)
    return turned_out(figure, "Tool speeds that the joints allow", lines_of(told), for_file("velocity", plane or "3d", "sample", posture.sample), **show)


def _programmed(v, word):
    """The programmed speed: a line from rest with a symbol at its end, solid where it fits."""
    flat, fits = len(v) == 2, word == "fits"
    colour = INK if fits else SEVERITY["fail"]
    symbol = "diamond" if fits else "x" if flat else "diamond-open"  # in space symbols are letters of a font, and few fonts have a cross
    values = ", ".join(f"{value:.1f}" for value in v)
    trace = {"type": "scatter" if flat else "scatter3d", "mode": "lines+markers", "name": f"programmed: {word}", "line": {"color": colour, "width": 2 if flat else 5},
             "marker": {"symbol": ["circle", symbol], "size": [3, 11] if flat else [3, 8], "color": colour, "line": {"width": 0}},
             "hovertemplate": f"programmed {values} mm/s: {word}<extra></extra>"}
    return trace | {letter: [0.0, float(value)] for letter, value in zip("xyz", v, strict=False)}


def _label(v, word):
    """Words with an arrow to the programmed speed, in front of everything."""
    ends = {letter: float(value) for letter, value in zip("xyz", v, strict=False)}
    return {**ends, "text": f"programmed: {word}", "ax": 80, "ay": 60 if len(v) == 2 else -70, "arrowcolor": SOFT, "arrowwidth": 1, "font": {"size": 12}, "bgcolor": "rgba(255,255,255,0.8)"}


def _told(audit, k, some):
    """Whether the programmed motion fits at sample k, in words."""
    reserve, twist = audit.rates.reserve[k], audit.motion.twist[k]
    words = f"Programmed: {1e3 * np.linalg.norm(twist[:3]):.1f} mm/s, turning at {np.degrees(np.linalg.norm(twist[3:])):.1f} deg/s. "
    if reserve >= 1.0:
        words += "It fits" + (f", reserve {reserve:.4g}." if np.isfinite(reserve) else ": the arm rests.")
        return words if some else f"{words} The other directions of this motion leave the joints no choice of speed, so there is no second polytope."
    words += f"It does not fit: the joints would need {100.0 / reserve:.0f} % of their speed limits."
    return words if some else f"{words} No speed fits with the other directions as programmed."
