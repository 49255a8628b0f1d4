"""The still picture: SVG and PNG."""

import io
import re
from types import SimpleNamespace
from xml.etree import ElementTree

import numpy as np
import pytest
from fake_audit import fake_audit
from PIL import Image

from pathaudit.report.drawn_close import height_of_windows, windows_of
from pathaudit.report.drawn_rows import Places, beyond, height_of, thinned
from pathaudit.report.scene import scene
from pathaudit.report.still import png_picture, shown_sample, svg_picture

SHAPES = [(2, 1), (2000, 6), (400, 12), (60_000, 3)]


@pytest.fixture(scope="module")
def shown():
    return scene(fake_audit(2000))


def words_of(svg):
    return [text.text for text in ElementTree.fromstring(svg).iter("{http://www.w3.org/2000/svg}text")]


@pytest.mark.parametrize("samples, n", SHAPES)
def test_both_pictures_are_whole_for_any_path(samples, n):
    shown = scene(fake_audit(samples, n))
    svg, png = svg_picture(shown), png_picture(shown)
    assert not re.search(r"[ \"l](nan|-?inf)\b", svg)
    assert {f"j{k + 1}" for k in range(n)} <= set(words_of(svg))
    image = Image.open(io.BytesIO(png))
    image.load()
    assert image.size[0] == 1500
    assert len(svg) <= 90_000 and len(png) <= 80_000


def test_the_picture_says_what_is_wrong_in_words_and_patterns(shown):
    svg = svg_picture(shown)
    words = words_of(svg)
    assert "FAIL" in words and "Bracket cell <7>" in words and "1 fail" in words
    assert f"arm at {shown.arrays['time_s'][shown_sample(shown.facts)]:.2f} s" in words
    assert {"warn 0.06", "fail 0.02", "time, s", "process", "air", "findings"} <= set(words)
    assert all(name in svg for name in ('id="fail-', 'id="warn-', 'id="gap-'))


def test_nothing_in_the_svg_runs_or_fetches(shown):
    svg = svg_picture(shown)
    assert "<script" not in svg and "href" not in svg and "<image" not in svg
    assert set(re.findall(r'https?://[^" ]*', svg)) == {"http://www.w3.org/2000/svg"}


def test_the_bitmap_has_the_two_severities_in_different_colours(shown):
    colours = Image.open(io.BytesIO(png_picture(shown))).convert("RGB").getcolors(1 << 20)
    near = lambda wanted: sum(count for count, colour in colours if np.abs(np.subtract(colour, wanted)).max() < 14)      # noqa: E731
    assert near((0xD5, 0x5E, 0)) > 500 and near((0xB9, 0x7F, 0)) > 100 and near((0, 0x72, 0xB2)) > 500
    assert near((255, 255, 255)) > 0.4 * 1500 * 800


def test_an_unreached_place_is_drawn_without_an_arm():
    audit = fake_audit(400)
    audit.finding_list = tuple(f for f in audit.finding_list if f.kind == "unreachable")
    shown = scene(audit)
    assert "not reached: no posture to draw" in words_of(svg_picture(shown))
    png_picture(shown)


def test_an_audit_that_reaches_nothing_is_still_drawn():
    audit = fake_audit(300)
    for values in (audit.joints, audit.rates.speed_share, audit.rates.sigma_min, audit.rates.tool_speed_limit, audit.rates.reserve):
        values[:] = np.nan
    audit.motion.reached[:] = False
    shown = scene(audit)
    assert "not reached" in words_of(svg_picture(shown))
    png_picture(shown)


def test_the_arm_is_shown_where_it_matters_most():
    audit = fake_audit(2000)
    shown = scene(audit)
    first = next(f for f in audit.finding_list if f.severity == "fail")
    assert shown.arrays["sample"][shown_sample(shown.facts)] == first.worst
    audit.finding_list = ()
    assert shown_sample(scene(audit).facts) == 1000


def test_a_line_beyond_its_bound_begins_and_ends_at_the_crossing():
    time, value = np.arange(6.0), np.array([0.0, 2.0, 2.0, 0.0, np.nan, 3.0])
    (t, v), (u, w) = beyond(time, value, 1.0, "above")
    np.testing.assert_allclose(t, [0.5, 1, 2, 2.5])
    np.testing.assert_allclose(v, [1, 2, 2, 1])
    np.testing.assert_allclose(u, [5])
    below = [t for t, _ in beyond(time[:4], value[:4] - 3.0, -2.0, "below")]
    np.testing.assert_allclose(np.concatenate(below), [0, 0.5, 2.5, 3])


def test_thinning_a_line_stays_within_its_tolerance():
    x = np.linspace(0, 600, 5000)
    y = 30 * np.sin(x / 40) + np.where((x > 300) & (x < 301), 25, 0)
    line = thinned(x, y)
    assert len(line) < 400
    assert np.abs(np.interp(x, line[:, 0], line[:, 1]) - y)[(x < 299) | (x > 302)].max() < 0.35
    assert line[:, 1].max() > 30


def test_rows_and_heights():
    places = Places(scene(fake_audit(500)).facts, 650)
    assert all(above.y + above.row["height"] < below.y for above, below in zip(places.lanes, places.lanes[1:]))
    linear, log = {"low": 0.0, "high": 200.0, "height": 50, "log": False}, {"low": 0.01, "high": 1.0, "height": 50, "log": True}
    assert height_of(linear, 10, 0.0) == 60 and height_of(linear, 10, 200.0) == 10 and height_of(linear, 10, 100.0) == 35
    assert height_of(log, 10, 0.1) == pytest.approx(35) and height_of(log, 10, 0.0) == 60


def test_findings_that_overlap_are_stacked():
    facts = scene(fake_audit(2000)).facts
    facts = {**facts, "findings": [{**facts["findings"][0], "from_s": 1.0 + k, "to_s": 6.0 + k, "number": k} for k in range(7)]}
    blocks = Places(facts, 650).blocks
    levels = [level for _, _, _, level in blocks]
    assert levels == [0, 1, 2, 3, 4, 5, 0] or max(levels) == 5


def test_the_title_can_be_left_out():
    shown = scene(fake_audit(100))
    assert "FAIL" in words_of(svg_picture(shown)) and "FAIL" not in words_of(svg_picture(shown, title=False))


def test_the_lanes_of_an_unfolded_joint_are_named_and_marked():
    shown = scene(fake_audit(2000, tight=True))
    words = words_of(svg_picture(shown))
    assert [words.count(word) for word in ("travel", "speed", "accel.", "no acceleration limit is known")] == [2, 2, 2, 1]
    folded = words_of(svg_picture(scene(fake_audit(2000))))
    assert "travel" not in folded and "j2" in folded
    facts, places = shown.facts, Places(shown.facts, 650)
    rows = {f["kind"]: f["row"] for f in facts["findings"]}
    assert {rows["joint travel"], rows["joint acceleration"]} <= {lane.index for lane in places.lanes}


def short_finding(facts, number, start, end, **other):
    return {**facts["findings"][0], "number": number, "severity": "fail", "row": 1, "from_s": start, "to_s": end, **other}


def test_short_fails_are_drawn_large_side_by_side(shown):
    facts, places = shown.facts, Places(shown.facts, 650)
    with_these = lambda *found: windows_of({**facts, "findings": found}, places)      # noqa: E731
    short, near, long = short_finding(facts, 1, 3.0, 3.1), short_finding(facts, 2, 3.05, 3.2, row=2), short_finding(facts, 3, 6.0, 9.0)
    (window,), left_out = with_these(short, near, long)
    assert window.numbers == (1, 2) and window.lanes == (1, 2) and left_out == 0
    assert window.start < 3.0 and window.end > 3.2 and window.duration < 1.0
    window = windows_of({**facts, "findings": [short_finding(facts, 1, 0.0, 0.01)]}, places)[0][0]
    assert window.start == 0.0 and window.end > 0.01
    assert with_these(long)[0] == with_these({**short, "severity": "warn"})[0] == with_these({**short, "row": -1})[0] == ()
    many = [short_finding(facts, k, k, k + 0.02) for k in range(1, 8)]
    windows, left_out = with_these(*many)
    assert len(windows) == 3 and left_out == 4 and height_of_windows(windows) > 0 == height_of_windows(())


def test_a_magnified_peak_is_as_high_as_in_the_rows_and_says_which_finding_it_is():
    audit = fake_audit(4000, duration=80.0)
    audit.rates.speed_share[1000:1005, 2] = 0.5, 1.2, 1.5, 1.2, 0.5
    audit.finding_list = (SimpleNamespace(**{**vars(audit.finding_list[0]), "kind": "joint speed", "joint": "j3", "severity": "fail", "first": 1001, "last": 1003,
                                             "worst": 1002, "t_start": audit.time[1001], "t_end": audit.time[1003]}),)
    shown = scene(audit)
    svg = svg_picture(shown)
    words = words_of(svg)
    assert "finding 1 magnified" in words and words.count("j3 speed") == 1 and words.count("time, s") == 2
    assert len(words_of(svg_picture(scene(fake_audit(400, gap=False, n=2))))) < len(words)
    assert Image.open(io.BytesIO(png_picture(shown))).size[1] > Image.open(io.BytesIO(png_picture(scene(fake_audit(400, n=2))))).size[1]


def test_notes_are_flags_on_the_strip(shown):
    note = lambda sample, settled=False, stale="": SimpleNamespace(sample=sample, stale=stale, note=SimpleNamespace(status=SimpleNamespace(settled=settled)))      # noqa: E731
    words = words_of(svg_picture(shown, notes=[note(100), note(104, settled=True), note(1999, stale="moved")]))
    assert "notes" in words and {"1", "2", "3?"} <= set(words)
    assert "notes" not in words_of(svg_picture(shown))
    crowd = svg_picture(shown, notes=[note(1990)] * 40)
    flags = [float(x) for x in re.findall(r'<rect x="([\d.]+)" y="[\d.]+" width="16.0" height="13.0"', crowd)]
    assert len(flags) == 40 and min(np.diff(flags)) > 10 and max(flags) <= 650 - 10 - 16
    png_picture(shown, notes=[note(1990)] * 40)


def test_before_and_after_are_drawn_together():
    audit = fake_audit(2000)
    alone = scene(audit.suggestion.audit(), applied=audit.suggestion)
    both = scene(audit.suggestion.audit(), applied=audit.suggestion, before=audit)
    dotted = 'stroke-dasharray="1.5 2.5"'
    assert svg_picture(alone).count(dotted) == 0 < svg_picture(both).count(dotted)
    assert any("dotted: as programmed" in words for words in words_of(svg_picture(both)))


def test_words_too_long_for_their_place_are_shortened():
    audit = fake_audit(200)
    audit.cell.name = "A cell with a very long name " * 8
    audit.cell.arm.joint_names = ("shoulder_lift_joint_of_the_left_arm", *audit.cell.arm.joint_names[1:])
    words = words_of(svg_picture(scene(audit)))
    assert any(word.startswith("A cell with") and word.endswith("..") and len(word) < 120 for word in words)
    assert any(word.startswith("shoulder_") and word.endswith("..") and len(word) < 16 for word in words)


def test_the_still_outputs_stay_small_with_everything_drawn():
    audit = fake_audit(2000, n=12, tight=True)
    shown = scene(audit.suggestion.audit(), applied=audit.suggestion, before=audit)
    for group in shown.facts["groups"]:
        group["folded"] = False
    assert len(svg_picture(shown)) + len(png_picture(shown)) * 4 / 3 <= 170_000
