"""The rows of the timeline: what each shows, over which range, and the bounds that it is judged by. Shared by every picture of an audit.

A row is one lane. A joint has three, which are folded into the one of its speed or shown one below the other: a Group says so.
"""

from dataclasses import asdict, dataclass, replace

import numpy as np


@dataclass(frozen=True)
class Row:
    """One lane. `lines` are (array name, column, style), style "main", "ceiling", "before" or "band"; the main line comes last.
    Of a band, `column` is its lower edge; the upper one stands half of the array's columns further on.

    A bound is (value, severity); bad: the side of the bounds that is flagged, "above", "below" or "outside" (beyond the nearer end).
    ticks: (value, text) beside the row; word: what is said in a lane that has nothing to draw.
    """

    title: str
    unit: str
    lines: tuple
    low: float
    high: float
    height: int
    bounds: tuple = ()
    bad: str = "above"
    log: bool = False
    digits: int = 0
    ticks: tuple = ()
    word: str = ""

    def as_dict(self):
        return asdict(self)


@dataclass(frozen=True)
class Group:
    """Rows that belong together, by number: `lanes` from top to bottom, `main` the one that is left when the group is folded.

    head: said above the group, once above neighbours that say the same; folded: how it is shown at first.
    """

    title: str
    lanes: tuple
    main: int
    head: str
    folded: bool = False

    def as_dict(self):
        return asdict(self)


def rows_of(arm, thresholds, arrays, applied=False):
    """The speed lane of each joint, then sigma_min, tool speed and factor, then the joints' lanes of travel and of acceleration.

    arrays: what the scene draws, by name; applied: the factor is in force already.
    """
    return (*_speed_lanes(arm, thresholds, arrays), _sigma_row(thresholds, arrays), _speed_row(thresholds, arrays),
            _factor_row(), *_travel_lanes(arm, thresholds, arrays["travel_percent"]), *_acceleration_lanes(arm, thresholds, arrays))


def groups_of(arm, thresholds, arrays, findings, applied=False):
    """The groups of `rows_of`. A joint is unfolded where one of the findings lies in a lane that folding would hide."""
    names, n = arm.joint_names, arm.n
    marked = {row_index(finding, names) for finding in findings}
    warn, fail = 100 * thresholds.speed_share_warn, 100 * thresholds.speed_share_fail
    band = "; band: 90 % of the draws" if "band_share_percent" in arrays else ""
    head = f"Joints: percent of speed limit (warn {warn:g}, limit {fail:g}){band}"
    joints = tuple(Group(name, (n + 3 + j, j, 2 * n + 3 + j), j, head, not marked & {n + 3 + j, 2 * n + 3 + j}) for j, name in enumerate(names))
    dotted = "as programmed" if "before_speed_mm_s" in arrays else "as suggested" if "suggested_speed_mm_s" in arrays else ""
    speed = "Tool speed, mm/s; dashed: most possible" + (f"; dotted: {dotted}" if dotted else "")
    factor = f"{'Retiming as shown' if applied else 'Suggested retiming'}, percent of programmed speed"
    return (*joints, Group("sigma_min", (n,), n, "Nearness to singular: sigma_min, log scale"), Group("tool speed", (n + 1,), n + 1, speed),
            Group("factor", (n + 2,), n + 2, factor))


def row_index(finding, joint_names):
    """The row of `rows_of` that a finding belongs to, or -1 where it concerns the whole path."""
    n = len(joint_names)
    if finding.joint in joint_names:
        first = {"joint speed": 0, "joint travel": n + 3, "posture jump": n + 3, "joint acceleration": 2 * n + 3, "unproven": 2 * n + 3}.get(finding.kind)
        return -1 if first is None else first + joint_names.index(finding.joint)
    return {"near-singular": n, "unproven": n, "tool speed": n + 1}.get(finding.kind, -1)


def _speed_lanes(arm, thresholds, arrays):
    height = 36 if arm.n <= 3 else 28 if arm.n <= 7 else 20 if arm.n <= 9 else 16
    lane = _share_lane("speed", "share_percent", arrays, thresholds.speed_share_warn, thresholds.speed_share_fail)
    return tuple(replace(lane, lines=_of_joint(lane, j), height=height) for j in range(arm.n))


def _acceleration_lanes(arm, thresholds, arrays):
    lane = _share_lane("accel.", "acceleration_percent", arrays, thresholds.acceleration_share_warn, thresholds.acceleration_share_fail)
    return tuple(replace(lane, lines=_of_joint(lane, j), word="" if known else "no acceleration limit is known")
                 for j, known in enumerate(np.isfinite(arm.acceleration)))


def _share_lane(title, name, arrays, warn, fail):
    limit = 100 * fail or 100.0      # a bound may be 0: everything is beyond it, but the row still needs a scale
    names = [known for known in (f"before_{name}", name) if known in arrays]
    high = np.clip(1.08 * max(_most(arrays[known], 0.0) for known in names), 1.25 * limit, 2.0 * limit)
    lines = tuple((known, 0, "main" if known == name else "before") for known in names)
    if f"band_{name}" in arrays:
        lines, high = ((f"band_{name}", 0, "band"), *lines), np.clip(1.08 * _most(arrays[f"band_{name}"], 0.0), high, 2.0 * limit)
    return Row(title, "%", lines, 0.0, float(high), 24, ((100 * warn, "warn"), (100 * fail, "fail")))


def _of_joint(lane, j):
    return tuple((name, j, style) for name, _, style in lane.lines)


def _travel_lanes(arm, thresholds, travel):
    """Place inside the travel: 0 and 100 are its ends. What lies past them is shown as far as 20 percent."""
    room = np.asarray(arm.upper) - np.asarray(arm.lower)
    kept = thresholds.travel_warn(arm.prismatic)
    for j in range(arm.n):
        line = (("travel_percent", j, "main"),)
        if not np.isfinite(room[j]):
            yield Row("travel", "%", line, -4.0, 104.0, 24, word="turns without end")
            continue
        near = float(min(100 * kept[j] / room[j], 50.0)) if room[j] > 0 else 50.0
        low = np.clip(1.08 * _least(travel[:, j], 0.0, floor=-np.inf), -20.0, -4.0)
        high = np.clip(1.08 * _most(travel[:, j], 0.0) - 8.0, 104.0, 120.0)
        yield Row("travel", "%", line, float(low), float(high), 24,
                  ((near, "warn"), (100.0 - near, "warn"), (0.0, "fail"), (100.0, "fail")), "outside")


def _sigma_row(thresholds, arrays):
    sigma, band = arrays["sigma_min"], arrays.get("band_sigma_min")
    every = sigma if band is None else np.concatenate([sigma, band.ravel()])
    lines = () if band is None else (("band_sigma_min", 0, "band"),)
    warn, fail = thresholds.sigma_min_warn, thresholds.sigma_min_fail
    scale = fail or warn or 0.02
    low = np.clip(_least(every, scale), scale / 30, scale / 2)
    high = max(1.3 * _most(every, warn), 2 * warn, 2 * scale)
    ticks = ((warn, f"warn {warn:g}"), (fail, f"fail {fail:g}"))
    return Row("sigma_min", "", (*lines, ("sigma_min", 0, "main")), float(low), float(high), 56, ((warn, "warn"), (fail, "fail")), "below",
               log=True, digits=3, ticks=ticks)


def _speed_row(thresholds, arrays):
    """Scaled to the process: air moves are many times faster and may leave the row at its top."""
    ceiling, process = thresholds.tool_speed_mm_s, arrays["process"] > 0
    others = [name for name in ("before_speed_mm_s", "suggested_speed_mm_s") if name in arrays]
    speeds = [arrays[name] for name in (*others, "speed_mm_s")]
    high = 1.6 * max(*(_most(speed[process] if process.any() else speed, 0.0) for speed in speeds), 1e-3)
    bounds = () if ceiling is None else ((float(ceiling), "fail"),)
    if ceiling is not None:
        high = max(high, 1.1 * ceiling)
    ticks = tuple((value, f"{value:g}") for value in np.arange(0.0, high, nice_step(high, 3)).tolist())
    if ceiling is not None:
        ticks = (0.0, "0"), (float(ceiling), f"limit {ceiling:g}")
    lines = (("speed_limit_mm_s", 0, "ceiling"), *((name, 0, "before") for name in others), ("speed_mm_s", 0, "main"))
    return Row("tool speed", "mm/s", lines, 0.0, float(high), 60, bounds, digits=1, ticks=ticks)


def _factor_row():
    return Row("factor", "%", (("factor_percent", 0, "main"),), 0.0, 110.0, 44, ticks=((0.0, "0"), (100.0, "100")))


def nice_step(span, wanted):
    """A round step, 1, 2 or 5 times a power of ten, that cuts span into about `wanted` pieces."""
    rough = span / max(1.0, wanted) or 1.0
    power = 10.0 ** np.floor(np.log10(rough))
    return float(next(k * power for k in (1, 2, 5, 10) if k * power >= 0.999 * rough))


def _most(values, default):
    values = values[np.isfinite(values)]
    return float(values.max()) if values.size else default


def _least(values, default, floor=0.0):
    values = values[np.isfinite(values) & (values > floor)]
    return float(values.min()) if values.size else default
