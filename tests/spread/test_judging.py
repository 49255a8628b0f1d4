"""Draws judged many at a time against the audit of each alone."""

from dataclasses import replace

import numpy as np
import pytest
from example_arms import cell_of, path_of_motion, path_of_poses
from tolerant_cells import EVERY, swayed, tolerant

import pathaudit as pa
from pathaudit.findings import RULES, find
from pathaudit.kernels import linkage
from pathaudit.spread.judging import Course, judge, watched
from pathaudit.spread.placing import frames
from pathaudit.spread.study import audit_off, drawn

FLAGGED = ("unreachable", "posture jump")


def levels_of(audit):
    """The levels of an audit, from its own rules"""
    found = [float((~audit.motion.reached).sum()), float(sum(k > 0 and audit.motion.reached[k - 1] for k in audit.motion.jumps))]
    for w in watched(audit.rates)[2:]:
        series = next(rule for rule in RULES if rule.kind == w.kind).series(audit.rates, w.joint)
        found.append(w.sense * np.nanmax(w.sense * series) if np.isfinite(series).any() else np.nan)
    return np.array(found)


def flags_of(audit):
    """(kind, joint) -> the worst severity of its findings at the samples"""
    names, out = list(audit.cell.arm.joint_names), {}
    for f in find(audit.rates)[0]:
        joint = None if f.joint is None or f.kind in FLAGGED else names.index(f.joint)
        out[f.kind, joint] = "fail" if "fail" in (f.severity, out.get((f.kind, joint))) else "warn"
    return out


def judged_flags(course, levels):
    found = {}
    for w, level in zip(course.watched, levels, strict=True):
        for severity in ("warn", "fail"):
            if w.beyond(level, severity):
                found[w.kind, w.joint] = severity
    return found


def assert_same(nominal, dimensions, values, atol=1e-7):
    course = Course.of(nominal, np.arange(nominal.path.samples))
    off = frames(nominal.cell, dimensions, values)
    several = judge(course, off.chains, off.speed)
    for k, row in enumerate(values):
        alone = audit_off(nominal, dimensions, row)
        np.testing.assert_allclose(several.levels[k], levels_of(alone), atol=atol, rtol=1e-7)
        assert judged_flags(course, several.levels[k]) == flags_of(alone)
        reached = alone.motion.reached
        np.testing.assert_allclose(several.sigma[k], np.where(reached, alone.rates.sigma_min, 0.0), atol=1e-6)
        np.testing.assert_allclose(several.share[k][reached], alone.rates.speed_share[reached], rtol=1e-5, atol=1e-6)
        assert np.isinf(several.share[k][~reached]).all()


@pytest.mark.parametrize("seed, quick", [(0, 0.5), (1, 0.8), (2, 1.0), (3, 0.3)])
def test_each_draw_is_what_its_audit_says(seed, quick):
    nominal = swayed(seed, quick, every=3, **EVERY)
    dimensions = nominal.cell.tolerances.dimensions
    assert_same(nominal, dimensions, drawn(dimensions, 100, seed)[::17])


def test_far_off_too_where_the_arm_does_not_reach_or_has_to_jump():
    nominal = swayed(4, 0.5, every=3, part_xyz_mm=250.0, part_rpy_deg=10.0)
    dimensions = nominal.cell.tolerances.dimensions
    values = drawn(dimensions, 100, 1)[::4]
    # an audit alone looks for a nearer posture to start in where the steps from the one it was given lead a radian away
    course = Course.of(nominal)
    values = [row for row in values if np.abs(course.follow(frames(nominal.cell, dimensions, row).chains[0])[1][0] - course.start).max() < 1.0]
    off = frames(nominal.cell, dimensions, values)
    levels = judge(course, off.chains, off.speed).levels
    assert (levels[:, 0] > 0).sum() > 3 and (levels[:, 0] == 0).sum() > 3
    assert_same(nominal, dimensions, values, atol=1e-5)


def test_seven_joints_and_a_free_spin():
    rng = np.random.default_rng(3)
    rows = [{"name": f"a{k}", "a_mm": rng.uniform(50, 300), "alpha_deg": rng.choice([-90.0, 90.0]), "d_mm": rng.uniform(50, 250), "lower_deg": -200,
             "upper_deg": 200, "speed_deg_s": 40.0, "acceleration_deg_s2": 90.0} for k in range(7)]  # fmt: skip
    time = np.linspace(0.0, 2.0, 81)
    joints = 0.6 + 0.4 * np.sin(np.outer(time, 1.5 + 0.2 * np.arange(7)) + np.arange(7))
    cell = tolerant(cell_of(pa.Arm.from_dh(rows), 0.1, start=joints[0], tool_speed_mm_s=900.0), part_xyz_mm=2.0, part_rpy_deg=0.3, speed_percent=10.0)
    for path in (path_of_motion(cell, time, joints), path_of_poses(time, linkage.poses(*cell.chain, joints), spin_free=True)):
        nominal = pa.audit(path, cell)
        dimensions = cell.tolerances.dimensions
        assert_same(nominal, dimensions, drawn(dimensions, 100, 2)[::13], atol=1e-6)


def test_nothing_off_is_the_audit_as_stated(six):
    course = Course.of(six)
    none = judge(course, six.cell.chain.links[None], np.ones(1))
    np.testing.assert_allclose(none.levels[0], levels_of(six), rtol=1e-9, atol=1e-9)  # poses are solved to 1e-10
    followed = judge(replace(course, joints=course.joints[:0]), six.cell.chain.links[None], np.ones(1))
    np.testing.assert_allclose(followed.levels[0], levels_of(six), rtol=1e-13, atol=1e-14)


def test_draws_solved_from_the_cell_as_stated_are_what_following_finds(six):
    course, dimensions = Course.of(six, np.arange(six.path.samples)), six.cell.tolerances.dimensions
    off = frames(six.cell, dimensions, drawn(dimensions, 100, 8))
    near, followed = judge(course, off.chains, off.speed), judge(replace(course, joints=course.joints[:0]), off.chains, off.speed)
    np.testing.assert_allclose(near.levels, followed.levels, rtol=1e-6, atol=1e-7)
    np.testing.assert_allclose(near.sigma, followed.sigma, rtol=1e-6)
    out = [np.empty_like(course.joints) for _ in range(3)] + [np.empty(six.path.samples)]
    assert all(course.near(links, *out) for links in off.chains)


def test_a_draws_bits_do_not_depend_on_its_neighbours(six):
    course, dimensions = Course.of(six, np.arange(0, six.path.samples, 7)), six.cell.tolerances.dimensions
    values = drawn(dimensions, 100, 5)
    off = frames(six.cell, dimensions, values)
    together = judge(course, off.chains, off.speed)
    alone = [judge(course, frames(six.cell, dimensions, row).chains, frames(six.cell, dimensions, row).speed) for row in values[::9]]
    np.testing.assert_array_equal(together.levels[::9], np.concatenate([a.levels for a in alone]))
    np.testing.assert_array_equal(together.sigma[::9], np.concatenate([a.sigma for a in alone]))


def test_a_long_path_is_measured_as_a_whole(monkeypatch, six):
    from pathaudit.spread import judging

    course = Course.of(six)
    whole = judge(course, six.cell.chain.links[None], np.ones(1)).levels
    monkeypatch.setattr(judging, "PIECE", 17)
    np.testing.assert_allclose(judge(course, six.cell.chain.links[None], np.ones(1)).levels, whole, rtol=1e-12, atol=1e-14)


def test_what_has_no_bound_is_not_watched(six):
    kinds = [(w.kind, w.joint) for w in watched(six.rates)]
    assert kinds[:3] == [("unreachable", None), ("posture jump", None), ("near-singular", None)] and ("tool speed", None) not in kinds
    unknown = np.where(np.arange(6) == 3, np.nan, six.cell.arm.acceleration)
    again = pa.audit(six.path, replace(six.cell, arm=replace(six.cell.arm, acceleration=unknown)))
    assert ("joint acceleration", 3) not in [(w.kind, w.joint) for w in watched(again.rates)] and len(watched(again.rates)) == len(kinds) - 1
