"""What the samples do not show: findings from the bounds between them, for the motion that between.py states."""

from dataclasses import replace

import numpy as np

from . import causes
from .arm import unit_of
from .findings import MERGE, TRAVEL_SLACK, Stretch, flag
from .proof import Proof
from .runs import runs

SLACK = 1e-7  # of a limit: what a bound misses by no more than this is rounding


def find(proof: Proof, found) -> list:
    """The findings that lie between two samples and that `found`, those at the samples, do not cover."""
    return [*_speeds(proof, found), *_travels(proof, found), *_crossings(proof, found), *_accelerations(proof, found), *_unproven(proof, found)]


def _runs(flagged, level, sense):
    """(first, last, worst) of the intervals of each run of flagged (K,), runs closer than MERGE joined; worst by sense * level."""
    return [(int(a), int(b), int(a + np.nanargmax(np.where(flagged, sense * level, -np.inf)[a : b + 1]))) for a, b in runs(flagged, MERGE)]


def _uncovered(proof, found, kind, severity, joint):
    """(K,) bool: intervals that no finding of this kind and joint, as severe or more so, touches or comes close to."""
    free = np.ones(len(proof.points), bool)
    for f in found:
        if f.kind == kind and f.joint == joint and (f.severity == "fail" or f.severity == severity):
            free[max(f.first - 1 - MERGE, 0) : f.last + 1 + MERGE] = False
    return free


def _finding(proof, kind, severity, joint, run, time, value, limit, unit, why):
    """The Finding of intervals first..last whose worst, at `time`, lies on interval worst."""
    samples, (first, last, k) = proof.rates.motion.path.time, run
    nearer = k if time - samples[k] <= samples[k + 1] - time else k + 1
    stretch = Stretch(first, last + 1, float(samples[first]), float(samples[last + 1]), nearer, value)
    return replace(flag(proof.rates, kind, severity, joint, stretch, value, limit, unit, why), worst_t=float(time))


def _joint_runs(proof, found, kind, severity, level, samples, bound, sense):
    """(joint, run) of the intervals whose level (K, n) is beyond bound (n,), as that of neither sample beside (N, n) is."""
    with np.errstate(invalid="ignore"):
        seen = sense * samples > sense * bound
        beyond = (sense * level > sense * bound) & ~seen[:-1] & ~seen[1:]
    names = proof.rates.motion.cell.arm.joint_names
    for joint in np.flatnonzero(beyond.any(axis=0)):
        free = _uncovered(proof, found, kind, severity, names[joint])
        for run in _runs(beyond[:, joint] & free, level[:, joint], sense):
            yield int(joint), run


def _place(proof, k, joint, order):
    """The time on interval k at which the joint's speed (order 1) or acceleration (2) is largest, or its position is lowest (-1) or highest (0)."""
    from .between import bernstein

    time, t = proof.rates.motion.path.time, np.linspace(0.0, 1.0, 1025)
    motion = proof.joints(k)
    curve = (motion.position, motion.speed, motion.acceleration)[max(order, 0)][:, 0, joint]
    values = bernstein(curve[:, None], t)
    values = np.abs(values) if order > 0 else -values if order < 0 else values
    return float(time[k] + t[np.argmax(values)] * (time[k + 1] - time[k]))


def _speeds(proof, found):
    arm, limits = proof.rates.motion.cell.arm, proof.rates.motion.cell.thresholds
    out = []
    for severity, share in (("fail", limits.speed_share_fail), ("warn", limits.speed_share_warn)):
        for joint, run in _joint_runs(proof, [*found, *out], "joint speed", severity, proof.speed_share, proof.rates.speed_share, share * (1.0 + SLACK), 1.0):
            k, (scale, unit), name = run[2], unit_of(arm, joint), arm.joint_names[joint]
            time, value = _place(proof, k, joint, 1), proof.speed_share[k, joint]
            beside = 100.0 * proof.rates.speed_share[k : k + 2, joint].max()
            why = (
                f"Between two samples joint {name} must {'slide' if arm.prismatic[joint] else 'turn'} at {value * arm.speed[joint] * scale:.4g} {unit}/s, "
                f"{100.0 * value:.2f} % of its limit, though at the samples beside at no more than {beside:.2f} %."
            )
            limit = arm.speed[joint] * scale
            out.append(_finding(proof, "joint speed", severity, name, run, time, value * limit, share * limit, f"{unit}/s", why))
    return out


def _travels(proof, found):
    arm, limits = proof.rates.motion.cell.arm, proof.rates.motion.cell.thresholds
    left = np.minimum(proof.position_low - arm.lower, arm.upper - proof.position_high)
    wanted = limits.travel_warn(arm.prismatic)
    out = []
    for severity, bound in (("fail", np.zeros(arm.n)), ("warn", wanted)):
        for joint, run in _joint_runs(proof, [*found, *out], "joint travel", severity, left, proof.rates.travel_left, bound - TRAVEL_SLACK, -1.0):
            k, (scale, unit), name = run[2], unit_of(arm, joint), arm.joint_names[joint]
            upper = arm.upper[joint] - proof.position_high[k, joint] <= proof.position_low[k, joint] - arm.lower[joint]
            value, limit = (proof.position_high[k, joint], arm.upper[joint]) if upper else (proof.position_low[k, joint], arm.lower[joint])
            past = f"{abs(left[k, joint]) * scale:.2f} {unit} {'past' if left[k, joint] < 0.0 else 'from'} the end of its travel at {limit * scale:.1f} {unit}"
            why = f"Between two samples joint {name} comes to {value * scale:.2f} {unit}, {past}; the samples beside do not show it."
            time = _place(proof, k, joint, 0 if upper else -1)
            out.append(_finding(proof, "joint travel", severity, name, run, time, value * scale, limit * scale, unit, why))
    return out


def _crossings(proof, found):
    limits, rates = proof.rates.motion.cell.thresholds, proof.rates
    beside, out = np.minimum(rates.sigma_min[:-1], rates.sigma_min[1:]), []
    for severity, bound in (("fail", limits.sigma_min_fail), ("warn", limits.sigma_min_warn)):
        with np.errstate(invalid="ignore"):
            met = (proof.sigma_least < bound) & (beside >= bound) & _uncovered(proof, out, "near-singular", severity, None)
        for run in _runs(met, proof.sigma_least, -1.0):
            k = run[2]
            time, value = proof.sigma_time[k], proof.sigma_least[k]
            there = _posed(rates, proof.joints_at(k, time))
            why = (
                f"Between two samples {causes.lineup(there, 0).words}; the tool can hardly {causes.lost_words(there, 0)}. "
                f"The samples beside do not show it: sigma_min is {rates.sigma_min[k]:.3g} and {rates.sigma_min[k + 1]:.3g} there."
            )
            out.append(_finding(proof, "near-singular", severity, None, run, time, value, bound, "", why))
    return out


def _posed(rates, q):
    """Rates of one sample at the joints q (n,), for words about that posture."""
    return replace(rates, motion=replace(rates.motion, closest=q[None]))


def _accelerations(proof, found):
    """Of the motion between samples the acceleration is what another controller may most likely do otherwise: a warning."""
    arm, share = proof.rates.motion.cell.arm, proof.rates.motion.cell.thresholds.acceleration_share_fail
    failed = [replace(f, kind="unproven", severity="warn") for f in found if f.kind == "joint acceleration" and f.severity == "fail"]
    for joint, run in _joint_runs(proof, failed, "unproven", "warn", proof.acceleration_share, proof.rates.acceleration_share, share * (1.0 + SLACK), 1.0):
        k, (scale, unit), name = run[2], unit_of(arm, joint), arm.joint_names[joint]
        value, limit = proof.acceleration_share[k, joint], arm.acceleration[joint] * scale
        why = (
            f"Between two samples joint {name} may have to speed up or slow down at {value * limit:.4g} {unit}/s2, {100.0 * value:.2f} % of its limit, "
            "though not at the samples beside: it depends on how the controller goes from one to the next. Closer samples or a lower speed would settle it."
        )
        yield _finding(proof, "unproven", "warn", name, run, _place(proof, k, joint, 2), value * limit, share * limit, f"{unit}/s2", why)


def _unproven(proof, found):
    for run in _runs(proof.unproven, proof.sigma_bound, -1.0):
        k, limits = run[2], proof.rates.motion.cell.thresholds
        bound = proof.against[k] if proof.sigma_least[k] >= proof.against[k] else limits.sigma_min_fail
        value = proof.sigma_bound[k]
        why = (
            f"Between two samples it could not be shown that the joints stay clear of a singular posture: sigma_min stays above {value:.3g} for certain, "
            f"the threshold is {bound:g}. Closer samples would settle it."
        )
        yield _finding(proof, "unproven", "warn", None, run, proof.sigma_time[k], value, bound, "", why)
