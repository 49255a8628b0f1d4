"""An audit as plotly figures to look at, restyle and save: pure functions, each gives a new `plotly.graph_objects.Figure`.

Lengths in mm, angles in degrees. The figures draw without a network connection.
"""

import numpy as np

LINE, LIMIT = "#0072B2", "#5b6168"


def joint_over_time(audit, joint):
    """Position and speed of one joint over time, with its travel and its speed limit; NaN rows leave gaps.

    joint: a name, or a number from 0. Raises ValueError for an unknown one.

    >>> joint_over_time(audit, "j4").write_html("j4.html")  # doctest: +SKIP
    """
    from plotly.subplots import make_subplots

    arm, j = audit.cell.arm, _joint_number(audit.cell.arm, joint)
    unit, scale = ("mm", 1e3) if arm.prismatic[j] else ("deg", 180.0 / np.pi)
    figure = make_subplots(rows=2, cols=1, shared_xaxes=True, vertical_spacing=0.06)
    for row, values, limits, per in ((1, audit.joints, (arm.lower[j], arm.upper[j]), ""), (2, audit.rates.joint_speed, (-arm.speed[j], arm.speed[j]), "/s")):
        label = f"{unit}{per}"
        figure.add_scatter(x=audit.time, y=scale * values[:, j], mode="lines", line={"color": LINE, "width": 1.5}, connectgaps=False, showlegend=False,
                           hovertemplate=f"%{{x:.3f}} s<br>%{{y:.2f}} {label}<extra></extra>", row=row, col=1)
        for limit in limits:
            if np.isfinite(limit):
                figure.add_hline(y=scale * limit, line={"color": LIMIT, "width": 1, "dash": "dash"}, row=row, col=1)
        figure.update_yaxes(title=f"{'speed' if per else 'position'}, {label}", row=row, col=1)
    figure.update_xaxes(title="time, s", row=2, col=1)
    title = {"text": f"Joint {arm.joint_names[j]}: travel and speed with their limits (dashed)", "font": {"size": 14}}
    return figure.update_layout(title=title, template="plotly_white", margin={"l": 70, "r": 20, "t": 50, "b": 50}, height=460)


def _joint_number(arm, joint):
    names = list(arm.joint_names)
    if isinstance(joint, str) and joint in names:
        return names.index(joint)
    if not isinstance(joint, str) and 0 <= int(joint) < len(names):
        return int(joint)
    raise ValueError(f"joint is {joint!r}, expected one of {', '.join(names)}, or a number from 0 to {len(names) - 1}")
