"""The one-page report in a real browser, opened from a file: keys, mouse, numbers, pixels, and with scripts off."""

import base64
import json

import numpy as np
import pytest
from fake_audit import fake_audit

from pathaudit.report.page import one_page
from pathaudit.report.scene import Scene, scene
from pathaudit.report.script import joined_modules, style_sheet


@pytest.fixture(scope="module")
def audit():
    return fake_audit(2000)


@pytest.fixture
def opened(watched, tmp_path):
    """Open an audit's page; gives the browser's page once the timeline is painted."""

    def make(audit, **options):
        file = tmp_path / "audit.html"
        file.write_text(one_page(audit), encoding="utf-8")
        page = watched(**options).page
        page.goto(file.as_uri())
        if options.get("java_script_enabled", True):
            page.wait_for_selector(".pa[data-painted]", timeout=10000)
        return page

    return make


def cursor(page):
    """The kept sample that the painted picture stands at, once all painting is done."""
    return page.evaluate("() => new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(() => "
                         "done(Number(document.querySelector('.pa').dataset.cursor)))))")


def readout(page):
    cursor(page)
    return page.locator(".pa-read b").all_inner_texts()


def pixels(page, selector):
    """A fingerprint of a canvas."""
    cursor(page)
    return page.locator(selector).evaluate("(canvas) => canvas.toDataURL()")


def test_the_columns_arrive_as_they_were_sent(watched, audit):
    shown = scene(audit)
    block, layout = shown.packed()
    page = watched().page
    page.set_content("<p>empty</p>")
    page.add_script_tag(type="module", content=joined_modules() + "\nwindow.unpack = unpack;")
    page.wait_for_function("() => Boolean(window.unpack)")
    back = page.evaluate("""async ([text, layout]) => {
        const data = await unpack(Uint8Array.from(atob(text), (c) => c.charCodeAt(0)), layout);
        return Object.fromEntries(Object.entries(data).map(([name, columns]) => [name, columns.map((c) => Array.from(c, (v) => Number.isFinite(v) ? v : null))]));
    }""", [base64.b64encode(block).decode(), layout])
    for name, values in shown.arrays.items():
        columns = values.reshape(len(values), -1).T
        got = np.array(back[name], dtype=float)
        np.testing.assert_allclose(got, np.where(np.isfinite(columns), columns, np.nan), rtol=7e-5, atol=1e-30)


def test_the_first_look_is_at_the_first_failure(opened, audit):
    page = opened(audit)
    first = next(f for f in audit.finding_list if f.severity == "fail")
    assert cursor(page) == first.worst
    assert f"{first.kind}" in page.locator(".pa-where b").inner_text()


def test_keys_move_the_cursor(opened, audit):
    page = opened(audit)
    page.locator(".pa-rows").focus()
    last = audit.path.samples - 1
    worsts = sorted(f.worst for f in audit.finding_list)
    for key, expected in [("Home", 0), ("ArrowLeft", 0), ("ArrowRight", 1), ("Shift+ArrowRight", 41), ("ArrowLeft", 40), ("Shift+ArrowLeft", 0),
                          ("PageUp", 200), ("PageDown", 0), ("End", last), ("ArrowRight", last), ("Home", 0), ("n", worsts[0]), ("n", worsts[1]),
                          ("p", worsts[0]), ("p", worsts[0]), ("End", last), ("Shift+P", worsts[-1])]:
        page.keyboard.press(key)
        assert cursor(page) == expected, key


def test_the_readout_says_what_the_audit_holds(opened, audit):
    page = opened(audit)
    page.locator(".pa-rows").focus()
    page.keyboard.press("Home")
    for _ in range(24):
        page.keyboard.press("Shift+ArrowRight")
    i = cursor(page)
    worst = int(np.argmax(audit.rates.speed_share[i]))
    speed = 1e3 * audit.rates.tool_speed[i]
    assert readout(page)[:7] == [
        f"{audit.time[i]:.3f}", f"{1e3 * audit.path.distance[i]:.1f}", f"{speed:.1f}", f"{audit.suggestion.factor[i] * speed:.1f}",
        f"j{worst + 1} {100 * audit.rates.speed_share[i, worst]:.0f} %", f"{audit.rates.reserve[i]:.2f}", f"{audit.rates.sigma_min[i]:.3f}"]
    slider = page.locator(".pa-rows")
    assert slider.get_attribute("role") == "slider" and float(slider.get_attribute("aria-valuenow")) == pytest.approx(audit.time[i], abs=1e-3)
    assert f"{audit.time[i]:.3f} seconds" in slider.get_attribute("aria-valuetext")


def test_the_lines_of_the_path_s_own_file_stand_with_the_findings_and_at_the_cursor(opened):
    """Seven samples a line, below a head of eleven lines; without lines nothing is said of them."""
    known, unknown = fake_audit(2000), fake_audit(2000)
    known.path.source_line, known.path.file = 12 + np.arange(2000) // 7, "folder/seam.nc"
    page = opened(known)
    for row, finding in zip(page.locator(".pa-findings tbody tr").all(), known.finding_list, strict=True):
        first, last, worst = (12 + sample // 7 for sample in (finding.first, finding.last, finding.worst))
        assert row.inner_text().endswith(f"{finding.why} Lines {first} to {last} of seam.nc, the worst in line {worst}.")
        row.click()
        assert cursor(page) == finding.worst and page.locator(".pa-where b").inner_text().startswith(f"line {worst} · ")
        assert f", line {worst}, " in page.locator(".pa-rows").get_attribute("aria-valuetext")
    page = opened(unknown)
    assert "line" not in page.locator(".pa-where b").inner_text() and "of seam" not in page.locator(".pa-findings").inner_text()


def test_an_unreached_place_has_no_numbers_and_no_arm(opened, audit):
    page = opened(audit)
    finding = next(k for k, f in enumerate(audit.finding_list) if f.kind == "unreachable")
    with_arm = pixels(page, ".pa-arm canvas:nth-child(2)")
    page.locator(".pa-findings tbody tr").nth(finding).click()
    values = readout(page)
    assert values[4:7] == ["–", "–", "–"] and float(values[0]) > 0
    assert pixels(page, ".pa-arm canvas:nth-child(2)") != with_arm


def test_the_mouse_drags_the_cursor(opened, audit):
    page = opened(audit)
    box = page.locator(".pa-rows").bounding_box()
    seen = []
    page.mouse.move(box["x"] + 0.3 * box["width"], box["y"] + 0.6 * box["height"])
    page.mouse.down()
    for share in (0.3, 0.4, 0.55, 0.7):
        page.mouse.move(box["x"] + share * box["width"], box["y"] + 0.6 * box["height"], steps=3)
        seen.append(cursor(page))
    page.mouse.up()
    assert seen == sorted(set(seen)) and seen[-1] - seen[0] > 600
    page.mouse.move(box["x"] + 0.2 * box["width"], box["y"] + 0.6 * box["height"], steps=3)
    assert cursor(page) == seen[-1]
    page.mouse.move(box["x"] + 0.5 * box["width"], box["y"] + 0.6 * box["height"])
    page.mouse.down()
    page.mouse.move(box["x"] + 3 * box["width"], box["y"] + 0.6 * box["height"], steps=3)
    assert cursor(page) == audit.path.samples - 1
    page.mouse.up()


def test_a_click_on_a_finding_goes_there_and_selects_it(opened, audit):
    page = opened(audit)
    rows = page.locator(".pa-findings tbody tr")
    assert rows.count() == len(audit.finding_list)
    for k, finding in enumerate(audit.finding_list):
        rows.nth(k).click()
        assert cursor(page) == finding.worst
        assert [row.get_attribute("aria-selected") for row in rows.all()] == ["true" if j == k else "false" for j in range(rows.count())]
        assert finding.why in rows.nth(k).inner_text()
    rows.nth(0).focus()
    page.keyboard.press("Enter")
    assert cursor(page) == audit.finding_list[0].worst


def test_the_numbers_do_not_jump_while_scrubbing(opened, audit):
    page = opened(audit)
    places = "() => [...document.querySelectorAll('.pa-read b, .pa-read span, .pa-rows, .pa-findings')].map((e) => { const b = e.getBoundingClientRect(); return [b.left, b.top, 0]; })"
    page.locator(".pa-rows").focus()
    seen = set()
    for key in ("Home", "n", "n", "n", "End", "PageDown"):
        page.keyboard.press(key)
        cursor(page)
        boxes = page.evaluate(places)
        seen.add(json.dumps([box[:2] for k, box in enumerate(boxes)]))
    # only the unit behind a number moves with the number's own width
    lefts = [np.array(json.loads(one)) for one in seen]
    assert all(np.array_equal(lefts[0][:, 1], other[:, 1]) for other in lefts)


def placed(page):
    """Where things stand in the rows: the span on the axis, the plot's left edge and width, lanes as [row, top, height], the process bar, flags."""
    cursor(page)
    return json.loads(page.locator(".pa").get_attribute("data-place"))


def span(page):
    return placed(page)["span"]


def marked(page):
    """First and last sample of the marked stretch, or []."""
    cursor(page)
    return [int(word) for word in page.locator(".pa").get_attribute("data-marked").split()]


def point(page, value, y):
    """Where a place on the axis is on the screen, y px below the top of the rows."""
    box, place = page.locator(".pa-rows").bounding_box(), placed(page)
    low, high = place["span"]
    return box["x"] + place["left"] + place["plot"] * (value - low) / (high - low), box["y"] + y


def drag(page, start, end):
    page.mouse.move(*start)
    page.mouse.down()
    page.mouse.move(*end, steps=4)
    page.mouse.up()


def test_zoom_keeps_the_cursor_in_sight(opened, audit):
    page = opened(audit)
    whole = page.get_by_role("button", name="Show the whole path")
    assert whole.is_disabled() and span(page) == pytest.approx([0.0, 14.0])
    page.locator(".pa-rows").focus()
    for key in ("Home", *["PageUp"] * 4, "+", "+"):
        page.keyboard.press(key)
    place = float(readout(page)[0])
    assert page.get_by_role("button", name="Show the whole path").is_enabled()
    low, high = span(page)
    assert high - low == pytest.approx(3.5, abs=0.02) and (place - low) / (high - low) == pytest.approx(place / 14.0, abs=0.01)
    page.keyboard.press("End")
    low, high = span(page)
    assert high == pytest.approx(14.0, abs=0.01) and high - low == pytest.approx(3.5, abs=0.02)
    page.keyboard.press("-")
    low, high = span(page)
    assert high - low == pytest.approx(7.0, abs=0.02)
    whole.click()
    assert span(page) == pytest.approx([0.0, 14.0]) and whole.is_disabled()
    for _ in range(20):
        page.locator(".pa-rows").press("+")
    assert span(page)[0] <= span(page)[1]


def test_a_short_finding_is_shown_large(opened):
    audit = fake_audit(4000, duration=80.0)
    short = audit.finding_list[0]
    short.first, short.last, short.worst, short.t_start, short.t_end = 1000, 1004, 1002, audit.time[1000], audit.time[1004]
    page = opened(audit)
    page.locator(".pa-findings tbody tr").nth(0).click()
    assert cursor(page) == 1002
    low, high = span(page)
    assert low < short.t_start < short.t_end < high and 5 * (short.t_end - short.t_start) < high - low < 20 * (short.t_end - short.t_start)


def test_the_rows_end_where_they_say(opened, audit):
    page = opened(audit)
    page.locator(".pa-rows").focus()
    page.keyboard.press("+")
    for end in span(page):
        page.mouse.click(*point(page, end, 300))
        assert float(readout(page)[0]) == pytest.approx(end, abs=0.01)


def press(page, *keys):
    page.locator(".pa-rows").focus()
    for key in keys:
        page.keyboard.press(key)


def lanes(page):
    return [row for row, _, _ in placed(page)["lanes"]]


FOLDED = [*range(9)]


@pytest.fixture(scope="module")
def tight():
    return fake_audit(2000, tight=True)


def test_a_joint_with_a_hidden_finding_is_unfolded_at_first(opened, tight):
    page = opened(tight)
    assert lanes(page) == [0, 10, 1, 16, 2, 3, 13, 4, 19, 5, 6, 7, 8]
    press(page, "u")
    assert lanes(page) == FOLDED
    press(page, "u")
    assert lanes(page) == [row for j in range(6) for row in (9 + j, j, 15 + j)] + [6, 7, 8]


def test_a_click_on_a_joints_name_folds_it(opened, tight):
    page = opened(tight)
    box = page.locator(".pa-rows").bounding_box()
    at = {row: y + height / 2 for row, y, height in placed(page)["lanes"]}
    where = cursor(page)
    page.mouse.click(box["x"] + 20, box["y"] + at[1])
    assert lanes(page) == [0, 1, 2, 3, 13, 4, 19, 5, 6, 7, 8]
    page.mouse.click(box["x"] + 20, box["y"] + at[0])
    assert lanes(page)[:4] == [9, 0, 15, 1] and cursor(page) == where


def lane_pixels(page, row):
    """The colours of a lane in the base picture."""
    place = placed(page)
    y, height = next((y, height) for index, y, height in place["lanes"] if index == row)
    return page.locator(".pa-rows canvas").first.evaluate("(canvas, box) => Array.from(canvas.getContext('2d').getImageData(...box).data).join()",
                                                          [place["left"] + 1, y, place["plot"] - 2, height])


def test_a_folded_lane_still_shows_the_findings_of_those_behind_it(opened):
    audit = fake_audit(2000, tight=True, gap=False)
    page = opened(audit)
    press(page, "u")
    assert lanes(page) == FOLDED
    marked, clean = lane_pixels(page, 1), lane_pixels(page, 0)
    audit.finding_list = tuple(f for f in audit.finding_list if f.kind not in ("joint travel", "joint acceleration"))
    page = opened(audit)
    assert lane_pixels(page, 1) != marked and lane_pixels(page, 0) == clean


def test_rows_are_chosen_ordered_and_folded_by_keyboard(opened, tight):
    page = opened(tight)
    press(page, "r")
    box = page.get_by_role("dialog", name="Which rows are shown")
    assert box.is_visible() and box.get_by_label("j1", exact=True).evaluate("(e) => e === document.activeElement")
    page.keyboard.press("Space")
    assert lanes(page)[0] == 10 and box.is_visible()
    page.keyboard.press("Space")
    assert lanes(page)[0] == 0
    for name, expected in (("Unfold j1", [9, 0, 15]), ("Fold j1", [0, 10, 1]), ("Move j1 down", [10, 1, 16, 0]), ("Move j1 up", [0, 10, 1])):
        box.get_by_role("button", name=name).focus()
        page.keyboard.press("Enter")
        assert lanes(page)[:len(expected)] == expected and box.is_visible(), name
    assert box.get_by_label("j1", exact=True).evaluate("(e) => e === document.activeElement")      # where the pressed button cannot be pressed again
    box.get_by_role("button", name="Move factor up").press("Enter")
    assert lanes(page)[-2:] == [8, 7]
    for name in ("tool speed", "sigma_min", "j3"):
        box.get_by_label(name, exact=True).uncheck()
    assert set(FOLDED) - set(lanes(page)) == {2, 6, 7}
    box.get_by_role("button", name="Show all rows in the first order").press("Enter")
    assert lanes(page) == [0, 10, 1, 16, 2, 3, 13, 4, 19, 5, 6, 7, 8]
    for box_of in [f"j{k}" for k in range(1, 7)] + ["sigma_min", "tool speed", "factor"]:
        box.get_by_label(box_of, exact=True).uncheck()
    assert lanes(page) == []
    page.keyboard.press("Escape")
    assert box.is_hidden() and page.locator(".pa-rows").evaluate("(e) => e === document.activeElement")


def test_the_help_lists_the_keys_and_gives_the_focus_back(opened, audit):
    page = opened(audit)
    press(page, "?")
    box = page.get_by_role("dialog", name="All keys")
    assert box.is_visible() and "next finding" in box.inner_text() and box.locator("tr").count() >= 20
    page.keyboard.press("Escape")
    assert box.is_hidden() and page.locator(".pa-rows").evaluate("(e) => e === document.activeElement")
    page.get_by_role("button", name="All keys").click()
    assert box.is_visible()
    page.mouse.click(5, 5)
    assert box.is_hidden()


def test_the_distance_axis_gives_dwells_no_width(opened):
    audit = fake_audit(2000)
    still = slice(800, 1200)
    audit.path.distance[still] = audit.path.distance[800]
    audit.path.distance[1200:] -= audit.path.distance[1200] - audit.path.distance[800]
    page = opened(audit)
    press(page, "d")
    total = 1e3 * audit.path.distance[-1]
    assert span(page) == pytest.approx([0, total], rel=1e-4)
    assert page.get_by_role("button", name="Rows over distance").get_attribute("aria-pressed") == "true"
    seen = []
    for share in (0.1, 0.5, 0.9):
        page.mouse.click(*point(page, share * total, 300))
        seen.append(float(readout(page)[1]))
    assert seen == pytest.approx([0.1 * total, 0.5 * total, 0.9 * total], abs=0.01 * total)
    press(page, "+", "+")
    low, high = span(page)
    place = float(readout(page)[1])
    assert high - low == pytest.approx(total / 4, rel=1e-3) and low <= place <= high
    press(page, "d")
    times = span(page)
    distance = 1e3 * audit.path.distance
    assert np.interp(times, audit.time, distance) == pytest.approx([low, high], abs=0.01 * total)
    press(page, "0", "d", "Home", *["PageUp"] * 4)
    first = cursor(page)
    press(page, "ArrowRight")
    assert cursor(page) == first + 1 and float(readout(page)[0]) > 0      # inside a dwell the keys still step


def test_a_stretch_is_marked_by_dragging_with_shift_and_its_ends_move(opened, audit):
    page = opened(audit)
    where = cursor(page)
    page.keyboard.down("Shift")
    drag(page, point(page, 9.0, 300), point(page, 5.0, 300))
    page.keyboard.up("Shift")
    first, last = marked(page)
    assert audit.time[[first, last]] == pytest.approx([5.0, 9.0], abs=0.05) and cursor(page) == where
    assert f"marked: {audit.time[last] - audit.time[first]:.2f} s, {1e3 * (audit.path.distance[last] - audit.path.distance[first]):.1f} mm" \
        in page.locator(".pa-rows").get_attribute("aria-valuetext")
    drag(page, point(page, audit.time[last], 300), point(page, 11.0, 320))
    assert marked(page)[0] == first and audit.time[marked(page)[1]] == pytest.approx(11.0, abs=0.05)
    drag(page, point(page, audit.time[first], 300), point(page, 13.0, 320))      # no further than the other end
    assert marked(page) == [marked(page)[1]] * 2
    press(page, "Escape")
    assert marked(page) == []
    drag(page, point(page, 9.0, 300), point(page, 5.0, 300))
    assert marked(page) == [] and float(readout(page)[0]) == pytest.approx(5.0, abs=0.05)


def test_the_marking_button_makes_dragging_mark(opened, audit):
    page = opened(audit)
    page.get_by_role("button", name="Dragging in the rows marks").click()
    drag(page, point(page, 2.0, 300), point(page, 3.0, 300))
    assert audit.time[marked(page)] == pytest.approx([2.0, 3.0], abs=0.05)
    page.mouse.click(*point(page, 8.0, 300))
    assert float(readout(page)[0]) == pytest.approx(8.0, abs=0.05) and len(marked(page)) == 2      # a press without a drag is a place
    page.get_by_role("button", name="Unmark the stretch").click()
    assert marked(page) == [] and page.get_by_role("button", name="Unmark the stretch").is_disabled()
    press(page, "m")
    drag(page, point(page, 2.0, 300), point(page, 3.0, 300))
    assert marked(page) == []


def test_keys_mark_a_stretch(opened, audit):
    page = opened(audit)
    press(page, "Home", "PageUp", "[")
    assert marked(page) == [200, 200]
    press(page, "PageUp", "]")
    assert marked(page) == [200, 400]
    press(page, "PageUp", "[")
    assert marked(page) == [600, 600]
    press(page, "PageDown", "PageDown", "]")
    assert marked(page) == [200, 200]
    finding = next(f for f in audit.finding_list if f.kind == "joint speed")
    page.locator(".pa-findings tbody tr").nth(audit.finding_list.index(finding)).click()
    press(page, "s")
    assert marked(page) == [finding.first, finding.last]
    press(page, "0", "f")
    low, high = span(page)
    assert low < finding.t_start < finding.t_end < high and high - low < 14 / 3
    press(page, "Escape")
    assert marked(page) == []


def test_the_wheel_is_the_pages_until_the_timeline_has_the_focus(opened, audit):
    page = opened(audit, height=500)
    page.mouse.move(*point(page, 4.0, 200))
    page.mouse.wheel(0, 100)
    page.wait_for_function("() => scrollY > 50")
    assert span(page) == pytest.approx([0, 14])
    page.evaluate("scrollTo(0, 0)")
    press(page, "Home")
    page.mouse.move(*point(page, 4.0, 200))
    scrolled = page.evaluate("scrollY")
    page.mouse.wheel(0, -300)
    page.wait_for_function("() => JSON.parse(document.querySelector('.pa').dataset.place).span[0] > 0")
    low, high = span(page)
    assert high - low == pytest.approx(14 * 1.002 ** -300, rel=1e-3) and (4 - low) / (high - low) == pytest.approx(4 / 14, abs=0.02)
    assert page.evaluate("scrollY") == scrolled
    page.mouse.wheel(60, 0)
    page.wait_for_function("(low) => JSON.parse(document.querySelector('.pa').dataset.place).span[0] > low", arg=low)
    moved, end = span(page)
    assert end - moved == pytest.approx(high - low)


def test_a_pinch_zooms_without_the_focus(opened, audit):
    page = opened(audit)
    x, y = point(page, 7.0, 300)
    page.locator(".pa-rows").dispatch_event("wheel", {"deltaY": -200, "ctrlKey": True, "clientX": x, "clientY": y, "bubbles": True, "cancelable": True})
    low, high = span(page)
    assert high - low == pytest.approx(14 * 1.002 ** -200, rel=1e-3)
    page.evaluate("""([x, y]) => {
        const rows = document.querySelector('.pa-rows');
        rows.setPointerCapture = () => {}; rows.hasPointerCapture = () => true;
        const send = (type, pointerId, clientX) => rows.dispatchEvent(new PointerEvent(type, { pointerId, clientX, clientY: y, buttons: 1, bubbles: true }));
        send('pointerdown', 7, x - 50); send('pointerdown', 8, x + 50); send('pointermove', 7, x - 100); send('pointermove', 8, x + 100);
        send('pointerup', 7, x); send('pointerup', 8, x);
    }""", [x, y])
    closer = span(page)
    assert closer[1] - closer[0] == pytest.approx((high - low) / 2, rel=1e-3)


def test_the_window_on_the_strip_slides_the_rows(opened, audit):
    page = opened(audit)
    press(page, "Home", "+", "+")
    assert span(page) == pytest.approx([0, 3.5], abs=0.01)
    box, place = page.locator(".pa-rows").bounding_box(), placed(page)
    on_strip = lambda time: (box["x"] + place["left"] + place["plot"] * time / 14, box["y"] + place["process"])      # noqa: E731
    drag(page, on_strip(1.0), on_strip(6.0))
    assert span(page) == pytest.approx([5.0, 8.5], abs=0.05) and cursor(page) == 0
    page.mouse.click(*on_strip(6.0))
    assert float(readout(page)[0]) == pytest.approx(6.0, abs=0.05)
    press(page, ".")
    assert span(page) == pytest.approx([5.875, 9.375], abs=0.05)
    press(page, ",", ",")
    assert span(page) == pytest.approx([4.125, 7.625], abs=0.05)
    page.mouse.click(*on_strip(12.0))
    low, high = span(page)
    assert float(readout(page)[0]) == pytest.approx(12.0, abs=0.05) and low < 12 < high


def listed(page):
    return [int(row.split("\t")[0]) for row in page.locator(".pa-findings tbody tr").all_inner_texts()]


def test_the_findings_are_sorted_and_filtered(opened, tight):
    page = opened(tight)
    found = {k: f for k, f in enumerate(tight.finding_list, 1)}
    heads = page.locator(".pa-findings th")
    assert listed(page) == list(found) and heads.nth(0).get_attribute("aria-sort") == "ascending"
    heads.nth(3).get_by_role("button").click()
    assert [found[k].t_start for k in listed(page)] == sorted(f.t_start for f in found.values())
    heads.nth(1).get_by_role("button").focus()
    page.keyboard.press("Enter")
    assert [found[k].severity for k in listed(page)] == sorted(f.severity for f in found.values())
    page.keyboard.press("Enter")
    assert heads.nth(1).get_attribute("aria-sort") == "descending" and heads.nth(3).get_attribute("aria-sort") == "none"
    assert [found[k].severity for k in listed(page)] == sorted((f.severity for f in found.values()), reverse=True)
    heads.nth(2).get_by_role("button").click()
    assert [f"{found[k].kind} {found[k].joint or ''}" for k in listed(page)] == sorted(f"{f.kind} {f.joint or ''}" for f in found.values())
    page.get_by_label("Which findings are listed").select_option("warn")
    assert [found[k].severity for k in listed(page)] == ["warn"] * len(listed(page)) and 0 < len(listed(page)) < len(found)
    page.get_by_label("Which findings are listed").select_option("all")
    page.get_by_label("List only findings with these words").fill("TRAVEL")
    assert [found[k].kind for k in listed(page)] == ["joint travel"] and f"1 of {len(found)}" in page.locator(".pa-filter").inner_text()
    (k,) = listed(page)
    page.locator(".pa-findings tbody tr").press("Enter")
    assert cursor(page) == found[k].worst
    page.get_by_label("List only findings with these words").fill("no such words")
    assert "No finding is like this." in page.locator(".pa-findings").inner_text()


def test_arrows_walk_through_the_findings(opened, tight):
    page = opened(tight)
    rows = page.locator(".pa-findings tbody tr")
    rows.nth(0).focus()
    for _ in range(2):
        page.keyboard.press("ArrowDown")
    page.keyboard.press("Space")
    assert cursor(page) == tight.finding_list[2].worst and rows.nth(2).get_attribute("aria-selected") == "true"
    page.keyboard.press("ArrowUp")
    page.keyboard.press("Enter")
    assert cursor(page) == tight.finding_list[1].worst


def test_going_to_a_finding_fits_it(opened, tight):
    page = opened(tight)
    k = next(k for k, f in enumerate(tight.finding_list) if f.kind == "near-singular")
    f = tight.finding_list[k]
    page.locator(".pa-findings tbody tr").nth(k).click()
    low, high = span(page)
    assert low < f.t_start < f.t_end < high and high - low == pytest.approx(1.6 * (f.t_end - f.t_start), rel=0.02)


def test_what_the_tool_can_hardly_do_is_said_where_it_is_lost(opened, audit):
    page = opened(audit)
    page.locator(".pa-findings tbody tr").nth(next(k for k, f in enumerate(audit.finding_list) if f.kind == "near-singular")).click()
    cursor(page)
    assert page.locator(".pa-lost b").inner_text().startswith("can hardly ")
    assert "the tool can hardly " in page.locator(".pa-rows").get_attribute("aria-valuetext")
    audit_good = fake_audit(500, n=12)
    page = opened(audit_good)
    assert page.locator(".pa-lost b").inner_text() == "none"


def test_the_arm_turns_and_comes_back(opened, audit):
    page = opened(audit)
    stage = ".pa-arm canvas:nth-child(1)"
    first = pixels(page, stage)
    box = page.locator(".pa-arm").bounding_box()
    page.mouse.move(box["x"] + 100, box["y"] + 100)
    page.mouse.down()
    page.mouse.move(box["x"] + 160, box["y"] + 120, steps=4)
    page.mouse.up()
    dragged = pixels(page, stage)
    assert dragged != first
    page.locator(".pa-arm").focus()
    page.keyboard.press("ArrowLeft")
    assert pixels(page, stage) != dragged
    page.keyboard.press("4")
    assert pixels(page, stage) == first


def test_pictures_follow_the_width(opened, audit):
    page = opened(audit, width=1300)
    for width, narrow in ((1300, False), (820, False), (620, True), (1100, False)):
        page.set_viewport_size({"width": width, "height": 900})
        page.wait_for_function("(narrow) => document.querySelector('.pa').classList.contains('pa-narrow') === narrow", arg=narrow)
        cursor(page)
        overflow = page.evaluate("() => { const root = document.querySelector('.pa').getBoundingClientRect();"
                                 " return Math.max(...[...document.querySelectorAll('.pa-rows, .pa-arm, .pa-read > div, .pa-head *')]"
                                 ".map((e) => e.getBoundingClientRect().right)) - root.right; }")
        assert overflow <= 0.5, width
        assert page.evaluate("document.documentElement.scrollWidth <= innerWidth + 1") or width < 700


def luminance(colour):
    """Relative luminance of "rgb(r g b)" or "#rrggbb" (WCAG 2.2)."""
    channels = [int(colour[k:k + 2], 16) for k in (1, 3, 5)] if colour.startswith("#") else [float(v) for v in colour[4:-1].split()]
    linear = [v / 255 / 12.92 if v <= 10 else ((v / 255 + 0.055) / 1.055) ** 2.4 for v in channels]
    return float(np.dot([0.2126, 0.7152, 0.0722], linear))


def contrast(one, other):
    low, high = sorted((luminance(one), luminance(other)))
    return (high + 0.05) / (low + 0.05)


@pytest.mark.parametrize("ground, ink", [("#fff", "#1b1f24"), ("#fff", "rgba(0, 0, 0, 0.87)"), ("#111", "#fff"), ("#111", "rgba(255, 255, 255, 0.87)")])
def test_words_and_lines_stand_out_in_light_and_dark(watched, ground, ink):
    page = watched().page
    page.set_content(f"<style>{style_sheet()}</style><div class='pa' style='--pa-ground: {ground}; --pa-ink: {ink}'><button>one</button></div>")
    page.add_script_tag(type="module", content=joined_modules() + "\nwindow.theme = theme;")
    page.wait_for_function("() => Boolean(window.theme)")
    colours = page.evaluate("window.theme(document.querySelector('.pa'))")
    for place in ("ground", "lane"):
        assert all(contrast(colours[name], colours[place]) >= 4.5 for name in ("ink", "soft")), place
        assert all(contrast(colours[name], colours[place]) >= 3 for name in ("line", "warn", "fail")), place


@pytest.mark.parametrize("width", [900, 1800])
def test_nothing_overlaps_or_is_cut(opened, tight, width):
    page = opened(tight, width=width)
    press(page, "n", "s")
    cursor(page)
    cut = page.evaluate("() => [...document.querySelectorAll('.pa-head *, .pa-read *, .pa-tools button, .pa-findings td, .pa-findings th, .pa-filter > *')]"
                        ".filter((e) => e.offsetParent && e.scrollWidth > e.clientWidth + 1 && getComputedStyle(e).display !== 'inline').map((e) => e.outerHTML.slice(0, 90))")
    assert cut == []
    boxes = page.evaluate("() => ['.pa-head', '.pa-read', '.pa-tools', '.pa-rows', '.pa-arm-pane', '.pa-filter', '.pa-list'].map((name) => {"
                          " const b = document.querySelector(name).getBoundingClientRect(); return [name, b.left, b.top, b.right, b.bottom]; })")
    over = lambda a, b: a[1] < b[3] - 0.5 and b[1] < a[3] - 0.5 and a[2] < b[4] - 0.5 and b[2] < a[4] - 0.5      # noqa: E731
    assert [(a[0], b[0]) for k, a in enumerate(boxes) for b in boxes[:k] if over(a, b)] == []
    buttons = page.evaluate("() => [...document.querySelectorAll('.pa-tools button')].filter((e) => e.offsetParent).map((e) => {"
                            " const b = e.getBoundingClientRect(); return [e.textContent, b.left, b.top, b.right, b.bottom]; })")
    assert [(a[0], b[0]) for k, a in enumerate(buttons) for b in buttons[:k] if over(a, b)] == [] and len(buttons) >= 9


@pytest.mark.parametrize("n, most", [(2, 620), (7, 620), (12, 620)])
def test_the_folded_rows_stay_low(opened, n, most):
    audit = fake_audit(600, n)
    audit.finding_list = ()
    page = opened(audit)
    assert page.locator(".pa-rows").bounding_box()["height"] <= most


@pytest.mark.parametrize("samples, n", [(2, 1), (2, 12), (1500, 12), (30_000, 6)])
def test_any_path_is_drawn(opened, samples, n):
    audit = fake_audit(samples, n)
    page = opened(audit)
    page.locator(".pa-rows").focus()
    page.keyboard.press("End")
    assert float(readout(page)[0]) == pytest.approx(audit.time[-1], abs=2e-3)
    page.keyboard.press("Home")
    assert float(readout(page)[0]) == 0.0


def test_nothing_to_draw_is_drawn_too(opened):
    audit = fake_audit(300)
    audit.finding_list, audit.verdict = (), "pass"
    for values in (audit.joints, audit.rates.speed_share, audit.rates.sigma_min, audit.rates.tool_speed_limit, audit.rates.reserve):
        values[:] = np.nan
    audit.motion.reached[:] = False
    page = opened(audit)
    assert readout(page)[4:] == ["–", "–", "–", "no finding", "none"]
    page.keyboard.press("n")
    assert "No findings." in page.locator(".pa-findings").inner_text()


def packed(shown):
    """A Scene as a page takes it: facts and the block as text."""
    block, layout = shown.packed()
    return {"facts": {**shown.facts, "layout": layout}, "text": base64.b64encode(block).decode()}


@pytest.fixture
def stage(watched, audit):
    """An empty page with the modules loaded, a stub model and window.start(place): what any host of the timeline does."""
    page = watched().page
    page.set_content(f"<style>{style_sheet()}</style><div id='one'></div><div id='two'></div>")
    page.evaluate("(first) => { window.first = first; }", packed(scene(audit)))
    page.add_script_tag(type="module", content=joined_modules() + """
        const given = ({ facts, text }) => ({ facts, block: Uint8Array.from(atob(text), (c) => c.charCodeAt(0)) });
        const held = { ...given(window.first), status: "", cursor: 0 };
        window.listeners = [];
        window.sent = [];
        window.model = { get: (name) => held[name], set: (name, value) => { held[name] = value; }, save_changes() {},
                         on: (name, act) => window.listeners.push([name, act]), off: () => window.listeners.pop() };
        window.change = (values) => {
            Object.assign(held, values);
            return Promise.all(Object.keys(values).flatMap((name) => window.listeners.filter(([event]) => event === `change:${name}`).map(([, act]) => act())));
        };
        window.data = (values) => window.change(given(values)).then(() => null);
        window.start = (place) => render({ model: window.model, el: document.getElementById(place) });""")
    page.wait_for_function("() => Boolean(window.start)")
    return page


@pytest.fixture
def heard(stage):
    """The stage with somebody who listens: what is sent is kept in window.sent."""
    stage.evaluate("() => { window.model.send = (message) => window.sent.push(message); return window.start('one').then(() => null); }")
    stage.wait_for_selector(".pa[data-painted]")
    return stage


def factor_lane(page):
    """Left edge of the plot, top and height of the factor row on the screen."""
    box, place = page.locator(".pa-rows").bounding_box(), placed(page)
    y, height = next((y, height) for row, y, height in place["lanes"] if row == 8)
    return box["y"] + y, height


def test_the_factor_of_a_marked_stretch_is_dragged(heard, audit):
    heard.evaluate("scrollTo(0, 200)")
    press(heard, "Home", "PageUp", "PageUp", "[", "PageUp", "PageUp", "]")
    assert marked(heard) == [400, 800]
    (x, _), (top, height) = point(heard, audit.time[600], 0), factor_lane(heard)
    drag(heard, (x, top + height * 10 / 110), (x, top + height * 60 / 110))
    heard.wait_for_function("() => window.sent.length && Math.abs(window.sent.at(-1).factor - 0.5) < 0.02")
    sent = heard.evaluate("window.sent")
    assert {(m["do"], m["first"], m["last"]) for m in sent} == {("slow", 400, 800)} and len({m["gesture"] for m in sent}) == 1
    press(heard, "Escape", "Home", *["PageUp"] * 2, "[", *["PageUp"] * 2, "]")
    drag(heard, (x, top + height * 10 / 110), (x, top + height * 70 / 110))      # marked anew, a stretch has its handle at 100 again
    heard.wait_for_function("() => Math.abs(window.sent.at(-1).factor - 0.4) < 0.02")
    drag(heard, (x, top + height * 70 / 110), (x, top + height * 60 / 110))
    where = cursor(heard)
    drag(heard, (x, top + height * 60 / 110), (x, top + height * 30 / 110))
    heard.wait_for_function("() => Math.abs(window.sent.at(-1).factor - 0.8) < 0.02")
    assert heard.evaluate("new Set(window.sent.map((m) => m.gesture)).size") == 4 and cursor(heard) == where
    over = pixels(heard, ".pa-rows canvas:nth-child(2)")
    heard.evaluate("(same) => window.data(same)", packed(scene(audit)))
    assert pixels(heard, ".pa-rows canvas:nth-child(2)") != over      # the answer takes the preview's place
    assert marked(heard) == [400, 800]


def test_without_a_listener_no_factor_can_be_dragged(opened, audit):
    page = opened(audit)
    press(page, "Home", "PageUp", "PageUp", "[", "PageUp", "PageUp", "]")
    (x, _), (top, height) = point(page, audit.time[600], 0), factor_lane(page)
    drag(page, (x, top + height * 10 / 110), (x, top + height * 50 / 110))
    assert cursor(page) == pytest.approx(600, abs=3) and marked(page) == [400, 800]


def test_new_data_keep_place_span_and_rows(heard, audit):
    wordy = packed(scene(audit))
    wordy["facts"]["retiming"]["why"] = "Slows much of the path. " * 30
    heard.evaluate("(first) => window.data(first)", wordy)
    press(heard, "u", "Home", *["PageUp"] * 3, "+", "+", "r")
    heard.get_by_role("dialog", name="Which rows").get_by_label("j2", exact=True).uncheck()
    heard.keyboard.press("Escape")
    rows, (low, high) = lanes(heard), span(heard)
    assert 1 not in rows and 9 in rows
    after, top = audit.suggestion.audit(), heard.locator(".pa-rows").bounding_box()
    first = placed(heard)["lanes"]
    assert len(after.finding_list) < len(audit.finding_list)
    heard.evaluate("(next) => window.data(next)", packed(scene(after, applied=audit.suggestion, before=audit)))
    assert lanes(heard) == rows and cursor(heard) == 600
    assert heard.locator(".pa-rows").bounding_box() == top and placed(heard)["lanes"] == first      # nothing moves under the hand
    assert np.interp([low, high], audit.time, after.time) == pytest.approx(span(heard), abs=0.05)
    assert heard.locator(".pa-read span").nth(6).inner_text() == "as programmed"
    assert readout(heard)[3] == f"{1e3 * audit.rates.tool_speed[600]:.1f}"
    assert heard.locator(".pa-head").inner_text().startswith("FAIL") and "other speeds" in heard.locator(".pa-head").inner_text()


def test_before_and_after_are_drawn_in_one_lane(heard, audit):
    both = scene(audit.suggestion.audit(), applied=audit.suggestion, before=audit)
    arrays = {name: np.full_like(values, np.nan) if name.startswith("before") else values for name, values in both.arrays.items()}
    heard.evaluate("(next) => window.data(next)", packed(Scene(both.facts, arrays)))
    alone = [lane_pixels(heard, row) for row in (3, 6, 7)]
    heard.evaluate("(next) => window.data(next)", packed(both))
    assert [lane_pixels(heard, row) == without for row, without in zip((3, 6, 7), alone)] == [False, True, False]


def test_notes_are_flags_that_lead_to_them(heard, audit):
    assert placed(heard)["pins"] == []
    before = placed(heard)["process"]
    note = lambda k, sample, **other: {"id": f"n{k}", "sample": sample, "finding": None, "author": "a", "date": "2026-12-01", "text": f"text {k}",      # noqa: E731
                                       "settled": False, "stale": "", "where": "here", **other}
    value = {"file": "notes.txt", "writable": True, "fault": "", "author": "a",
             "notes": [note(0, 1000), note(1, 1001, settled=True), note(2, 10, stale="The place has moved."), *(note(k, 1990) for k in range(3, 9))]}
    heard.evaluate("(notes) => window.change({ notes })", value)
    pins = placed(heard)["pins"]
    assert len(pins) == 9 and placed(heard)["process"] > before
    assert all(b - a >= 17 for a, b in zip(pins, pins[1:])) and pins[-1] <= placed(heard)["left"] + placed(heard)["plot"] + 20
    box = heard.locator(".pa-rows").bounding_box()
    heard.mouse.click(box["x"] + pins[0] + 6, box["y"] + 14)      # the leftmost flag is the third note's
    heard.wait_for_function("() => document.activeElement.closest('[data-id]')?.dataset.id === 'n2'")
    filled = lambda x: heard.locator(".pa-rows canvas").first.evaluate("(canvas, x) => canvas.getContext('2d').getImageData(x + 3, 19, 1, 1).data[0] < 128", x)      # noqa: E731
    assert [filled(x) for x in pins[:3]] == [True, True, False]      # settled ones are hollow
    value["notes"][0]["settled"] = True
    heard.evaluate("(notes) => window.change({ notes })", value)
    cursor(heard)
    assert [filled(x) for x in pins[:3]] == [True, False, False]


def test_what_was_tried_is_bracketed_in_the_factor_row(heard):
    plain = pixels(heard, ".pa-rows canvas:nth-child(1)")
    trial = {"edits": [{"kind": "lock", "first": 300, "last": 700, "percent": 100.0}], "offers": [], "undo": True, "redo": False, "busy": False,
             "why": "", "changes": [], "variants": []}
    heard.evaluate("(trial) => window.change({ trial })", trial)
    assert pixels(heard, ".pa-rows canvas:nth-child(1)") != plain


def test_a_timeline_made_in_a_hidden_tab_is_drawn_when_the_tab_is_shown(stage):
    stage.evaluate("() => { document.getElementById('one').style.display = 'none'; return window.start('one').then(() => null); }")
    assert stage.locator(".pa[data-painted]").count() == 0
    stage.evaluate("document.getElementById('one').style.display = ''")
    stage.wait_for_selector(".pa[data-painted]")
    before = pixels(stage, ".pa-rows canvas:nth-child(1)")
    stage.evaluate("document.getElementById('one').style.display = 'none'")
    cursor(stage)
    stage.evaluate("document.getElementById('one').style.display = ''")
    assert pixels(stage, ".pa-rows canvas:nth-child(1)") == before


def test_two_views_of_one_model_move_together(stage):
    stage.evaluate("() => Promise.all([window.start('one'), window.start('two')]).then(() => null)")
    stage.wait_for_function("() => document.querySelectorAll('.pa[data-painted]').length === 2")
    stage.evaluate("() => { window.change({ cursor: 123 }); }")
    stage.wait_for_function("() => [...document.querySelectorAll('.pa')].every((root) => root.dataset.cursor === '123')")


def test_a_closed_view_lets_everything_go(stage):
    stage.evaluate("async () => { const close = await window.start('one'); close(); }")
    assert stage.evaluate("[window.listeners.length, document.querySelectorAll('canvas').length]") == [0, 0]


def test_damaged_data_is_told_in_words(stage):
    stage.evaluate("() => { window.model.set('block', new Uint8Array([1, 2, 3])); return window.start('one').catch(() => null); }")
    assert "cannot be drawn" in stage.locator(".pa-status").inner_text()


def test_with_scripts_off_picture_and_tables_are_there(opened, audit):
    page = opened(audit, java_script_enabled=False)
    assert page.locator(".pa-picture svg").is_visible()
    text = page.locator("body").inner_text()
    for words in ("FAIL", audit.finding_list[0].why, audit.path.sha256, "Limits used", "Cautions"):
        assert words in text
    assert not page.locator("#live").is_visible()


def test_with_scripts_on_the_timeline_takes_the_pictures_place(opened, audit):
    page = opened(audit)
    assert page.locator(".pa-picture svg").is_hidden() and page.locator("#live").is_visible()
    assert page.locator(".pa-head button").count() == 0      # nobody to ask for another audit
    assert page.locator("text=Limits used").is_visible()
