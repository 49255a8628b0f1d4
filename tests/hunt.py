"""The hunt for a false pass: cells, paths and limits drawn at random, just kept at the samples, and looked at closely between them.

    .venv/bin/python tests/hunt.py SECONDS [SEED]

Each draw is an arm of 2 to 9 joints with a motion of its own. A first audit tells what its samples measure; then travel, speed, acceleration and the
nearness to singular are bounded so that the samples just keep them, by margins from 1e-6 to 1e-1, and the audit is done again. The reference is
dense_sampling.py, plain NumPy with no code of the package: the motion that the audit states, at 100 places in every interval. A place beyond a bound
that no finding names is a false pass, whatever the verdict.
"""

import sys
from collections import Counter
from time import monotonic

import dense_sampling as reference
import numpy as np
from example_arms import path_of_motion

import pathaudit as pa
from pathaudit.arm import Chain

PLACES = 100  # in an interval
ROUNDING = 1e-6  # of a bound, by which a place must be beyond it


def draw(random):
    """A cell whose bounds are far away, times (N,) and the joint motion (N, n) of a path, and whether the spin is free."""
    n, samples = int(random.integers(2, 10)), int(random.integers(12, 120))
    links, slides, length = reference.random_chain(random, n)
    far = np.where(slides, 5.0, 20.0)
    arm = pa.Arm(
        "drawn", tuple(f"j{i + 1}" for i in range(n)), Chain(links, slides), -far, far, np.full(n, 1e6), np.full(n, 1e9), np.full(n, np.nan)
    )  # fmt: skip
    duration = np.exp(random.uniform(np.log(0.2), np.log(5.0)))
    time = np.linspace(0.0, duration, samples)
    if random.random() < 0.5:
        time = np.cumsum(random.uniform(0.5, 1.5, samples)) * duration / samples
    restless = random.choice([0.02, 0.05, 0.2], p=[0.6, 0.3, 0.1])  # of the samples: waves of 50, 20 or 5 samples at the shortest
    waves = np.exp(random.uniform(np.log(0.1), np.log(restless * samples), (2, n))) * 2.0 * np.pi / duration
    size = np.exp(random.uniform(np.log(0.01), np.log(0.6), (2, n))) * np.where(slides, 0.3, 1.0) / (1.0 + waves * duration / samples)
    middle = random.uniform(-np.pi, np.pi, n) * np.where(slides, 0.1, 1.0)
    near = random.random(n) < 0.2
    middle = np.where(near, np.round(middle / (np.pi / 2)) * np.pi / 2 + random.normal(0.0, 0.05, n), middle)
    phase = random.uniform(0.0, 2.0 * np.pi, (2, n))
    joints = middle + sum(size[i] * np.sin(np.outer(time, waves[i]) + phase[i]) for i in range(2))
    thresholds = pa.Thresholds(0.0, 0.0, characteristic_length_mm=1000.0 * length, deviation_mm=0.05, deviation_deg=0.05, travel_warn_deg=0.0, travel_warn_mm=0.0)
    return pa.Cell("drawn", arm, np.eye(4), np.eye(4), np.eye(4), start=joints[0], thresholds=thresholds), time, joints, bool(random.random() < 0.3)


def tightened(random, audit):
    """The cell with bounds that the samples of `audit` just keep; None where too little of the path was followed."""
    rates, arm, ok = audit.rates, audit.cell.arm, audit.motion.reached
    if ok.sum() < 5:
        return None

    least = random.choice([1e-6, 1e-3, 3e-2])  # the margins of a draw: from hair-fine to some that even what lies between keeps

    def just(shape):
        return 1.0 + np.exp(random.uniform(np.log(least), np.log(1e-1), shape))

    joints = rates.motion.joints[ok]
    spare = 0.1 * (just(arm.n) - 1.0) if arm.n <= rates.motion.rows else 1.0  # a surplus joint keeps away from ends, which moves all others
    speed = np.maximum(np.abs(rates.joint_speed[ok]).max(axis=0), 1e-3) / 0.9 * just(arm.n)
    acceleration = np.maximum(np.abs(rates.joint_acceleration[ok]).max(axis=0), 1e-3) * just(arm.n)
    drawn = pa.Arm(
        arm.name, arm.joint_names, arm.chain, joints.min(axis=0) - spare, joints.max(axis=0) + spare, speed, acceleration, np.full(arm.n, np.nan)
    )  # fmt: skip
    warn = float(rates.sigma_min[ok].min() / just(()))
    limits = audit.cell.thresholds
    limits = pa.Thresholds(warn, warn * random.uniform(0.3, 1.0), characteristic_length_mm=limits.characteristic_length_mm,
                           deviation_mm=limits.deviation_mm, deviation_deg=limits.deviation_deg, travel_warn_deg=0.0, travel_warn_mm=0.0, acceleration_share_warn=1.0)  # fmt: skip
    return pa.Cell("drawn", drawn, np.eye(4), np.eye(4), np.eye(4), start=audit.cell.start, thresholds=limits)


def beyond(audit):
    """(interval, kind, severity, joint, by how much of the bound) of every interval on which some place is beyond a bound."""
    motion, rates, arm, limits = audit.motion, audit.rates, audit.cell.arm, audit.cell.thresholds
    links, slides = audit.cell.chain.links, arm.prismatic
    t = np.linspace(0.0, 1.0, PLACES + 1)
    for k in range(audit.path.samples - 1):
        if not (motion.reached[k] and motion.reached[k + 1]) or k + 1 in motion.jumps:
            continue
        span = audit.time[k + 1] - audit.time[k]
        ends = (values[j] for values in (audit.joints, rates.joint_speed, rates.joint_acceleration) for j in (k, k + 1))
        power = reference.quintic(span, *ends)[:, None]
        place = (t * span)[:, None]
        q = reference.value(power, place)
        sigma = reference.sigma_min(links, slides, rates.characteristic_length, motion.rows, q).min()
        for severity, bound in (("warn", limits.sigma_min_warn), ("fail", limits.sigma_min_fail)):
            if sigma < bound * (1.0 - ROUNDING) - 1e-12:
                yield k, "near-singular", severity, None, 1.0 - sigma / bound
        speed = np.abs(reference.value(power, place, 1)).max(axis=0) / arm.speed
        acceleration = np.abs(reference.value(power, place, 2)).max(axis=0) / arm.acceleration
        past = np.maximum(arm.lower - q, q - arm.upper).max(axis=0)
        for kind, severity, level, most in (
            ("joint speed", "warn", speed, limits.speed_share_warn), ("joint speed", "fail", speed, limits.speed_share_fail),
            ("joint acceleration", "fail", acceleration, limits.acceleration_share_fail), ("joint travel", "fail", past, 0.0),
        ):  # fmt: skip
            for joint in np.flatnonzero(level > most + ROUNDING):
                yield k, kind, severity, arm.joint_names[joint], level[joint] - most


def named(audit, k, kind, severity, joint):
    """Whether a finding tells of it: of this kind and joint, or unproven, on this interval or one that was joined to it.

    A failing stretch stands for the wider one that would only be warned of, as it does at the samples.
    """
    same = [f for f in audit.finding_list if f.joint == joint and f.kind in (kind, "unproven")]
    if severity == "warn" and any(f.severity == "fail" for f in same):
        return True
    strong = [f for f in same if severity == "warn" or f.severity == "fail" or f.kind == "unproven"]
    return any(f.first - 5 <= k <= f.last + 4 for f in strong)


def hunt(seconds, seed=0):
    """Counts of what was met, and a line for every false pass; ends after `seconds`."""
    end, draws, met, missed = monotonic() + seconds, 0, Counter(), []
    while monotonic() < end:
        random = np.random.default_rng([seed, draws])
        cell, time, joints, free = draw(random)
        path = path_of_motion(cell, time, joints, spin_free=free)
        tight = tightened(random, pa.audit(path, cell))
        draws += 1
        if tight is None:
            met["not followed"] += 1
            continue
        audit = pa.audit(path, tight)
        met[audit.verdict] += 1
        met["intervals"] += path.samples - 1
        met.update(f"found: {f.kind}" for f in audit.finding_list)
        for k, kind, severity, joint, much in beyond(audit):
            met[f"beyond between samples: {kind}"] += 1
            if not named(audit, k, kind, severity, joint):
                missed.append(f"seed {seed}, draw {draws - 1}: {kind} ({severity}) of {joint} on interval {k}, by {much:.2g}, verdict {audit.verdict}")
    return draws, met, missed


if __name__ == "__main__":
    draws, met, missed = hunt(float(sys.argv[1]), int(sys.argv[2]) if len(sys.argv) > 2 else 0)
    print(f"{draws} draws; " + "; ".join(f"{what} {count}" for what, count in sorted(met.items())))
    print("\n".join(missed) or "no false pass")
    sys.exit(bool(missed))
