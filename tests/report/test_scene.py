"""What is sent to a picture: kept samples, joint points, packing, plain values."""

import json
import zlib

import numpy as np
import pytest
from fake_audit import fake_audit
from hypothesis import given, settings
from hypothesis import strategies as st

from pathaudit.causes import lost_words
from pathaudit.report.scene import MOST_SAMPLES, scene, significant
from pathaudit.report.thinning import kept_samples, spans


def unpacked(block, layout):
    """The reverse of Scene.packed, written with NumPy alone: name -> (columns, samples)."""
    planes = np.frombuffer(zlib.decompress(block), dtype=np.uint8).reshape(4, -1)
    words = np.cumsum(np.ascontiguousarray(planes.T).view("<u4").ravel(), dtype=np.uint32)
    columns = words.view(np.float32).reshape(sum(count for _, count in layout), -1)
    starts = np.cumsum([0] + [count for _, count in layout])
    return {name: columns[start:start + count] for (name, count), start in zip(layout, starts)}


@given(seed=st.integers(0, 10_000), samples=st.integers(5001, 30_000), series=st.integers(1, 14))
@settings(max_examples=15, deadline=None)
def test_no_peak_is_lost_when_a_long_path_is_thinned(seed, samples, series):
    rng = np.random.default_rng(seed)
    values = np.cumsum(rng.standard_normal((samples, series)), axis=0)
    values[rng.random(samples) < 0.02] = np.nan
    for column in range(series):
        values[rng.integers(samples), column] = 1e6
    always = rng.integers(0, samples, 50)
    kept = kept_samples(values, MOST_SAMPLES, always)
    assert len(kept) <= MOST_SAMPLES
    assert np.all(np.diff(kept) > 0) and kept[0] == 0 and kept[-1] == samples - 1
    assert np.isin(always, kept).all()
    np.testing.assert_array_equal(np.nanmax(values[kept], axis=0), np.nanmax(values, axis=0))
    np.testing.assert_array_equal(np.nanmin(values[kept], axis=0), np.nanmin(values, axis=0))


def test_a_long_path_keeps_its_peaks_and_every_findings_worst_sample():
    audit = fake_audit(200_000)
    shown = scene(audit)
    sample = shown.arrays["sample"].astype(int)
    assert len(sample) <= MOST_SAMPLES
    assert {f.worst for f in audit.finding_list} <= set(sample.tolist())
    np.testing.assert_allclose(np.nanmax(shown.arrays["share_percent"], axis=0), 100 * np.nanmax(audit.rates.speed_share, axis=0), rtol=1e-6)
    np.testing.assert_allclose(np.nanmin(shown.arrays["sigma_min"]), np.nanmin(audit.rates.sigma_min), rtol=1e-6)


def test_many_gaps_do_not_break_the_bound():
    audit = fake_audit(40_000, gap=False)
    audit.motion.reached[::3] = False
    audit.joints[::3] = audit.rates.speed_share[::3] = audit.rates.sigma_min[::3] = np.nan
    shown = scene(audit)
    assert len(shown.arrays["sample"]) <= MOST_SAMPLES
    assert len(shown.facts["gaps"]) <= 2001


@pytest.mark.parametrize("samples, n", [(2, 1), (2, 6), (3, 12), (500, 12)])
def test_small_paths_and_any_number_of_joints(samples, n):
    shown = scene(fake_audit(samples, n))
    assert shown.arrays["joints"].shape == shown.arrays["travel_percent"].shape == (samples, n)
    assert len(shown.facts["rows"]) == 3 * n + 3
    assert sorted(k for group in shown.facts["groups"] for k in group["lanes"]) == list(range(3 * n + 3))
    json.dumps(shown.facts, allow_nan=False)


@pytest.mark.parametrize("bounds", [{"sigma_min_fail": 0.0}, {"sigma_min_fail": 0.0, "sigma_min_warn": 0.0}, {"speed_share_fail": 0.0, "speed_share_warn": 0.0},
                                    {"tool_speed_mm_s": 12.0}])
@pytest.mark.parametrize("known", [True, False])
def test_every_row_has_a_scale_whatever_the_thresholds(bounds, known):
    audit = fake_audit(100)
    vars(audit.cell.thresholds).update(bounds)
    if not known:
        audit.rates.sigma_min[:] = audit.rates.speed_share[:] = audit.rates.tool_speed[:] = np.nan
    for row in scene(audit).facts["rows"]:
        assert row["low"] < row["high"] and (not row["log"] or row["low"] > 0)
        assert all(row["low"] <= value <= row["high"] or value == 0 for value, _ in row["bounds"])


def test_travel_and_acceleration_are_shares_of_what_the_joint_has():
    audit = fake_audit(600, tight=True)
    arm, shown = audit.cell.arm, scene(audit)
    travel, acceleration = shown.arrays["travel_percent"], shown.arrays["acceleration_percent"]
    np.testing.assert_allclose(arm.lower + travel / 100 * (arm.upper - arm.lower), audit.joints, atol=1e-5)
    np.testing.assert_allclose(acceleration[:, 4], 100 * audit.rates.acceleration_share[:, 4], rtol=1e-6)
    assert np.isnan(acceleration[:, 0]).all()
    lanes = [row for row in shown.facts["rows"] if row["title"] == "accel."]
    assert [bool(row["word"]) for row in lanes] == [True, True, True, True, False, True]
    arm.upper[2] = np.inf
    shown = scene(audit)
    assert np.isnan(shown.arrays["travel_percent"][:, 2]).all()
    assert [row["word"] for row in shown.facts["rows"] if row["title"] == "travel"] == ["", "", "turns without end", "", "", ""]


def test_a_finding_marks_the_lane_that_it_is_about_and_unfolds_its_joint():
    facts = scene(fake_audit(600, tight=True)).facts
    lane = {f["kind"]: (facts["rows"][f["row"]]["title"], facts["rows"][f["row"]]["lines"][-1]) for f in facts["findings"] if f["row"] >= 0}
    assert lane["joint travel"] == ("travel", ["travel_percent", 1, "main"])
    assert lane["joint acceleration"] == ("accel.", ["acceleration_percent", 4, "main"])
    assert lane["joint speed"][0] == "speed" and lane["near-singular"][0] == "sigma_min"
    assert [group["title"] for group in facts["groups"] if len(group["lanes"]) > 1 and not group["folded"]] == ["j2", "j5"]
    assert all(group["folded"] for group in scene(fake_audit(600)).facts["groups"][:6])


def test_the_travel_lane_shows_what_lies_past_the_end():
    audit = fake_audit(300, gap=False)
    audit.cell.arm.upper[0] = np.quantile(audit.joints[:, 0], 0.9)
    shown = scene(audit)
    row, travel = shown.facts["rows"][9], shown.arrays["travel_percent"][:, 0]
    assert row["lines"] == [["travel_percent", 0, "main"]] and travel.max() > 100 and 104 <= row["high"] <= 120
    assert row["bounds"][2:] == [[0.0, "fail"], [100.0, "fail"]] and row["bad"] == "outside"
    near = row["bounds"][0][0]
    assert near == pytest.approx(100 * np.deg2rad(5) / (audit.cell.arm.upper[0] - audit.cell.arm.lower[0]))


def test_before_and_after_are_the_same_poses():
    audit = fake_audit(8000)
    after = audit.suggestion.audit()
    shown = scene(after, applied=audit.suggestion, before=audit)
    sample = shown.arrays["sample"].astype(int)
    assert len(sample) <= MOST_SAMPLES
    np.testing.assert_allclose(shown.arrays["programmed_s"], audit.time[sample], rtol=1e-6)
    np.testing.assert_allclose(shown.arrays["before_share_percent"], 100 * audit.rates.speed_share[sample], rtol=1e-6)
    np.testing.assert_allclose(shown.arrays["before_speed_mm_s"], 1e3 * audit.rates.tool_speed[sample], rtol=1e-6)
    for name, full in (("before_share_percent", audit.rates.speed_share), ("share_percent", after.rates.speed_share)):
        np.testing.assert_allclose(np.nanmax(shown.arrays[name], axis=0), 100 * np.nanmax(full, axis=0), rtol=1e-6)
    styles = {line[0]: line[2] for row in shown.facts["rows"] for line in row["lines"]}
    assert styles["before_share_percent"] == styles["before_speed_mm_s"] == styles["before_acceleration_percent"] == "before"
    assert shown.facts["rows"][0]["high"] >= min(200.0, np.nanmax(shown.arrays["before_share_percent"]))
    assert "suggested_speed_mm_s" not in shown.arrays and not any(name.startswith(("before", "programmed")) for name in scene(audit).arrays)


def test_the_suggested_speed_is_drawn_only_where_there_is_one_to_suggest():
    audit = fake_audit(500)
    shown = scene(audit)
    np.testing.assert_allclose(shown.arrays["suggested_speed_mm_s"], 1e3 * audit.suggestion.factor * audit.rates.tool_speed, rtol=1e-6)
    audit.suggestion.factor = np.ones(500)
    assert "suggested_speed_mm_s" not in scene(audit).arrays


def test_the_lost_direction_is_said_wherever_the_tool_is_near_a_singular_place():
    audit = fake_audit(1500)
    shown = scene(audit)
    said = np.zeros(1500, dtype=bool)
    for first, last, words in shown.facts["lost"]:
        assert words.startswith(("turn about", "move along")) and first <= last and not said[first:last + 1].any()
        said[first:last + 1] = True
    np.testing.assert_array_equal(said, np.nan_to_num(audit.rates.sigma_min, nan=1) < 0.06)
    worst = int(np.nanargmin(audit.rates.sigma_min))
    near = lost_words(audit.rates, worst)
    assert near.split("(")[0] == next(words for first, last, words in shown.facts["lost"] if first <= worst <= last).split("(")[0]


def test_a_path_that_is_near_singular_now_and_then_stays_small():
    audit = fake_audit(30_000, gap=False)
    audit.rates.sigma_min[:] = np.where(np.arange(30_000) % 7 == 0, 0.05, 0.07)
    lost = scene(audit).facts["lost"]
    assert 0 < len(lost) <= 600
    assert all(b[0] > a[1] for a, b in zip(lost, lost[1:]))


def test_packing_gives_the_columns_back():
    audit = fake_audit(1500)
    shown = scene(audit.suggestion.audit(), applied=audit.suggestion, before=audit)
    back = unpacked(*shown.packed())
    for name, values in shown.arrays.items():
        columns = values.reshape(len(values), -1).T
        assert back[name].shape == columns.shape
        np.testing.assert_array_equal(np.isnan(back[name]), np.isnan(columns))
        if name in ("sample", "time_s", "programmed_s"):
            np.testing.assert_array_equal(back[name], columns)
        else:
            np.testing.assert_allclose(back[name], columns, rtol=7e-5, atol=1e-30)
    assert np.isnan(back["sigma_min"]).any()


def test_packing_keeps_infinity():
    audit = fake_audit(50)
    audit.rates.reserve[3] = np.inf
    assert unpacked(*scene(audit).packed())["reserve"][0, 3] == np.inf


def test_times_count_from_the_first_sample_and_a_clocks_date_is_dropped():
    for start, offset in ((3.5, 3.5), (1.7e9, 0.0)):
        audit = fake_audit(200)
        audit.time = audit.time + start
        for finding in audit.finding_list:
            finding.t_start, finding.t_end, finding.worst_t = (t + start for t in (finding.t_start, finding.t_end, finding.worst_t))
        shown = scene(audit)
        assert shown.arrays["time_s"][0] == 0
        assert np.all(np.diff(shown.arrays["time_s"]) > 0)
        assert shown.facts["offset_s"] == offset
        assert all(0 <= f["from_s"] <= f["to_s"] <= 14.0 for f in shown.facts["findings"])


def test_spans_reach_half_way_to_the_neighbours_and_near_ones_are_joined():
    time = np.arange(8.0)
    mask = np.array([1, 0, 0, 1, 0, 1, 0, 0], dtype=bool)
    np.testing.assert_allclose(spans(mask, time, 0.0), [[0, 0.5], [2.5, 3.5], [4.5, 5.5]])
    np.testing.assert_allclose(spans(mask, time, 1.1), [[0, 0.5], [2.5, 5.5]])
    assert spans(np.zeros(8, dtype=bool), time, 0.0).shape == (0, 2)


@pytest.mark.parametrize("value, text", [(198.7717, "198.8"), (0.0132668, "0.01327"), (180.0, "180"), (-0.0, "0"), (123456.0, "123456"), (np.nan, ""),
                                         (np.inf, ""), (None, ""), (2e-12, "0"), (-177.642, "-177.6"), (1200.0, "1200")])
def test_numbers_as_people_write_them(value, text):
    assert significant(value) == text
