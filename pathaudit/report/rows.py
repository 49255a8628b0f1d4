"""The rows of the timeline: what each shows, over which range, and the bounds that it is judged by. Shared by every picture of an audit."""

from dataclasses import asdict, dataclass

import numpy as np


@dataclass(frozen=True)
class Row:
    """One row. `lines` are (array name, column, style), style "main" or "ceiling"; a bound is (value, severity)."""

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
    head: str = ""
    ticks: tuple = ()        # (value, text) beside the row, for rows that carry a scale

    def as_dict(self):
        return asdict(self)


def rows_of(joint_names, thresholds, arrays, applied=False):
    """One row a joint, then sigma_min, tool speed and factor. arrays: what the scene draws, by name; applied: the factor is in force already."""
    return (*_joint_rows(joint_names, thresholds, arrays["share_percent"]), _sigma_row(thresholds, arrays["sigma_min"]),
            _speed_row(thresholds, arrays["speed_mm_s"], arrays["process"] > 0), _factor_row(applied))


def row_index(finding, joint_names):
    """The row that a finding belongs to, or -1 where it concerns the whole path."""
    if finding.kind == "joint speed" and finding.joint in joint_names:
        return joint_names.index(finding.joint)
    return {"near-singular": len(joint_names), "tool speed": len(joint_names) + 1}.get(finding.kind, -1)


def _joint_rows(names, thresholds, share):
    warn, fail = 100 * thresholds.speed_share_warn, 100 * thresholds.speed_share_fail
    limit = fail or 100.0      # a bound may be 0: everything is beyond it, but the row still needs a scale
    high = np.clip(1.08 * _most(share, 0.0), 1.25 * limit, 2.0 * limit)
    head = f"Joint speed, percent of its limit (warn {warn:g}, limit {fail:g})"
    bounds = ((warn, "warn"), (fail, "fail"))
    height = 28 if len(names) <= 7 else 20
    return tuple(Row(name, "%", (("share_percent", j, "main"),), 0.0, float(high), height, bounds, head=head if j == 0 else "")
                 for j, name in enumerate(names))


def _sigma_row(thresholds, sigma):
    warn, fail = thresholds.sigma_min_warn, thresholds.sigma_min_fail
    scale = fail or warn or 0.02
    low = np.clip(_least(sigma, scale), scale / 30, scale / 2)
    high = max(1.3 * _most(sigma, warn), 2 * warn, 2 * scale)
    ticks = ((warn, f"warn {warn:g}"), (fail, f"fail {fail:g}"))
    return Row("sigma_min", "", (("sigma_min", 0, "main"),), float(low), float(high), 64, ((warn, "warn"), (fail, "fail")), "below",
               log=True, digits=3, head="Nearness to singular: sigma_min, log scale", ticks=ticks)


def _speed_row(thresholds, speed, process):
    """Scaled to the process: air moves are many times faster and may leave the row at its top."""
    ceiling = thresholds.tool_speed_mm_s
    high = 1.6 * max(_most(speed[process] if process.any() else speed, 0.0), 1e-3)
    bounds = () if ceiling is None else ((float(ceiling), "fail"),)
    if ceiling is not None:
        high = max(high, 1.1 * ceiling)
    ticks = tuple((value, f"{value:g}") for value in np.arange(0.0, high, nice_step(high, 3)).tolist())
    if ceiling is not None:
        ticks = (0.0, "0"), (float(ceiling), f"limit {ceiling:g}")
    return Row("tool speed", "mm/s", (("speed_limit_mm_s", 0, "ceiling"), ("speed_mm_s", 0, "main")), 0.0, float(high), 72, bounds,
               digits=1, head="Tool speed, mm/s (dashed: the most the joints allow)", ticks=ticks)


def _factor_row(applied):
    what = "Retiming as shown" if applied else "Suggested retiming"
    return Row("factor", "%", (("factor_percent", 0, "main"),), 0.0, 110.0, 44,
               head=f"{what}, percent of programmed speed", ticks=((0.0, "0"), (100.0, "100")))


def nice_step(span, wanted):
    """A round step, 1, 2 or 5 times a power of ten, that cuts span into about `wanted` pieces."""
    rough = span / max(1.0, wanted) or 1.0
    power = 10.0 ** np.floor(np.log10(rough))
    return float(next(k * power for k in (1, 2, 5, 10) if k * power >= 0.999 * rough))


def _most(values, default):
    values = values[np.isfinite(values)]
    return float(values.max()) if values.size else default


def _least(values, default):
    values = values[np.isfinite(values) & (values > 0)]
    return float(values.min()) if values.size else default
