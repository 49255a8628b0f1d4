"""How far off a cell may be before its verdict changes: known answers, full audits on both sides, brute force over a grid."""

import numpy as np
import pytest
from tolerant_cells import near_a_limit, wrist_bench

from pathaudit.findings import find
from pathaudit.spread.judging import Course
from pathaudit.spread.reserves import HALVINGS, MOST, PLACES, Verdicts, search, worst_direction
from pathaudit.spread.sharing import Job, Shared
from pathaudit.spread.slopes import slopes
from pathaudit.spread.study import VERDICTS, audit_off, study

REACH = np.sqrt(0.5**2 + 0.4**2 + 2 * 0.5 * 0.4 * np.cos(np.radians(35.0)))  # m, beyond which the elbow of wrist_bench(35) is too straight
RESERVE = 1000.0 * (REACH - 0.85)


def at_samples(audit):
    levels = {f.severity for f in find(audit.rates)[0]}
    return "fail" if "fail" in levels else "warn" if "warn" in levels else "pass"


def fineness(most):
    """How wide the gap may be in which the change was enclosed"""
    return most * (2 * PLACES - 1) / PLACES**2 / 2**HALVINGS


@pytest.fixture(scope="module")
def bench():
    return study(wrist_bench(35.0, part_xyz_mm=[1.0, 2.0, 0.0]), draws=100)


def by_name(found):
    return {r.dimension.name: r for r in found.reserves}


def test_the_reserve_of_a_planar_arm_is_its_closed_form(bench):
    reserve, fine = by_name(bench), fineness(MOST["mm"])
    assert bench.verdict == "pass"
    assert RESERVE - fine <= reserve["part x"].plus <= RESERVE and reserve["part x"].minus is None
    sideways = 1000.0 * np.sqrt(REACH**2 - 0.85**2)
    for side in (reserve["part y"].plus, reserve["part y"].minus):
        if sideways <= MOST["mm"]:
            assert sideways - fine <= side <= sideways
        else:
            assert side is None
    assert bench.name(reserve["part x"].plus_by) == "joint travel, j2"


def test_turning_the_part_about_the_base_changes_nothing(bench):
    """The part frame of the bench lies in the axis of the first joint."""
    turned = by_name(bench)["part rz"]
    assert turned.plus is None and turned.minus is None and turned.most == MOST["deg"]


def test_all_at_once_goes_to_the_nearest_corner(bench):
    """Corners of +-k mm by +-2 k mm: (0.85 m + k)^2 + (2 k)^2 = REACH^2."""
    k = np.roots([5.0, 2 * 0.85, 0.85**2 - REACH**2]).max() * 1000.0
    at = bench.all_at_once
    assert at.size == pytest.approx(k, abs=0.05) or at.size == pytest.approx(RESERVE, abs=0.05)
    assert at.size <= RESERVE


def test_the_worst_direction_of_a_planar_arm_is_straight_out(bench):
    """In multiples of 1 mm along x and 2 mm along y the circle's nearest point lies where it lies, no farther than along x."""
    angle = np.linspace(-np.pi / 2, np.pi / 2, 2_000_001)
    x, y = 1000.0 * (REACH * np.cos(angle) - 0.85), 1000.0 * REACH * np.sin(angle)
    nearest = np.hypot(x / 1.0, y / 2.0).min()
    dimensions = bench.dimensions
    shared = Shared(Job(Course.of(bench.audit), bench.audit.cell, dimensions), map)
    found = worst_direction(shared, bench.judge, dimensions, slopes(shared, dimensions))
    assert found.size == pytest.approx(nearest, rel=2e-3)


def test_out_of_its_plane_a_planar_arm_cannot_go(bench):
    assert by_name(bench)["part z"].plus < 0.02 and bench.name(by_name(bench)["part z"].plus_by) == "unreachable"


def test_full_audits_agree_on_both_sides(studied, six):
    assert studied.verdict in ("pass", "warn")
    changed = 0
    for r in studied.reserves:
        for sign, value in ((-1.0, r.minus), (1.0, r.plus)):
            if value is not None:
                changed += 1
                assert VERDICTS.index(at_samples(audit_off(six, (r.dimension,), [sign * value]))) <= VERDICTS.index(studied.verdict)
                assert VERDICTS.index(at_samples(audit_off(six, (r.dimension,), [sign * (value + fineness(r.most))]))) > VERDICTS.index(studied.verdict)
    assert changed > 3
    for w in (studied.worst, studied.all_at_once):
        assert VERDICTS.index(at_samples(audit_off(six, w.dimensions, w.values))) > VERDICTS.index(studied.verdict)
        assert VERDICTS.index(at_samples(audit_off(six, w.dimensions, 0.99 * w.values))) <= VERDICTS.index(studied.verdict)
    sizes = np.array([d.size for d in studied.worst.dimensions])
    assert np.linalg.norm(studied.worst.values / sizes) == pytest.approx(studied.worst.size, rel=0.01)


def test_no_direction_of_many_is_shorter_than_the_worst(studied, six):
    """Random directions in all six numbers of where the part stands, and the draws of the study itself: none changes the verdict sooner."""
    random = np.random.default_rng(11)
    worst, sizes = studied.worst, np.array([d.size for d in studied.worst.dimensions])
    ways = random.normal(size=(60, 6))
    ways /= np.linalg.norm(ways, axis=1)[:, None]
    for way in ways:
        assert VERDICTS.index(at_samples(audit_off(six, worst.dimensions, 0.97 * worst.size * way * sizes))) <= VERDICTS.index(studied.verdict)


def test_a_grid_over_two_dimensions_finds_nothing_nearer():
    audit = near_a_limit(1, every=10, part_xyz_mm=[0.0, 4.0, 4.0])
    found = study(audit, draws=100)
    dimensions, judge = audit.cell.tolerances.dimensions, found.judge
    side = np.linspace(-12.0, 12.0, 25)
    verdicts = np.array([[VERDICTS.index(at_samples(audit_off(audit, dimensions, (4.0 * y, 4.0 * z)))) for z in side] for y in side])
    changed = np.argwhere((verdicts < 2) if judge.now == 2 else (verdicts > judge.now))
    middle = len(side) // 2
    for axis, r in enumerate(found.reserves[:2]):
        line = verdicts[:, middle] if axis == 0 else verdicts[middle, :]
        there = 4.0 * side[np.flatnonzero((line < 2) if judge.now == 2 else (line > judge.now))]
        for reserve, beyond in ((r.plus, there[there > 0]), (r.minus, -there[there < 0])):
            assert (reserve is None) == (not len(beyond)) or (reserve is not None and reserve > 40.0)
            if reserve is not None and len(beyond):
                assert reserve <= beyond.min() + 1e-9 and beyond.min() - reserve <= 4.0 + 1e-9
    if judge.now < 2 and len(changed):
        nearest = np.hypot(side[changed[:, 0]], side[changed[:, 1]]).min()
        assert found.worst.size <= nearest + 1e-9


def test_what_fails_now_is_told_how_far_it_is_from_passing():
    failing = study(wrist_bench(37.0, part_xyz_mm=[20.0, 0.0, 0.0]), draws=100)
    need = 1000.0 * (0.85 - np.sqrt(0.5**2 + 0.4**2 + 2 * 0.5 * 0.4 * np.cos(np.radians(37.0))))
    back = by_name(failing)["part x"]
    if failing.verdict == "fail":
        assert need - 0.02 <= back.minus <= need + 0.02 and failing.worst is failing.all_at_once is None
    else:
        assert need < 0.0


def test_the_search_encloses_the_first_change_it_meets(bench):
    from dataclasses import replace

    w = replace(bench.watched[2], sense=1.0, warn=None, fail=0.0)
    verdicts = Verdicts((w,), np.array([-1.0]))
    ends, there = search(lambda at: np.sin(3.0 * at[:, :1]) - 0.5, verdicts, np.array([[1.0], [-1.0], [0.1]]))
    root = np.arcsin(0.5) / 3.0
    assert ends[0, 0] < root <= ends[0, 1] and ends[0, 1] - ends[0, 0] <= fineness(1.0) and there[0, 0] >= 0.0
    assert np.isinf(ends[1:, 1]).all() and (ends[1:, 0] == 1.0).all()
