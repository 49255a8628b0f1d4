"""What is flagged: rules as small values, applied to the measures, and the stretches that they find."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from . import causes
from .arm import unit_of
from .measures import Rates
from .runs import runs

PEAK = 1.02  # times what the samples beside an interval show: from there on its mean joint speed tells of a peak hidden in it
TRAVEL_SLACK = 1e-7  # rad or m: a joint that stands at its end stop to the last digit is not past it
MERGE = 3  # stretches of the same rule and severity with no more samples than this between them are one


@dataclass(frozen=True)
class Finding:
    """A flagged stretch. Times in s; value and limit in `unit`; first, last, worst are sample numbers; from_mm, to_mm along the path."""

    kind: str
    severity: str
    joint: str | None
    t_start: float
    t_end: float
    worst_t: float
    value: float
    limit: float
    unit: str
    why: str
    first: int
    last: int
    worst: int
    from_mm: float
    to_mm: float


@dataclass(frozen=True)
class Rule:
    """A measure with a warn and a fail bound.

    series(rates, joint) -> (N,), flagged where it passes a bound upwards (sense 1) or downwards (sense -1); bounds(rates, joint) ->
    (warn, fail), either None; shown(rates, joint, level, bound) -> (value, limit, unit) for people; why(rates, joint, stretch) -> a
    sentence; missing(rates) -> why the rule cannot be judged, or ''. joints: one series a joint, or one for the path.
    """

    kind: str
    title: str
    joints: bool
    sense: float
    series: Callable
    bounds: Callable
    shown: Callable
    why: Callable
    missing: Callable


@dataclass(frozen=True)
class Stretch:
    """Samples first..last with exact crossing times t_start..t_end, the worst sample and its level of the rule's series."""

    first: int
    last: int
    t_start: float
    t_end: float
    worst: int
    level: float


def stretches(time, level, bound, sense, merge=MERGE) -> list:
    """The stretches of `level` (N,) beyond `bound`; where it crosses between two samples, the time is interpolated. NaN is not beyond."""
    with np.errstate(invalid="ignore"):
        beyond = sense * level > sense * bound
    found = []
    for first, last in runs(beyond, merge):
        worst = first + int(np.nanargmax(sense * level[first : last + 1]))
        start, end = _crossing(time, level, bound, first, -1), _crossing(time, level, bound, last, 1)
        found.append(Stretch(int(first), int(last), start, end, int(worst), float(level[worst])))
    return found


def _crossing(time, level, bound, k, step):
    """The time at which the straight line from sample k to its neighbour crosses the bound."""
    other = k + step
    if not 0 <= other < len(time) or not np.isfinite(level[other] - level[k]) or level[other] == level[k]:
        return float(time[k])
    share = (bound - level[k]) / (level[other] - level[k])
    return float(time[k] + min(max(share, 0.0), 1.0) * (time[other] - time[k]))


def find(rates: Rates) -> tuple:
    """All findings, in order of time, and the rules that could not be judged as (title, why)."""
    found, skipped = [*_unreachable(rates), *_jumps(rates)], []
    for rule in RULES:
        missing = rule.missing(rates)
        if missing:
            skipped.append((rule.title, missing))
        for joint in range(rates.motion.cell.arm.n) if rule.joints else (None,):
            found += _apply(rule, rates, joint)
    return in_order(found), tuple(skipped)


def in_order(found) -> tuple:
    """Findings in order of time."""
    return tuple(sorted(found, key=lambda f: (f.t_start, f.t_end, f.kind, f.joint or "")))


def _apply(rule, rates, joint):
    time, level = rates.motion.path.time, rule.series(rates, joint)
    warn, fail = rule.bounds(rates, joint)
    failed = [] if fail is None else stretches(time, level, fail, rule.sense)
    warned = [] if warn is None else stretches(time, level, warn, rule.sense)
    warned = [w for w in warned if not any(f.first <= w.last and w.first <= f.last for f in failed)]
    return [_finding(rule, rates, joint, s, "fail", fail) for s in failed] + [_finding(rule, rates, joint, s, "warn", warn) for s in warned]


def _finding(rule, rates, joint, stretch, severity, bound):
    value, limit, unit = rule.shown(rates, joint, stretch.level, bound)
    name = None if joint is None else rates.motion.cell.arm.joint_names[joint]
    why = rule.why(rates, joint, stretch)
    return flag(rates, rule.kind, severity, name, stretch, value, limit, unit, why)


def flag(rates, kind, severity, joint, stretch, value, limit, unit, why) -> Finding:
    """The Finding of a stretch."""
    path = rates.motion.path
    along = np.interp([stretch.t_start, stretch.t_end], path.time, path.distance) * 1000.0
    return Finding(
        kind, severity, joint, stretch.t_start, stretch.t_end, float(path.time[stretch.worst]), float(value), float(limit), unit, why,
        stretch.first, stretch.last, stretch.worst, float(along[0]), float(along[1]),
    )  # fmt: skip


def _unreachable(rates):
    """Stretches that cannot be reached, and ones where what is left to the pose passes the deviation that the thresholds allow."""
    motion, limits = rates.motion, rates.motion.cell.thresholds
    far, turned = motion.deviation_m * 1000.0, np.degrees(motion.deviation_rad)
    off = np.maximum(far / max(limits.deviation_mm, 1e-6), turned / max(limits.deviation_deg, 1e-6))
    found = []
    for s in stretches(motion.path.time, np.where(motion.reached, 0.0, np.maximum(off, 2.0)), 1.0, 1.0, merge=0):
        s = Stretch(s.first, s.last, float(motion.path.time[s.first]), float(motion.path.time[s.last]), s.worst, s.level)
        by_angle = turned[s.worst] / max(limits.deviation_deg, 1e-6) > far[s.worst] / max(limits.deviation_mm, 1e-6)
        shown = (turned[s.worst], limits.deviation_deg, "deg") if by_angle and far[s.worst] < 0.1 else (far[s.worst], limits.deviation_mm, "mm")
        found.append(flag(rates, "unreachable", "fail", None, s, *shown, motion.reason(s.worst)))
    return found


def _jumps(rates):
    motion, arm, time = rates.motion, rates.motion.cell.arm, rates.motion.path.time
    found = []
    for k in motion.jumps:
        if k == 0 or not motion.reached[k - 1]:
            continue
        moved = np.abs(motion.joints[k] - motion.joints[k - 1])
        joint = int(np.argmax(moved / arm.speed))
        scale, unit = unit_of(arm, joint)
        was, now = (_posture_words(arm, q) for q in (motion.joints[k - 1], motion.joints[k]))
        why = (
            f"The posture the arm comes in cannot go on here: {causes.lineup(rates, k - 1).words}, "
            f"so joint {arm.joint_names[joint]} would have to leap {moved[joint] * scale:.0f} {unit} (from {was} to {now})."
        )
        s = Stretch(k - 1, k, float(time[k - 1]), float(time[k]), k, 0.0)
        most = arm.speed[joint] * (time[k] - time[k - 1])
        found.append(flag(rates, "posture jump", "fail", arm.joint_names[joint], s, moved[joint] * scale, most * scale, unit, why))
    return found


def _posture_words(arm, q):
    return ", ".join(f"{name} {value * unit_of(arm, i)[0]:.0f}" for i, (name, value) in enumerate(zip(arm.joint_names, q, strict=True)))


def peak_share(rates: Rates, joint: int) -> np.ndarray:
    """(N,) speed share of a joint, raised where the mean over an interval beside it shows a higher peak hidden between samples."""
    share, between = rates.speed_share[:, joint], rates.between[:, joint]
    with np.errstate(invalid="ignore"):
        hidden = between > PEAK * np.maximum(share[1:], share[:-1])
    hidden[[k - 1 for k in rates.motion.jumps if k > 0]] = False  # a jump is a finding of its own
    if not hidden.any():
        return share
    raised, at = share.copy(), np.flatnonzero(hidden)
    np.maximum.at(raised, at, between[at])
    np.maximum.at(raised, at + 1, between[at])
    return raised


def peak_shares(rates: Rates) -> np.ndarray:
    """(N, n) `peak_share` of all joints"""
    return np.stack([peak_share(rates, joint) for joint in range(rates.motion.cell.arm.n)], axis=1)


def _singular_bounds(rates, joint):
    limits = rates.motion.cell.thresholds
    return limits.sigma_min_warn, limits.sigma_min_fail


def _singular_why(rates, joint, stretch):
    k = stretch.worst
    cause = causes.lineup(rates, k)
    return f"{cause.words[0].upper()}{cause.words[1:]}; the tool can hardly {causes.lost_words(rates, k)}."


def _speed_why(rates, joint, stretch):
    arm, k = rates.motion.cell.arm, stretch.worst
    scale, unit = unit_of(arm, joint)
    name, limit = arm.joint_names[joint], arm.speed[joint] * scale
    value = stretch.level * limit
    verb = "slide" if arm.prismatic[joint] else "turn"
    head = f"Joint {name} must {verb} at {value:.0f} {unit}/s, {100 * stretch.level:.0f} % of its limit"
    if rates.sigma_min[k] < 2.0 * rates.motion.cell.thresholds.sigma_min_warn:
        q = rates.motion.joints[:, joint]
        moved = abs(np.interp(stretch.t_end, rates.motion.path.time, q) - np.interp(stretch.t_start, rates.motion.path.time, q)) * scale
        return f"{head} ({moved:.0f} {unit} in {stretch.t_end - stretch.t_start:.2f} s), because {causes.lineup(rates, k).words} while {causes.demand_words(rates, k, joint)}."
    return f"{head}, because {causes.demand_words(rates, k, joint)}."


def _acceleration_why(rates, joint, stretch):
    arm, k = rates.motion.cell.arm, stretch.worst
    scale, unit = unit_of(arm, joint)
    value = stretch.level * arm.acceleration[joint] * scale
    head = f"Joint {arm.joint_names[joint]} must speed up or slow down at {value:.0f} {unit}/s2, {100 * stretch.level:.0f} % of its limit"
    corner = causes.corner_words(rates, k)
    if corner:
        return f"{head}, because {corner}."
    if rates.sigma_min[k] < 2.0 * rates.motion.cell.thresholds.sigma_min_warn:
        return f"{head}, because {causes.lineup(rates, k).words}."
    return f"{head}, at {rates.joint_speed[k, joint] * scale:.0f} {unit}/s and with the tool at {rates.tool_speed[k] * 1000:.0f} mm/s."


def _acceleration_missing(rates):
    arm = rates.motion.cell.arm
    unknown = [name for name, limit in zip(arm.joint_names, arm.acceleration, strict=True) if np.isnan(limit)]
    if not unknown:
        return ""
    return f"neither the arm nor the cell states an acceleration limit for {', '.join(unknown)}"


def _travel_left(rates, joint):
    left = rates.travel_left[:, joint]
    return np.where(np.abs(left) < TRAVEL_SLACK, 0.0, left)


def _travel_bounds(rates, joint):
    return float(rates.motion.cell.thresholds.travel_warn(rates.motion.cell.arm.prismatic[joint])), 0.0


def _travel_shown(rates, joint, level, bound):
    arm = rates.motion.cell.arm
    scale, unit = unit_of(arm, joint)
    k = int(np.nanargmin(np.abs(rates.travel_left[:, joint] - level)))
    q = rates.motion.joints[k, joint]
    upper = arm.upper[joint] - q <= q - arm.lower[joint]
    return q * scale, (arm.upper if upper else arm.lower)[joint] * scale, unit


def _travel_why(rates, joint, stretch):
    arm = rates.motion.cell.arm
    scale, unit = unit_of(arm, joint)
    value, limit, _ = _travel_shown(rates, joint, stretch.level, 0.0)
    if stretch.level < 0.0:
        return f"Joint {arm.joint_names[joint]} would have to go to {value:.1f} {unit}, {-stretch.level * scale:.1f} {unit} past the end of its travel at {limit:.1f} {unit}."
    return f"Joint {arm.joint_names[joint]} comes within {stretch.level * scale:.1f} {unit} of the end of its travel at {limit:.1f} {unit}."


def _share_shown(field, per):
    def shown(rates, joint, level, bound):
        limit = getattr(rates.motion.cell.arm, field)[joint]
        scale, unit = unit_of(rates.motion.cell.arm, joint)
        return level * limit * scale, limit * scale, unit + per

    return shown


def _tool_bounds(rates, joint):
    return None, rates.motion.cell.thresholds.tool_speed_mm_s


def _share_bounds(name):
    def bounds(rates, joint):
        limits = rates.motion.cell.thresholds
        return getattr(limits, f"{name}_share_warn"), getattr(limits, f"{name}_share_fail")

    return bounds


def _always(rates):
    return ""


RULES = (
    Rule(
        "near-singular", "near-singular stretches", False, -1.0, lambda r, j: r.sigma_min, _singular_bounds,
        lambda r, j, level, bound: (level, bound, ""), _singular_why, _always,
    ),
    Rule(
        "joint travel", "joint travel", True, -1.0, _travel_left, _travel_bounds, _travel_shown, _travel_why, _always,
    ),
    Rule(
        "joint speed", "joint speed", True, 1.0, peak_share, _share_bounds("speed"), _share_shown("speed", "/s"), _speed_why, _always,
    ),
    Rule(
        "joint acceleration", "joint acceleration", True, 1.0, lambda r, j: r.acceleration_share[:, j], _share_bounds("acceleration"),
        _share_shown("acceleration", "/s2"), _acceleration_why, _acceleration_missing,
    ),
    Rule(
        "tool speed", "tool speed", False, 1.0, lambda r, j: r.tool_speed * 1000.0, _tool_bounds,
        lambda r, j, level, bound: (level, bound, "mm/s"),
        lambda r, j, s: f"The tool point moves at {s.level:.0f} mm/s, above the stated ceiling of {r.motion.cell.thresholds.tool_speed_mm_s:.0f} mm/s.",
        lambda r: "" if r.motion.cell.thresholds.tool_speed_mm_s else "no ceiling for the tool speed is stated (tool_speed_mm_s under [thresholds])",
    ),
)  # fmt: skip
"""What is judged. Unreachable samples and posture jumps are outcomes of the following itself and need no bound."""
