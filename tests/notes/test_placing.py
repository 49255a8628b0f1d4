"""Notes find their places again on a path that was retimed, exported anew, lengthened or moved, and say what has changed there."""

from dataclasses import replace
from types import SimpleNamespace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pathaudit import path_from
from pathaudit.notes import Notes, new_note, placed
from pathaudit.notes.placing import MOVED

SOME = settings(max_examples=25, deadline=None)


def path_of(position_mm, axis, time):
    columns = dict(zip(("x_mm", "y_mm", "z_mm"), np.transpose(position_mm)))
    return path_from({"t_s": time, **columns, **dict(zip("ijk", np.transpose(axis / np.linalg.norm(axis, axis=1)[:, None])))})


def cell(tool_mm=100.0, speed=3.0):
    tool = np.eye(4)
    tool[2, 3] = tool_mm / 1000
    arm = SimpleNamespace(chain=SimpleNamespace(links=np.eye(4)[None]), lower=np.array([-3.0]), upper=np.array([3.0]), speed=np.array([speed]),
                          acceleration=np.array([np.nan]), joint_names=("j1",))
    return SimpleNamespace(arm=arm, placement=np.eye(4), tool=tool, part=np.eye(4))


def audit_of(path, findings=(), in_cell=None):
    return SimpleNamespace(path=path, finding_list=tuple(findings), cell=in_cell or cell(), time=path.time)


def wavy(u, a=60.0, b=35.0, k=2.0):
    """A smooth curve of some 500 mm with a tool that tips along it; u (N,) from 0 to 1."""
    position = np.stack([400 * u, a * np.sin(2 * np.pi * k * u), b * np.cos(5 * u)], axis=1)
    axis = np.stack([0.4 * np.sin(3 * u), 0.3 * np.cos(7 * u), -np.ones_like(u)], axis=1)
    return position, axis


curves = st.fixed_dictionaries({"a": st.floats(0, 120), "b": st.floats(0, 80), "k": st.floats(0.2, 4)})


def sampled(curve, count, speed=25.0, warp=0.0):
    """The curve in `count` samples, `warp` of them drawn together in the middle, at an even speed in mm/s."""
    u = np.linspace(0, 1, count)
    u = u + warp * np.sin(2 * np.pi * u) / (2 * np.pi)
    position, axis = wavy(u, **curve)
    along = np.r_[0, np.cumsum(np.linalg.norm(np.diff(position, axis=0), axis=1))]
    return path_of(position, axis, along / speed)


def noted(audit, samples):
    notes = Notes()
    for k in samples:
        notes = notes.put(new_note(audit, int(k), f"at {k}", "Ann", taken=notes.by_id))
    return notes


def by_words(found):
    return {p.note.text: p for p in found}


@SOME
@given(curves, st.integers(50, 900), st.randoms(use_true_random=False))
def test_nothing_has_changed(curve, count, random):
    audit = audit_of(sampled(curve, count))
    samples = sorted(random.sample(range(count), 5))
    found = placed(noted(audit, samples), audit)
    assert [(p.sample, p.stale) for p in found] == [(k, "") for k in samples]


@SOME
@given(curves, st.integers(200, 900), st.randoms(use_true_random=False), st.floats(0.2, 0.9))
def test_a_retimed_path_keeps_its_notes_and_tells_the_speed(curve, count, random, factor):
    path = sampled(curve, count)
    slowed = slice(count // 3, 2 * count // 3)
    steps = np.diff(path.time)
    steps[slowed] /= factor
    again = replace(path, time=np.r_[path.time[0], path.time[0] + np.cumsum(steps)])
    samples = sorted(random.sample(range(count), 8))
    for k, p in zip(samples, placed(noted(audit_of(path), samples), audit_of(again))):
        assert p.sample == k and "moved" not in p.stale and "gone" not in p.stale
        beside = [abs(path.distance[k] - path.distance[end]) * 1000 for end in (slowed.start, slowed.stop)]
        if min(beside) > 6:
            assert p.stale == (f"The programmed speed here was 25 mm/s and is {25 * factor:.4g} mm/s." if slowed.start < k < slowed.stop else "")


@SOME
@given(curves, st.integers(300, 900), st.integers(300, 900), st.floats(-0.5, 0.5), st.randoms(use_true_random=False))
def test_a_path_with_other_samples_keeps_its_notes(curve, count, other, warp, random):
    before, after = sampled(curve, count), sampled(curve, other, warp=warp)
    samples = sorted(random.sample(range(count), 8))
    found = placed(noted(audit_of(before), samples), audit_of(after))
    for k, p in zip(samples, found):
        step = np.linalg.norm(np.diff(after.position, axis=0), axis=1).max()
        assert np.linalg.norm(after.position[p.sample] - before.position[k]) <= step and p.stale == ""


@SOME
@given(curves, st.integers(1, 200), st.integers(0, 200), st.randoms(use_true_random=False))
def test_samples_put_before_and_behind(curve, before, behind, random):
    path = sampled(curve, 400)
    place, axis = 1000 * path.position, path.rotation[:, :, 2]
    lead = place[0] + np.linspace(1, 0, before, endpoint=False)[:, None] * np.array([-0.8, 0.3, 1.0]) * before
    out = place[-1] + np.linspace(0, 1, behind + 1)[1:, None] * np.array([0.7, 0.3, 1.0]) * behind
    longer_place = np.vstack([lead, place, out])
    longer = path_of(longer_place, np.vstack([np.repeat(axis[:1], before, 0), axis, np.repeat(axis[-1:], behind, 0)]),
                     np.r_[0, np.cumsum(np.linalg.norm(np.diff(longer_place, axis=0), axis=1))] / 25)
    samples = sorted(random.sample(range(8, 392), 6))
    found = placed(noted(audit_of(path), samples), audit_of(longer))
    assert [p.sample - before for p in found] == samples and not any(p.stale for p in found)


@SOME
@given(curves, st.integers(60, 200), st.integers(230, 340), st.floats(0.7, 30), st.randoms(use_true_random=False))
def test_a_shifted_part_marks_exactly_the_notes_in_it(curve, first, last, shift, random):
    path = sampled(curve, 400)
    place = 1000 * path.position
    moved = place.copy()
    moved[first : last + 1] += shift * np.array([0, 0.6, 0.8]) if curve["a"] * curve["k"] < 30 else shift * np.array([0, 0, 1.0])
    across = np.gradient(place, axis=0)
    across /= np.linalg.norm(across, axis=1)[:, None]
    seen = np.linalg.norm(np.cross(moved - place, across), axis=1)      # a shift along the path itself cannot be seen
    again = path_of(moved, path.rotation[:, :, 2], path.time)
    samples = [k for k in sorted(random.sample(range(400), 40)) if min(abs(k - first), abs(k - last)) > 3]
    for p in placed(noted(audit_of(path), samples), audit_of(again)):
        k = int(p.note.text[3:])
        if first < k < last:
            if seen[k] > 3 * MOVED + 0.2:
                assert "The path has moved by" in p.stale, (k, p)
                assert float(p.stale.split("moved by ")[1].split(" mm")[0]) <= shift + 0.051
        else:
            assert p.sample == k and "moved" not in p.stale and "turned" not in p.stale


def test_words_for_moved_and_turned():
    path = sampled({"a": 0.0, "b": 0.0, "k": 1.0}, 400)
    notes = noted(audit_of(path), [200])
    shifted = path_of(1000 * path.position + [0, 3.0, 4.0], path.rotation[:, :, 2], path.time)
    assert placed(notes, audit_of(shifted))[0].stale == "The path has moved by 5.0 mm here."
    c, s = np.cos(np.radians(2.0)), np.sin(np.radians(2.0))
    across = np.cross(path.rotation[:, :, 2], [1.0, 0.0, 0.0])
    across /= np.linalg.norm(across, axis=1)[:, None]
    tipped = c * path.rotation[:, :, 2] + s * np.cross(across, path.rotation[:, :, 2])
    assert placed(notes, audit_of(path_of(1000 * path.position, tipped, path.time)))[0].stale == "The path has turned by 2.0 deg here."
    assert placed(notes, audit_of(path_of(1000 * path.position + [0, 3.0, 4.0], tipped, path.time)))[0].stale \
        == "The path has moved by 5.0 mm and turned by 2.0 deg here."


def test_columns_with_one_decimal_are_the_same_path():
    path = sampled({"a": 60.0, "b": 35.0, "k": 2.0}, 500)
    rounded = path_of(np.round(1000 * path.position, 1), np.round(path.rotation[:, :, 2], 3), np.round(path.time, 3))
    assert [p.stale for p in placed(noted(audit_of(path), range(0, 500, 50)), audit_of(rounded))] == [""] * 10


def corner(steps):
    """200 mm along X, then 200 mm along Y, sampled every `steps` mm."""
    legs = np.arange(0, 200, steps)
    a = np.stack([legs, 0 * legs, 0 * legs], axis=1)
    b = a[:, [1, 0, 2]] + [200.0, 0.41 * steps, 0]
    place = np.vstack([a, b])
    return path_of(place, np.tile([0.0, 0, -1], (len(place), 1)), np.r_[0, np.cumsum(np.linalg.norm(np.diff(place, axis=0), axis=1))] / 20)


def test_a_corner_that_is_cut_by_other_samples_has_not_moved():
    fine, coarse = corner(0.5), corner(2.0)
    near = [k for k in range(fine.samples) if 197 < 1000 * fine.distance[k] < 203]
    for p in placed(noted(audit_of(fine), near), audit_of(coarse)):
        assert "moved" not in p.stale and "gone" not in p.stale


def loop(times, count=300):
    """The same figure of eight, `times` over: it crosses itself, and each round lies on the one before."""
    u = np.linspace(0, times, times * count + 1)
    place = np.stack([80 * np.sin(2 * np.pi * u), 50 * np.sin(4 * np.pi * u), 0 * u], axis=1)
    along = np.r_[0, np.cumsum(np.linalg.norm(np.diff(place, axis=0), axis=1))]
    return path_of(place, np.tile([0.0, 0, -1], (len(u), 1)), along / 30)


def test_the_crossing_and_each_round_are_told_apart():
    path = loop(3)
    samples = [0, 150, 300, 450, 600, 750, 900, 75, 375, 675, 10, 310, 610]
    again = audit_of(path_of(np.vstack([[[0, -30, 40.0]], 1000 * path.position]), np.tile([0.0, 0, -1], (path.samples + 1, 1)), np.r_[-2, path.time]))
    for shift, audit in ((0, audit_of(path)), (1, again)):
        for p in placed(noted(audit_of(path), samples), audit):
            assert p.sample == int(p.note.text[3:]) + shift
            assert "moved" not in p.stale and "gone" not in p.stale


def test_a_round_that_was_moved_is_not_taken_for_its_neighbour():
    path, moved = loop(3), 1000 * loop(3).position
    moved[310:590] += [0, 0, 4.0]
    found = by_words(placed(noted(audit_of(path), [150, 450, 750]), audit_of(path_of(moved, path.rotation[:, :, 2], path.time))))
    assert (found["at 150"].sample, found["at 150"].stale, found["at 750"].sample, found["at 750"].stale) == (150, "", 750, "")
    assert found["at 450"].sample == pytest.approx(450, abs=2) and found["at 450"].stale.startswith("The path has moved by 4.0 mm here.")


def test_there_and_back_on_the_same_line():
    u = np.r_[np.linspace(0, 1, 101), np.linspace(1, 0, 101)[1:]]
    path = path_of(np.stack([200 * u, 0 * u, 0 * u], axis=1), np.tile([0.0, 0, -1], (201, 1)), np.arange(201) * 0.1)
    found = placed(noted(audit_of(path), [50, 150]), audit_of(path))
    assert [(p.sample, p.stale) for p in found] == [(50, ""), (150, "")]
    late = path_of(1000 * path.position[60:], path.rotation[60:, :, 2], path.time[60:])      # the way there is cut off
    back = by_words(placed(noted(audit_of(path), [50, 150]), audit_of(late)))
    assert (back["at 150"].sample, back["at 150"].stale) == (90, "")
    assert back["at 50"].stale == "The place is gone: the path does not pass it as it did."


def test_where_the_tool_waits_and_where_it_only_turns():
    place = np.vstack([np.linspace([0, 0, 0], [50, 0, 0], 51), np.repeat([[50.0, 0, 0]], 20, 0), np.linspace([51, 0, 0], [100, 0, 0], 50)])
    still = np.tile([0.0, 0, -1], (121, 1))
    waiting = path_of(place, still, np.arange(121) * 0.1)
    assert [p.sample for p in placed(noted(audit_of(waiting), [50, 55, 60, 70]), audit_of(waiting))] == [50, 55, 60, 70]
    tip = np.radians(np.r_[np.zeros(51), np.linspace(2, 40, 20), np.full(50, 40.0)])
    turning = path_of(place, np.stack([np.sin(tip), 0 * tip, -np.cos(tip)], axis=1), np.arange(121) * 0.1)
    again = replace(turning, time=turning.time * 3.0)
    assert [p.sample for p in placed(noted(audit_of(turning), [50, 55, 60, 70]), audit_of(again))] == [50, 55, 60, 70]


def test_a_place_that_is_gone():
    path = sampled({"a": 0.0, "b": 0.0, "k": 1.0}, 400)
    away = path_of(1000 * path.position + [0, 0, 120.0], path.rotation[:, :, 2], path.time)
    found = placed(noted(audit_of(path), [100]), audit_of(away))[0]
    assert found.stale == "The place is gone: the path does not come nearer than 120 mm." and found.sample == 100


def test_a_note_written_by_hand_stands_at_its_distance():
    from pathaudit.notes.from_toml import notes_from

    audit = audit_of(sampled({"a": 0.0, "b": 0.0, "k": 1.0}, 401))
    notes = Notes(notes_from("x", 'n1.at_mm = 100\nn1.text = "here"\nn2.at_mm = 900\nn2.text = "too far"\n'))
    found = placed(notes, audit)
    assert (found[0].sample, found[0].stale) == (100, "") and found[1].sample == 400
    assert found[1].stale == "The path ends 500.0 mm before this place."


def flagged(severity="fail", value=712.0, limit=410.0, joint="j1", kind="joint speed", from_mm=90.0, to_mm=110.0):
    return SimpleNamespace(kind=kind, joint=joint, severity=severity, value=value, limit=limit, unit="deg/s", from_mm=from_mm, to_mm=to_mm, worst=100, first=90, last=110)


@pytest.mark.parametrize("now, where, said", [
    ([flagged()], cell(), ""),
    ([flagged(value=715.0)], cell(), ""),
    ([flagged(joint="j2"), flagged(from_mm=85.0)], cell(), ""),
    ([flagged(severity="warn")], cell(), "The finding (joint speed, j1) is now warn instead of fail."),
    ([flagged(value=500.0, limit=450.0)], cell(speed=3.5), "Its value was 712 deg/s and is 500 deg/s. Its limit was 410 deg/s and is 450 deg/s. Changed in the cell since: limits."),
    ([flagged(joint="j2")], cell(), "The finding (joint speed, j1) is gone."),
    ([], cell(tool_mm=90.0), "The finding (joint speed, j1) is gone. Changed in the cell since: tool."),
    ([flagged(from_mm=300.0, to_mm=310.0)], cell(), "The finding (joint speed, j1) is gone."),
])
def test_what_became_of_the_finding(now, where, said):
    path = sampled({"a": 0.0, "b": 0.0, "k": 1.0}, 401)
    notes = Notes((new_note(audit_of(path, [flagged()]), None, "look", "Ann", finding=0),))
    assert notes.items[0].finding.joint == "j1" and notes.items[0].at_mm == 100.0
    found = placed(notes, audit_of(path, now, where))[0]
    assert found.stale == said
    assert found.finding == (None if "gone" in said else len(now) - 1)


def test_a_sample_that_is_not_there():
    audit = audit_of(sampled({"a": 0.0, "b": 0.0, "k": 1.0}, 50))
    with pytest.raises(ValueError, match="sample is 50, expected 0 to 49"):
        new_note(audit, 50, "", "Ann")


def test_the_shortest_path():
    audit = audit_of(path_of([[0, 0, 0], [0.0, 0, 0]], np.array([[0, 0, -1.0]] * 2), [0, 1]))
    assert [(p.sample, p.stale) for p in placed(noted(audit, [0, 1]), audit)] == [(0, ""), (1, "")]
