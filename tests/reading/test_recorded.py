"""Recorded paths: what is repaired, by how much, and that nothing else is changed; smoothing against known motions."""

import json

import numpy as np
import pytest

import pathaudit as pa
from pathaudit.reading import recorded, smoothing

STEP = 0.004


def motion(t):
    """A bow at about 60 mm/s while the tool turns: x, y, z in mm and a quaternion."""
    x, y, z = 60 * t, 15 * np.sin(1.3 * t), 2 * np.cos(t)
    half = 0.15 * np.sin(0.9 * t)
    return np.column_stack([x, y, z, np.cos(half), 0 * t, 0.6 * np.sin(half), 0.8 * np.sin(half)])


def table(t, poses=None, **more):
    poses = motion(t) if poses is None else poses
    return {"t_s": t.tolist(), **{c: poses[:, k].tolist() for k, c in enumerate("x_mm y_mm z_mm qw qx qy qz".split())}, **more}


def text(columns):
    rows = zip(*([str(value) if isinstance(value, str) else repr(value) for value in values] for values in columns.values()))
    return "\n".join([",".join(columns), *map(",".join, rows)]) + "\n"


T = STEP * np.arange(500)


@pytest.fixture
def read(tmp_path):
    def read(columns, name="log.csv", **choices):
        (tmp_path / name).write_text(columns if isinstance(columns, str) else text(columns))
        return pa.read_path(tmp_path / name, "recorded", **choices)

    return read


def edited(edit, t=T):
    rows = text(table(t, label=[f"r{k}" for k in range(len(t))])).splitlines()
    return "\n".join(edit(rows)) + "\n"


def test_a_good_record_is_not_changed(read, tmp_path):
    p = read(table(T))
    plain = pa.read_path(tmp_path / "log.csv")
    for field in ("time", "position", "rotation", "process", "source_line"):
        np.testing.assert_array_equal(getattr(p, field), getattr(plain, field))
    assert p.made == ("Recorded: 500 rows became 500 samples; nothing was wrong and nothing was changed.", "Intervals between 4 and 4 ms, usually 4 ms: left as they are.")


def test_rows_without_values_are_left_out_and_filled(read):
    def edit(rows):
        rows[101] = rows[101].split(",")[0] + ",,,,,,,,r100"
        for row in (200, 201):
            rows[row] = rows[row].replace(rows[row].split(",")[1], "NaN", 1)
        return rows

    p = read(edited(edit))
    assert p.samples == 499 and "3 rows without a whole time and pose left out, first in line 102." in p.made
    assert any(words.startswith("1 drop-out filled with 2 samples on the straight line, first after line 200: the longest 12 ms, the farthest 0.") for words in p.made)
    assert p.made[-1] == "Intervals between 4 and 8 ms, usually 4 ms: left as they are."  # one row that is missing leaves no hole to speak of
    k = int(np.argmin(np.abs(p.time - T[199])))
    assert np.abs(p.position[k] * 1000 - motion(T[199:200])[0, :3]).max() < 1e-3
    assert p.label[k] == "r198" and p.source_line[k - 1 : k + 3].tolist() == [200, 200, 200, 203]


def test_a_longer_drop_out_is_filled_at_the_usual_interval(read):
    p = read(edited(lambda rows: rows[:151] + rows[161:]))
    assert p.samples == 500 and np.allclose(np.diff(p.time), STEP)
    assert any("1 drop-out filled with 10 samples" in words and "the longest 44 ms" in words for words in p.made)
    assert np.abs(p.position * 1000 - motion(T)[:, :3]).max() < 0.02


def test_a_long_drop_out_in_motion_is_refused_with_its_line(read):
    with pytest.raises(pa.ReadError, match="line 151: found a drop-out of 204 ms in which the tool moved 12.* mm and turned .* deg, expected drop-outs of at most 80 ms .20 usual intervals"):
        read(edited(lambda rows: rows[:151] + rows[201:]))


def test_a_long_pause_at_rest_stays(read):
    poses = np.concatenate([motion(T), motion(np.full(1, T[-1]))])
    p = read(table(np.append(T, T[-1] + 3.0), poses))
    assert p.samples == 501 and any(words.startswith("1 pause without rows while the tool rested, first after line 501, at most 3000 ms long") for words in p.made)


def test_rows_out_of_order_and_copies(read):
    def edit(rows):
        rows[50], rows[51] = rows[51], rows[50]
        return [*rows[:300], rows[299], *rows[300:]]

    p = read(edited(edit))
    assert p.samples == 500 and [label for label in p.label] == [f"r{k}" for k in range(500)]
    assert "1 row out of order put where the time says, first in line 52, by at most 4 ms." in p.made
    assert "1 row with the time and pose of the row before left out, first in line 301." in p.made


def test_a_recorder_that_started_anew_is_refused(read):
    with pytest.raises(pa.ReadError, match="line 502: found a time 1.996 s before an earlier row's, expected rows at most 1 s late .was the recorder started anew"):
        read(edited(lambda rows: rows + rows[1:]))


def test_a_coarse_clock_is_spread(read):
    coarse = np.floor(T / 0.01 + 1e-9) * 0.01
    p = read(table(coarse, motion(T)))
    assert p.samples == 500 and (np.diff(p.time) > 0).all() and np.abs(p.time - T).max() < 0.0081
    assert any("with the time of the row before but another pose spread evenly, first in line 3: times changed by at most" in words for words in p.made)


def test_stale_poses_in_motion_go_and_dwells_stay(read):
    poses = motion(T)
    poses[101:103] = poses[100]
    poses[300:] = poses[299]
    p = read(table(T, poses))
    words = next(words for words in p.made if "repeat a pose while the tool moves" in words)
    assert words.startswith("2 rows that repeat a pose while the tool moves left out, first in line 103: the pose there changes by at most 0.")
    assert any("1 drop-out filled with 2 samples" in line for line in p.made) and p.samples == 500
    assert np.abs(p.position[:300] * 1000 - motion(T)[:300, :3]).max() < 0.01 and (p.position[300:] == p.position[299]).all()


def turned(wxyz, angle):
    """A quaternion after a turn about its own Z."""
    w, x, y, z = wxyz
    c, s = np.cos(angle / 2), np.sin(angle / 2)
    return np.array([w * c - z * s, x * c + y * s, y * c - x * s, z * c + w * s])


def test_a_spike_is_put_between_its_neighbours_and_told(read, tmp_path):
    poses = motion(T)
    poses[100, 1] += 7.5
    poses[300, 3:] = -turned(poses[300, 3:], np.radians(200))  # the sign of a quaternion means nothing
    p = read(table(T, poses))
    assert "2 spikes of one sample off the path put on the straight line between the samples before and after, first in line 102: changed by at most 7.5 mm and 160 deg." in p.made
    assert p.samples == 500 and (p.time == T).all()
    np.testing.assert_allclose(p.position[100], (p.position[99] + p.position[101]) / 2, atol=1e-12)
    plain = pa.read_path(tmp_path / "log.csv")
    others = np.ones(500, bool)
    others[[100, 300]] = False
    for field in ("position", "rotation"):
        np.testing.assert_array_equal(getattr(p, field)[others], getattr(plain, field)[others])
    truth = read(table(T))
    assert np.abs(p.position - truth.position).max() < 1e-6 and np.abs(p.rotation - truth.rotation).max() < 1e-4


def test_a_spike_at_uneven_times_lies_where_its_time_says(read):
    t, poses = np.delete(T, 201), np.delete(motion(T), 201, axis=0)
    poses[200, 2] -= 30
    p = read(table(t, poses))
    assert any(words.startswith("1 spike of one sample") for words in p.made)
    assert np.abs(p.position[200] * 1000 - motion(T[200:201])[0, :3]).max() < 1e-2


@pytest.mark.parametrize("size", [2, 3])
def test_longer_jumps_are_told_and_stay(read, size):
    poses = motion(T)
    poses[100 : 100 + size, 0] += 4.0
    p = read(table(T, poses))
    assert any(words.startswith("1 jump of two or three samples off the path and back left as it is, first in line 102, by at most 4") and words.endswith("look at the recording there.") for words in p.made)
    assert (p.position * 1000 == pytest.approx(poses[:, :3])) and not any("spike" in words for words in p.made)


def test_steps_corners_starts_and_noise_are_no_spikes(read):
    """At full speed around corners and back, from rest at once, onto another level and staying there, noise of any size up to 1 mm."""
    rng = np.random.default_rng(7)
    legs = [np.zeros((60, 3))]
    for direction in ([1, 0, 0], [-1, 0, 0], [0, 1, 0], [0, 0.7, 0.7], [0, 0, 0], [0, -1, 0]):
        legs.append(legs[-1][-1] + 4.0 * np.outer(np.arange(1, 61), direction))
    place = np.concatenate(legs)
    place[200:] += [0, 0, 25.0]
    t = STEP * np.arange(len(place))
    for sigma in (0.0, 0.001, 0.03, 0.3, 1.0):
        for _ in range(5):
            axis = np.tile([0.0, 0, -1], (len(place), 1)) + rng.normal(size=place.shape) * sigma * 1e-3
            axis /= np.linalg.norm(axis, axis=1, keepdims=True)
            noisy = place + rng.normal(size=place.shape) * sigma
            p = read({"t_s": t.tolist(), **{c: v.tolist() for c, v in zip("x_mm y_mm z_mm i j k".split(), [*noisy.T, *axis.T])}})
            assert not any("spike" in words or "jump" in words for words in p.made)
            np.testing.assert_array_equal(p.position, noisy / 1000)


def test_what_lies_beside_another_spike_or_an_end_is_not_judged(read):
    poses = motion(T)
    poses[[0, 1, 100, 102, 498, 499], 1] += 9.0
    p = read(table(T, poses))
    assert not any("spike" in words or "jump" in words for words in p.made)
    assert np.abs(p.position * 1000 - poses[:, :3]).max() < 1e-9


def test_orientations_that_are_not_unit_are_scaled_and_told(read):
    poses = motion(T)
    poses[7, 3:] *= 1.02
    p = read(table(T, poses))
    assert "1 orientation of length 1.02 to 1.02 scaled to 1, first in line 9." in p.made
    poses[9, 3:] *= 1.2
    with pytest.raises(pa.ReadError, match="line 11: found an orientation of length 1.2 .qw, qx, qy, qz., expected length 1, or 0 where nothing was recorded"):
        read(table(T, poses))
    poses[9, 3:] = 0
    assert any("1 row without a whole time and pose left out, first in line 11." in words for words in read(table(T, poses)).made)


@pytest.mark.parametrize("form", ["axis", "angles"])
def test_other_orientations_and_units(read, form):
    m = motion(T)
    w, v = m[:, 3], m[:, 4:]
    angles = np.column_stack([2 * np.arctan2(v[:, 0], w), 0 * w, 0 * w]) * 180 / np.pi + np.array([0.0, 10.0, 20.0])
    axis = np.column_stack([np.sin(0.1 * T), 0 * T, -np.cos(0.1 * T)])
    names, values = (("i", "j", "k"), axis) if form == "axis" else (("rx_deg", "ry_deg", "rz_deg"), angles)
    columns = {"t_ms": (1000 * T).tolist(), **{f"{c}_in": (m[:, k] / 25.4).tolist() for k, c in enumerate("xyz")}, **{c: values[:, k].tolist() for k, c in enumerate(names)}, "process": [1] * len(T)}
    lines = text(columns).splitlines()
    p = read("\n".join(lines[:40] + lines[42:]))
    assert p.samples == 500 and p.columns == tuple(columns) and p.spin_free == (form == "axis")
    assert np.abs(p.position * 1000 - m[:, :3]).max() < 0.01 and p.process.all()
    q = read(columns, smooth_ms=20)
    assert np.abs(q.position * 1000 - m[:, :3]).max() < 1e-3 and np.abs(q.rotation - p.rotation).max() < 1e-2


def test_from_json_lines_and_parquet(read, tmp_path):
    columns = table(T)
    columns["x_mm"][33] = None
    lines = "".join(json.dumps(dict(zip(columns, row))) + "\n" for row in zip(*columns.values()))
    one = read(lines, "log.jsonl")
    arrow = pytest.importorskip("pyarrow")
    from pyarrow import parquet

    parquet.write_table(arrow.table(columns), tmp_path / "log.parquet")
    other = pa.read_path(tmp_path / "log.parquet", "recorded")
    np.testing.assert_array_equal(one.position, other.position)
    assert "first in line 34." in one.made[1] and "first in row 34." in other.made[1]


@pytest.mark.parametrize(
    "edit, words",
    [
        (lambda rows: [*rows[:9], rows[9].replace(rows[9].split(",")[1], "1,5"), *rows[10:]], "line 10: found 10 cells, expected 9"),
        (lambda rows: [*rows[:9], rows[9].replace(rows[9].split(",")[1], "?"), *rows[10:]], "line 10, column x_mm: found '?', expected a number with a decimal point"),
        (lambda rows: [rows[0].replace("t_s", "time")] + rows[1:], "expected time once, as t_s or t_ms"),
        (lambda rows: [rows[0].replace("qw", "w")] + rows[1:], "expected exactly one of qw,qx,qy,qz"),
        (lambda rows: rows[:2], "found 1 usable samples, expected at least 2"),
        (lambda rows: [rows[0]] + [rows[1]] * 5, "found 1 usable samples"),
    ],
)
def test_refusals(read, edit, words):
    with pytest.raises(pa.ReadError) as caught:
        read(edited(edit))
    assert words in str(caught.value)


def test_a_plain_reader_says_where_repairs_are(read, tmp_path):
    with pytest.raises(pa.ReadError, match="expected times that strictly increase .a recorded log is repaired when it is read as format recorded"):
        read(table(np.floor(T / 0.01) * 0.01))
        pa.read_path(tmp_path / "log.csv")


@pytest.mark.parametrize("cell", ["", " ", "NaN", "null", "-"])
@pytest.mark.parametrize("column", ["t_s", "y_mm", "qz"])
def test_a_plain_reader_of_a_log_with_a_hole_names_the_mend_which_then_works(read, tmp_path, cell, column):
    columns = table(T)
    columns[column][40] = cell
    p = read(columns)
    assert any("1 row without a whole time and pose left out, first in line 42." in words for words in p.made)
    with pytest.raises(pa.ReadError, match="line 42, column .*: found .*, expected .*number.* .a recorded log with holes is repaired with --format recorded.$"):
        pa.read_path(tmp_path / "log.csv")


def test_a_plain_reader_of_json_lines_does_so_too(read, tmp_path):
    columns = table(T)
    columns["x_mm"][33] = None
    lines = "".join(json.dumps(dict(zip(columns, row))) + "\n" for row in zip(*columns.values()))
    read(lines, "log.jsonl")
    with pytest.raises(pa.ReadError, match="line 34, column x_mm: found 'null', expected a number .taken for JSON lines; a recorded log with holes is repaired with --format recorded"):
        pa.read_path(tmp_path / "log.jsonl")


@pytest.mark.parametrize("column, cell", [("process", ""), ("y_mm", "ten"), ("y_mm", "1,5")])
def test_what_a_recorded_path_would_not_mend_has_no_such_words(read, tmp_path, column, cell):
    columns = table(T, process=[1] * len(T))
    columns[column][40] = f'"{cell}"' if "," in cell else cell
    for format in ("recorded", None):
        with pytest.raises(pa.ReadError) as caught:
            (tmp_path / "log.csv").write_text(text(columns))
            pa.read_path(tmp_path / "log.csv", format)
        assert "line 42" in str(caught.value) and "--format recorded" not in str(caught.value)


# smoothing


def test_a_cubic_comes_back_as_it_is_up_to_the_ends():
    rng = np.random.default_rng(1)
    t = np.sort(rng.uniform(0, 2, 400))
    values = np.column_stack([1 + t - 2 * t**2 + 0.3 * t**3, t**3])
    got, lone = smoothing.local_cubic(t, values, 0.15)
    np.testing.assert_allclose(got[~lone], values[~lone], atol=1e-8)
    assert lone.mean() < 0.05


def test_the_noise_that_is_left_is_what_the_kernel_says():
    """The variance that is left is the integral of the squared kernel, 1.25, over width and interval."""
    rng = np.random.default_rng(2)
    t = STEP * np.arange(40_000)
    got, _ = smoothing.local_cubic(t, rng.normal(size=(len(t), 1)), 0.05)
    assert got[100:-100].var() == pytest.approx(1.25 * STEP / 0.05, rel=0.05)
    assert smoothing.noise(rng.normal(size=(5000, 2)) * [0.1, 0.3]) == pytest.approx(0.3, rel=0.05)


@pytest.mark.parametrize("times, share", [(1.0, 0.5), (0.3, 0.98)])
def test_half_the_amplitude_stays_at_the_stated_frequency(times, share):
    t, width = 1e-3 * np.arange(3000), 0.08
    wave = np.sin(2 * np.pi * times * smoothing.HALF / width * t)[:, None]
    got, _ = smoothing.local_cubic(t, wave, width)
    assert np.abs(got[200:-200]).max() / np.abs(wave).max() == pytest.approx(share, abs=0.015)


def test_smoothing_is_off_unless_asked_and_then_told(read):
    rng = np.random.default_rng(3)
    poses = motion(T)
    poses[:, :3] += rng.normal(size=(500, 3)) * 0.05
    rough = read(table(T, poses))
    assert (rough.position == np.array(poses[:, :3]) / 1000).all() and not any("Smoothed" in words for words in rough.made)
    fine = read(table(T, poses), smooth_ms=60)
    off = [np.linalg.norm(p.position * 1000 - motion(T)[:, :3], axis=1) for p in (rough, fine)]
    assert np.sqrt((off[1] ** 2).mean()) < 0.35 * np.sqrt((off[0] ** 2).mean())
    words = fine.made[-1]
    assert words.startswith("Smoothed as asked by local cubics over 60 ms before and after each sample (half the amplitude stays at 12.6 Hz), 0 dwells held still: poses changed by at most 0.")
    assert (fine.time == rough.time).all()


def test_a_dwell_stays_a_dwell_and_a_corner_at_rest_stays_sharp(read):
    """Straight to a corner, a rest of half a second, on in another direction: the rest is one pose, and the corner is not cut."""
    rng = np.random.default_rng(4)
    ramp = 40 * 0.5 * (1 - np.cos(np.linspace(0, np.pi, 250)))
    x = np.concatenate([ramp, np.full(125, 40.0), np.full(250, 40.0)])
    y = np.concatenate([np.zeros(375), ramp])
    t = STEP * np.arange(len(x))
    truth = np.column_stack([x, y, 0 * x])
    poses = np.column_stack([truth + rng.normal(size=truth.shape) * 0.02, np.ones_like(x), 0 * x, 0 * x, 0 * x])
    p = read(table(t, poses), smooth_ms=40)
    assert "1 dwell held still" in p.made[-1]
    rest = p.position[255:370]
    assert (rest == rest[0]).all() and np.abs(rest[0] * 1000 - [40, 0, 0]).max() < 0.01
    assert np.linalg.norm(p.position * 1000 - truth, axis=1).max() < 0.08
    assert np.abs(np.diff(p.position[:, :2], axis=0)).max() * 1000 < 0.35


def test_slow_motion_is_no_dwell():
    t = STEP * np.arange(3000)
    values = np.column_stack([0.2e-3 * t, 0 * t, 0 * t])
    assert smoothing.dwells(t, values, 0.02, 0.02e-3) == []


def test_a_window_that_makes_no_sense_is_refused(read):
    for width in (5, 3000):
        with pytest.raises(pa.ReadError, match=f"found smoothing over {width} ms, expected 12 to 1000 ms for a log with intervals of 4 ms"):
            read(table(T), smooth_ms=width)


def test_the_limit_is_stated(read, monkeypatch):
    monkeypatch.setattr(recorded, "MOST_ROWS", 100)
    with pytest.raises(pa.ReadError, match="found 500 rows, expected at most 100 of a recorded path: cut the log"):
        read(table(T))
