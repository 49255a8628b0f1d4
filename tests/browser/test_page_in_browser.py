"""The one-page report in a real browser, opened from a file: keys, mouse, numbers, pixels, and with scripts off."""

import base64
import json

import numpy as np
import pytest
from fake_audit import fake_audit

from pathaudit.report.page import one_page
from pathaudit.report.scene import scene
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


def span(page):
    """First and last place of the rows, as the readout says them, from a drag in the rows to both ends and beyond."""
    box, ends = page.locator(".pa-rows").bounding_box(), []
    for x in (box["x"] - 50, box["x"] + box["width"] + 50):
        page.mouse.move(box["x"] + 0.5 * box["width"], box["y"] + 300)
        page.mouse.down()
        page.mouse.move(x, box["y"] + 300, steps=2)
        ends.append(float(readout(page)[0]))
        page.mouse.up()
    return ends


def test_zoom_keeps_the_cursor_in_sight(opened, audit):
    page = opened(audit)
    whole = page.get_by_role("button", name="Show the whole path")
    assert whole.is_disabled() and span(page) == [0.0, 14.0]
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
    assert span(page) == [0.0, 14.0] and whole.is_disabled()
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
    page.keyboard.press("Home")
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


@pytest.fixture
def stage(watched, audit):
    """An empty page with the modules loaded, a stub model and window.start(place): what any host of the timeline does."""
    shown = scene(audit)
    block, layout = shown.packed()
    page = watched().page
    page.set_content(f"<style>{style_sheet()}</style><div id='one'></div><div id='two'></div>")
    page.evaluate("([facts, text]) => { window.facts = facts; window.text = text; }", [{**shown.facts, "layout": layout}, base64.b64encode(block).decode()])
    page.add_script_tag(type="module", content=joined_modules() + """
        const held = { facts: window.facts, block: Uint8Array.from(atob(window.text), (c) => c.charCodeAt(0)), status: "", cursor: 0 };
        window.listeners = [];
        window.model = { get: (name) => held[name], set: (name, value) => { held[name] = value; }, save_changes() {},
                         on: (name, act) => window.listeners.push([name, act]), off: () => window.listeners.pop() };
        window.start = (place) => render({ model: window.model, el: document.getElementById(place) });""")
    page.wait_for_function("() => Boolean(window.start)")
    return page


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
    stage.evaluate("() => { window.model.set('cursor', 123); window.listeners.filter(([n]) => n === 'change:cursor').forEach(([, act]) => act()); }")
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
