"""The study as a whole: the same whoever runs it, told, cancelled, and what is read from it."""

from concurrent.futures import ProcessPoolExecutor, ThreadPoolExecutor
from dataclasses import replace
from multiprocessing import get_context

import numpy as np
import pytest
from example_arms import SWAY_TIME, path_of_motion, swaying
from tolerant_cells import swayed, tolerant

import pathaudit as pa
from pathaudit.errors import ModelError
from pathaudit.findings import find
from pathaudit.spread.bands import bands, kept_draws
from pathaudit.spread.study import Study, drawn, study
from pathaudit.tolerances import Dimension


def same(one, other):
    for name in ("values", "levels", "nominal", "slopes"):
        np.testing.assert_array_equal(getattr(one, name), getattr(other, name))
    for name in ("sample", "sigma_min", "busiest", "speed_share"):
        np.testing.assert_array_equal(getattr(one.bands, name), getattr(other.bands, name))
    assert one.reserves == other.reserves
    for a, b in ((one.worst, other.worst), (one.all_at_once, other.all_at_once)):
        assert (a is None) == (b is None) and (a is None or (a.size == b.size and (a.values == b.values).all()))


@pytest.fixture(scope="module")
def small():
    return swayed(1, 0.45, every=10, part_xyz_mm=2.0, speed_percent={"sigma": 2.0})


def test_the_same_seed_gives_the_same_bits_on_one_core_on_two_and_in_other_processes(small):
    default = study(small, draws=130, seed=3)
    same(default, study(small, draws=130, seed=3, map=map))
    with ThreadPoolExecutor(2) as two:
        same(default, study(small, draws=130, seed=3, map=two.map))
    with ProcessPoolExecutor(2, mp_context=get_context("spawn")) as processes:
        same(default, study(small, draws=130, seed=3, map=processes.map))
    assert (study(small, draws=130, seed=4, map=map).values != default.values).all()


def test_on_a_dask_cluster_too(small):
    distributed = pytest.importorskip("distributed")
    with distributed.Client(n_workers=2, threads_per_worker=1, dashboard_address=None) as client:
        same(study(small, draws=130, seed=3), study(small, draws=130, seed=3, map=lambda f, tasks: client.gather(client.map(f, tasks))))


def test_however_many_draws_no_more_than_a_round_of_them_is_handed_over(small, monkeypatch):
    from pathaudit.spread import sharing

    rounds = []

    def listening(function, tasks):
        rounds.append(sum(len(task) for task in tasks))
        return [function(task) for task in tasks]

    monkeypatch.setattr(sharing, "ROUND", 2)
    same(study(small, draws=130), study(small, draws=130, map=listening))
    assert max(rounds) <= 2 * sharing.TASK


def test_progress_is_told_and_what_the_listener_raises_ends_it(small):
    heard = []
    study(small, draws=130, told=lambda words, share: heard.append((words, share)))
    assert [share for words, share in heard if "draws" in words] == sorted(share for words, share in heard if "draws" in words)
    assert ("130 of 130 draws", 1.0) in heard and all(0.0 <= share <= 1.0 for _, share in heard)

    class Enough(Exception):
        pass

    def stop(words, share):
        if "of 100,000 draws" in words:
            raise Enough

    with pytest.raises(Enough):
        study(small, draws=100_000, told=stop)


@pytest.mark.parametrize("choice", [{"draws": 99}, {"draws": 2_000_000}, {"draws": 200.0}, {"draws": True}, {"seed": -1}, {"seed": "a"}])
def test_what_cannot_be_used_is_refused(small, choice):
    with pytest.raises(ModelError, match=next(iter(choice))):
        study(small, **choice)


@pytest.mark.parametrize("seed, quick", [(0, 0.4), (1, 1.0), (2, 0.6)])
def test_without_tolerances_every_draw_is_the_audit(seed, quick):
    audit = swayed(seed, quick, every=10)
    found = study(audit, draws=100)
    worst = {f.severity for f in find(audit.rates)[0]}
    assert found.verdict == ("fail" if "fail" in worst else "warn" if "warn" in worst else "pass")
    assert (found.levels == found.nominal).all() and found.chance(found.verdict).share == 1.0
    np.testing.assert_allclose(found.bands.busiest, np.tile(audit.rates.speed_share.max(axis=1), (3, 1)), rtol=1e-6)
    np.testing.assert_allclose(found.bands.speed_share, np.tile(audit.rates.speed_share, (3, 1, 1)), rtol=1e-6, atol=1e-12)
    np.testing.assert_allclose(found.bands.sigma_min, np.tile(audit.rates.sigma_min, (3, 1)), rtol=1e-6)
    assert found.sensitivities() == () and len(found.reserves) == 6


def test_values_are_drawn_as_stated():
    dimensions = Dimension("part_xyz_mm", 0, "part x", "mm", 3.0), Dimension("part_xyz_mm", 1, "part y", "mm", 2.0, True)
    x, y = drawn(dimensions, 20_000, 5).T
    assert abs(x).max() <= 3.0 and x.mean() == pytest.approx(0.0, abs=0.01) and x.std() == pytest.approx(dimensions[0].deviation, rel=5e-3)
    assert y.mean() == pytest.approx(0.0, abs=0.01) and y.std() == pytest.approx(2.0, rel=5e-3)
    assert np.quantile(y, 0.975) == pytest.approx(2.0 * 1.96, rel=0.02) and abs(np.corrcoef(x, y)[0, 1]) < 0.01


def test_the_draws_order_of_tolerances_is_no_matter_of_sign():
    """A cell whose stated numbers and tolerances are mirrored has mirrored draws in law: the chance of failing at +d or -d about a symmetric cell."""
    cell, joints = swaying(1)
    path = path_of_motion(cell, SWAY_TIME[::10] / 0.45, joints[::10])
    audit = pa.audit(path, tolerant(cell, speed_percent=10.0))
    found = study(audit, draws=1000)
    busiest = max(range(len(found.watched)), key=lambda i: found.nominal[i] if found.watched[i].kind == "joint speed" else -1.0)
    shares = found.levels[:, busiest]
    assert np.median(shares) == pytest.approx(found.nominal[busiest], rel=2e-3)
    np.testing.assert_allclose(shares, found.nominal[busiest] * (1.0 + found.values[:, 0] / 100.0), rtol=1e-12)


def test_the_chance_of_too_high_a_speed_is_known_where_only_the_speed_varies():
    cell, joints = swaying(1)
    path = path_of_motion(cell, SWAY_TIME[::10], joints[::10])
    peak = np.nanmax(pa.audit(path, cell).rates.speed_share)
    quick = replace(path, time=path.time * peak / 0.97)  # the busiest joint at 97 % of its limit
    found = study(pa.audit(quick, tolerant(cell, speed_percent=10.0)), draws=2000)
    truth = 0.5 * (1.0 - (1.0 / 0.97 - 1.0) / 0.1)
    i = max((i for i, w in enumerate(found.watched) if w.kind == "joint speed"), key=lambda i: found.nominal[i])
    known = found.chance_of(i)
    assert known.share == pytest.approx(truth, abs=0.01) and known.low <= truth <= known.high
    speed = next(r for r in found.reserves if r.dimension.key == "speed_percent")
    if found.verdict != "fail":
        assert speed.plus <= 100.0 * (1.0 / 0.97 - 1.0) + 0.05


def test_first_order_tells_the_spread_of_small_tolerances(studied):
    checked = 0
    for i, w in enumerate(studied.watched):
        if studied.straight[i] > 0.99 and studied.spread[i] > 0.0:
            assert studied.first_order[i] == pytest.approx(studied.spread[i], rel=0.15)
            checked += 1
    assert checked > 8
    for i in range(len(studied.watched)):
        parts = studied.sensitivities(i)
        assert sum(p.share for p in parts) == pytest.approx(1.0 if studied.first_order[i] > 0 else 0.0)
        assert [p.share for p in parts] == sorted((p.share for p in parts), reverse=True)


def test_slopes_are_the_differences_of_audits(studied, six):
    from pathaudit.spread.study import audit_off

    d = next(i for i, d in enumerate(studied.dimensions) if d.name == "part z")
    step = np.where(np.arange(len(studied.dimensions)) == d, 1e-3, 0.0)
    sigma = [np.nanmin(audit_off(six, studied.dimensions, sign * step).rates.sigma_min) for sign in (1, -1)]
    near = next(i for i, w in enumerate(studied.watched) if w.kind == "near-singular")
    assert studied.slopes[near, d] == pytest.approx((sigma[0] - sigma[1]) / 2e-3, rel=1e-3)


def test_bands_hold_what_they_say(studied, six):
    assert len(studied.bands.sample) == six.path.samples
    again = [studied.audit_of(k).rates for k in range(0, 300, 15)]
    for (low, middle, high), rows in ((studied.bands.speed_share, [r.speed_share for r in again]), (studied.bands.sigma_min, [r.sigma_min for r in again]),
                                      (studied.bands.busiest, [r.speed_share.max(axis=1) for r in again])):  # fmt: skip
        assert (low <= middle).all() and (middle <= high).all()
        inside = np.mean([(low <= row * (1 + 1e-6)) & (row <= high * (1 + 1e-6)) for row in rows])
        assert 0.8 < inside < 0.98
    at = studied.bands.at(np.array([0, 1, 2]))
    np.testing.assert_array_equal(at.speed_share, studied.bands.speed_share[:, :3])
    np.testing.assert_array_equal(at.sigma_min, studied.bands.sigma_min[:, :3])
    between = studied.bands.at(np.array([0.5])).speed_share[:, 0]
    np.testing.assert_allclose(between, studied.bands.speed_share[:, :2].mean(axis=1))


def test_bands_are_drawn_values_even_where_some_do_not_reach():
    share = np.array([[1.0], [2.0], [np.inf], [3.0]] * 25)
    found = bands(np.array([4]), np.where(np.isinf(share), 0.0, 1.0), np.stack([share, np.where(np.isinf(share), share, 0.5)], axis=2))
    assert found.busiest.ravel().tolist() == [1.0, 2.0, np.inf] and found.speed_share[:, 0].tolist() == [[1.0, 0.5], [2.0, 0.5], [np.inf, np.inf]]
    assert found.sigma_min.ravel().tolist() == [0.0, 1.0, 1.0]
    assert kept_draws(5000).sum() == 1000 and kept_draws(7).all()


def test_the_worst_draw_is_one_and_can_be_audited_in_full(studied):
    k = studied.worst_draw()
    w, i = studied.watched[studied.deciding], studied.deciding
    assert studied.levels[k, i] * w.sense == np.nanmax(studied.levels[:, i] * w.sense)
    audit = studied.audit_of(k)
    worst = {"joint speed": lambda: np.nanmax(audit.rates.speed_share[:, w.joint]), "near-singular": lambda: np.nanmin(audit.rates.sigma_min),
             "joint acceleration": lambda: np.nanmax(audit.rates.acceleration_share[:, w.joint])}[w.kind]()  # fmt: skip
    assert worst == pytest.approx(studied.levels[k, i], rel=1e-6)
    assert isinstance(studied, Study) and "fails in" in repr(studied)
