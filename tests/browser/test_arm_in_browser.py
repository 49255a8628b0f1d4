"""The view of the arm in a real browser: its numbers against NumPy, and what hand and keys do to it."""

import json
from functools import cache

import hosts
import numpy as np
import pytest
from fake_audit import fake_audit
from posed_audit import HANGING, ON_A_WALL, mounted, sliding

import pathaudit as pa
from pathaudit.report.page import one_page
from pathaudit.report.scene import scene
from pathaudit.report.script import joined_modules, style_sheet
from pathaudit.report.skeleton import skeleton

ARMS = {"six": lambda: fake_audit(600), "planar": lambda: fake_audit(600, 2), "twelve": lambda: fake_audit(600, 12), "sliding": sliding,
        "hanging": lambda: mounted(HANGING), "wall": lambda: mounted(ON_A_WALL), "one": lambda: fake_audit(2, 1)}

# A canvas that also keeps what is written and which ovals are drawn on it.
_BENCH = """
window.bench = { postureAt, velocityEllipsoid, principal, scaleOf, MEASURES, shadeColour, armView, theme };
window.spread = (arrays) => Object.fromEntries(Object.entries(arrays).map(([name, columns]) => [name, columns.map((c) => Float32Array.from(c, (v) => v ?? NaN))]));
window.recorded = (act) => {
    const seen = { words: [], ovals: [] }, kind = CanvasRenderingContext2D.prototype, { fillText, ellipse } = kind;
    kind.fillText = function (words, x, y) { seen.words.push([words, x, y, this.measureText(words).width]); fillText.call(this, words, x, y); };
    kind.ellipse = function (...given) { seen.ovals.push(given); ellipse.apply(this, given); };
    try { act(); } finally { Object.assign(kind, { fillText, ellipse }); }
    return seen;
};
"""


@pytest.fixture(scope="module")
def bench(chromium):
    """A page with the modules' functions at hand."""
    one = hosts.Watched(chromium)
    one.page.set_content(f"<style>{style_sheet()}</style><div class='pa'></div>")
    one.page.add_script_tag(type="module", content=joined_modules() + _BENCH)
    one.page.wait_for_function("() => Boolean(window.recorded)")
    yield one.page
    one.close()
    assert not one.faults


def told(page, audit):
    """Give the page an audit's facts and columns; gives the Scene."""
    shown = scene(audit)
    columns = {name: np.where(np.isfinite(values), values, np.nan).reshape(len(values), -1).T.tolist() for name, values in shown.arrays.items()}
    arrays = {name: [[v if np.isfinite(v) else None for v in column] for column in block] for name, block in columns.items()}
    page.evaluate("([facts, arrays]) => { window.facts = facts; window.data = spread(arrays); }", [shown.facts, arrays])
    return shown


def jacobian(shown, i):
    """Linear Jacobian (3, n) of the tool point by differences of the skeleton."""
    q, step = shown.arrays["joints"][i].astype(float), 1e-6
    nudged = skeleton(shown.facts, np.vstack([q + step * np.eye(len(q)), q - step * np.eye(len(q))])).points[:, -1]
    return (nudged[:len(q)] - nudged[len(q):]).T / (2 * step)


@pytest.mark.parametrize("name", ARMS)
def test_the_arm_stands_where_python_says(bench, name):
    shown = told(bench, ARMS[name]())
    expected = skeleton(shown.facts, shown.arrays["joints"])
    for i in np.linspace(0, shown.facts["shown"] - 1, 7).astype(int).tolist():
        got = bench.evaluate("(i) => bench.postureAt(facts, data, i)", i)
        if np.isnan(expected.points[i]).any():
            assert got is None
            continue
        for key in ("points", "roots", "axes"):
            np.testing.assert_allclose(got[key][:len(getattr(expected, key)[i])], getattr(expected, key)[i], atol=1e-6)
        np.testing.assert_allclose(np.array(got["tool"])[:3], expected.tool[i], atol=1e-6)
    assert bench.evaluate("() => bench.postureAt(facts, { ...data, joints: data.joints.map((c) => c.map(() => NaN)) }, 0)") is None


@pytest.mark.parametrize("name", ["six", "planar", "twelve", "sliding", "one"])
def test_the_velocity_ellipsoid_agrees_with_numpy(bench, name):
    shown = told(bench, ARMS[name]())
    speed = np.array(shown.facts["joint_speed"])
    for i in np.linspace(0, 0.8 * (shown.facts["shown"] - 1), 5).astype(int).tolist():
        got = bench.evaluate("(i) => bench.velocityEllipsoid(facts, bench.postureAt(facts, data, i))", i)
        expected = pa.velocity_ellipsoid(jacobian(shown, i) * speed)
        scale = expected.semi_axes[0]
        np.testing.assert_allclose(got["w"], (jacobian(shown, i) * speed**2) @ jacobian(shown, i).T, atol=1e-6 * scale**2)
        np.testing.assert_allclose([half for half, _ in got["axes"]], expected.semi_axes, atol=1e-6 * scale)
        for (half, direction), k in zip(got["axes"], range(3)):
            apart = np.abs(np.delete(expected.semi_axes, k) - expected.semi_axes[k]).min()
            if apart > 1e-2 * scale:
                assert abs(np.dot(direction, expected.axes[:, k])) == pytest.approx(1.0, abs=1e-6)


def test_principal_axes_of_any_symmetric_matrix(bench):
    rng = np.random.default_rng(4)
    turn = np.linalg.qr(rng.standard_normal((3, 3)))[0]
    some = [m + m.T for m in rng.standard_normal((40, 3, 3))]
    some += [turn @ np.diag(values) @ turn.T for values in ((2, 2, 1), (1, 2, 2), (3, 3, 3), (5, 0, 0), (1e6, 1, 1e-6), (0, 0, 7))]
    some += [np.diag([1.0, 2.0, 3.0]), np.diag([3.0, 1.0, 2.0]), np.zeros((3, 3)), np.ones((3, 3))]
    for matrix in some:
        got = bench.evaluate("(m) => bench.principal(m)", matrix.tolist())
        values, vectors = np.array([v for v, _ in got]), np.array([v for _, v in got]).T
        size = max(np.abs(matrix).max(), 1e-300)
        np.testing.assert_allclose(values, np.linalg.eigvalsh(matrix)[::-1], atol=1e-13 * size)
        np.testing.assert_allclose(vectors @ vectors.T, np.eye(3), atol=1e-13)
        np.testing.assert_allclose(vectors * values @ vectors.T, matrix, atol=1e-13 * size)


@pytest.mark.parametrize("name", ["six", "sliding", "planar"])
def test_the_drawn_outline_is_that_of_the_ellipsoid(bench, name):
    """The width of the drawn oval across any direction is that of all tool speeds J (limit u), |u| = 1, seen through the projection."""
    shown = told(bench, ARMS[name]())
    speed, sizes = np.array(shown.facts["joint_speed"]), []
    bench.evaluate("""() => { window.view = bench.armView(facts, data); view.frameAll(500, 600); view.look.ellipsoid = true;
                              window.canvas = document.createElement("canvas"); window.colours = bench.theme(document.querySelector(".pa")); }""")
    for i in (50, 250, 400):
        for angle in (0, 2):
            bench.evaluate("(k) => view.view(k)", angle)
            seen = bench.evaluate("(i) => recorded(() => view.drawArm(canvas, colours, i))", i)
            (x, y, long, short, turn, *_), = seen["ovals"]
            tool = skeleton(shown.facts, shown.arrays["joints"][i:i + 1]).points[0, -1]
            nudged = np.array([bench.evaluate("(p) => view.project(p)", (tool + h).tolist())[:2] for h in [*(1e-5 * np.eye(3)), *(-1e-5 * np.eye(3))]])
            slope = (nudged[:3] - nudged[3:]).T / 2e-5                      # px per m, (2, 3)
            np.testing.assert_allclose(bench.evaluate("(p) => view.project(p)", tool.tolist())[:2], [x, y], atol=1e-3)
            across = np.array([[np.cos(a), np.sin(a)] for a in np.linspace(0, np.pi, 9)])
            expected = np.linalg.norm(across @ slope @ jacobian(shown, i) * speed, axis=1)
            frame = np.array([[np.cos(turn), np.sin(turn)], [-np.sin(turn), np.cos(turn)]])
            drawn = np.linalg.norm((across @ frame.T) * [long, short], axis=1)
            sizes.append(drawn.max() / expected.max())
            np.testing.assert_allclose(drawn, sizes[-1] * expected, atol=2e-3 * drawn.max())
            halves = [half for half, _ in bench.evaluate("(i) => bench.velocityEllipsoid(facts, bench.postureAt(facts, data, i)).axes", i)]
            written = [words for words, *_ in seen["words"]]
            assert f"half axes {', '.join(f'{1e3 * half:.0f}' for half in halves)} mm/s" in written and f"{1e3 * halves[0]:.0f} mm/s" in written
    np.testing.assert_allclose(sizes, sizes[0], rtol=2e-3)      # equal lengths are equal speeds


_EVERYWHERE = """([width, height, points, samples]) => {
    const view = bench.armView(facts, data), canvas = document.createElement("canvas"), colours = bench.theme(document.querySelector(".pa"));
    view.frameAll(width, height);
    view.look.ellipsoid = true;
    return [0, 1, 2, 3].map((k) => {
        view.view(k);
        return [points.map(view.project), [0, 1].flatMap((measure) => {
            view.look.measure = measure;
            return samples.map((i) => recorded(() => { view.drawStage(canvas, colours); view.drawArm(canvas, colours, i); }).words);
        })];
    });
}"""


@pytest.mark.parametrize("name", ARMS)
def test_nothing_is_cut_and_words_stay_apart(bench, name):
    shown = told(bench, ARMS[name]())
    points = skeleton(shown.facts, shown.arrays["joints"]).points.reshape(-1, 3)
    everything = np.vstack([points[np.isfinite(points).all(axis=1)], shown.arrays["path_m"]])[::5].tolist()
    samples = np.linspace(0, shown.facts["shown"] - 1, 5).astype(int).tolist()
    for width, height in ((400, 274), (398, 300), (700, 900)):
        for flat, pictures in bench.evaluate(_EVERYWHERE, [width, height, everything, samples]):
            x, y, _ = np.array(flat).T
            assert x.min() > 8 and y.min() > 8 and x.max() < width - 8 and y.max() < height - 8
            for words in pictures:
                boxes = [(x, y - 6, x + wide, y + 6) for _, x, y, wide in words]
                assert all(left >= 0 and right <= width and top >= 0 and bottom <= height for left, top, right, bottom in boxes), words
                for n, (left, top, right, bottom) in enumerate(boxes):
                    assert not any(left < r and l < right and top < b and t < bottom for l, t, r, b in boxes[:n]), words


def test_the_scale_of_a_measure(bench):
    audit = fake_audit(600)
    shown = told(bench, audit)
    inside = shown.arrays["process"] > 0
    for number, name, values, log in ((1, "busiest joint", np.max(shown.arrays["share_percent"], axis=1), False),
                                      (2, "sigma_min", shown.arrays["sigma_min"], True), (3, "tool speed", shown.arrays["speed_mm_s"], False),
                                      (4, "factor", shown.arrays["factor_percent"], False)):
        got = bench.evaluate("(k) => { const s = bench.scaleOf(bench.MEASURES[k], data); return [bench.MEASURES[k].name, s.ends, [...data.time_s[0]].map((_, i) => s.shade(i))]; }", number)
        known = values[inside & np.isfinite(values)]
        high = max(known.max(), 100.0 if name in ("busiest joint", "factor") else 0.0)
        low = known.min() if log else 0.0
        assert got[0] == name
        np.testing.assert_allclose(got[1], [low, np.sqrt(low * high) if log else high / 2, high], rtol=1e-6)
        share = np.log(np.clip(values, low, None) / low) / np.log(high / low) if log else values / high
        shades = np.array(got[2], dtype=float)
        assert (shades[~np.isfinite(values)] == -1).all()
        there = np.isfinite(values)
        np.testing.assert_allclose(shades[there], 27 * np.clip(share[there], 0, 1), atol=0.501)


@pytest.mark.parametrize("column", ["share_percent", "sigma_min", "speed_mm_s", "factor_percent"])
@pytest.mark.parametrize("value", [0.0, 7.0, None])
def test_a_measure_that_is_constant_or_unknown_has_a_scale_too(bench, column, value):
    told(bench, fake_audit(120))
    ends, shades, colours = bench.evaluate("""([name, value]) => { data[name] = data[name].map((c) => c.map(() => value ?? NaN));
        const scale = bench.scaleOf(bench.MEASURES[["", "share_percent", "sigma_min", "speed_mm_s", "factor_percent"].indexOf(name)], data);
        const shades = [...data.time_s[0]].map((_, i) => scale.shade(i));
        return [scale.ends, shades, shades.map((s) => (s < 0 ? "rgb(0 0 0)" : bench.shadeColour(s)))]; }""", [column, value])
    assert all(a < b for a, b in zip(ends, ends[1:])) and set(shades) <= {-1, *range(28)}
    assert len(set(shades)) == 1 and (value is not None) == (shades[0] >= 0)
    assert all("NaN" not in colour for colour in colours)


def test_the_shades_are_cividis(bench):
    got = bench.evaluate("() => [0, 3, 6, 27].map(bench.shadeColour)")
    assert got == ["rgb(0 34 78)", "rgb(18 53 112)", "rgb(59 73 108)", "rgb(254 232 56)"]
    light = bench.evaluate("() => Array.from({ length: 28 }, (_, k) => bench.shadeColour(k).match(/\\d+/g).map(Number))")
    assert (np.diff(np.array(light) @ [0.2126, 0.7152, 0.0722]) > 0).all()


def test_a_new_audit_of_the_same_place_keeps_the_eye(bench):
    told(bench, fake_audit(300))
    kept = bench.evaluate("""() => { const old = bench.armView(facts, data); old.frameAll(500, 600); old.orbit(40, 10); old.zoom(3, 200, 200); old.look.measure = 2;
        const seen = old.project([0.5, 0.2, 0.7]), next = bench.armView(facts, data, old); next.frameAll(500, 600);
        return [seen, next.project([0.5, 0.2, 0.7]), next.look.measure]; }""")
    np.testing.assert_allclose(kept[1], kept[0])
    assert kept[2] == 2
    assert bench.evaluate("""() => { const old = bench.armView(facts, data); old.frameAll(500, 600); old.zoom(5); old.look.measure = 2;
        const moved = { ...facts, part: facts.part.map((row, r) => (r ? row : [...row.slice(0, 3), row[3] + 1])) };
        const next = bench.armView(moved, data, old), fresh = bench.armView(moved, data); [next, fresh].forEach((v) => v.frameAll(500, 600));
        return [next.look.scale === fresh.look.scale, next.look.measure]; }""") == [True, 2]


def test_zoom_and_orbit_hold_what_is_looked_at(bench):
    told(bench, fake_audit(300))
    bench.evaluate("() => { window.view = bench.armView(facts, data); view.frameAll(500, 600); }")
    point = [0.6, 0.1, 0.9]
    before = bench.evaluate("(p) => view.project(p)", point)
    after = bench.evaluate("([p, x, y]) => { view.zoom(2.5, x, y); return view.project(p); }", [point, *before[:2]])
    np.testing.assert_allclose(after[:2], before[:2], atol=1e-9)
    assert after[2] == pytest.approx(2.5 * before[2])
    place = bench.evaluate("() => { view.drawArm(document.createElement('canvas'), bench.theme(document.querySelector('.pa')), 100); return data.path_m.map((c) => c[100]); }")
    ends = bench.evaluate("(p) => { const at = view.project(p); view.orbit(60, -30); return [at, view.project(p)]; }", place)
    np.testing.assert_allclose(ends[1][:2], ends[0][:2], atol=1e-9)
    bench.evaluate("() => view.zoom(1.3)")
    np.testing.assert_allclose(bench.evaluate("(p) => view.project(p)", place)[:2], ends[0][:2], atol=1e-9)
    bench.evaluate("() => view.zoom(1e9)")
    assert bench.evaluate("() => view.look.scale / view.look.fitted") == pytest.approx(25)
    bench.evaluate("() => view.zoom(1e-9)")
    assert bench.evaluate("() => view.look.scale / view.look.fitted") == pytest.approx(0.4)


@cache
def report(name):
    return one_page(ARMS[name]())


@pytest.fixture
def opened(watched, tmp_path):
    """Open an arm's page; gives the browser's page once the timeline is painted."""

    def make(name="six"):
        file = tmp_path / "audit.html"
        file.write_text(report(name), encoding="utf-8")
        page = watched().page
        page.goto(file.as_uri())
        page.wait_for_selector(".pa[data-painted]", timeout=10000)
        return page

    return make


def pixels(page, layer=1):
    """A fingerprint of the still layer (1) or the moving one (2), once all painting is done."""
    page.evaluate("() => new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(done)))")
    return page.locator(f".pa-arm canvas:nth-child({layer})").evaluate("(canvas) => canvas.toDataURL()")


def test_views_by_button_and_by_key_are_the_same(opened):
    page = opened()
    first = pixels(page)
    seen = {}
    for key, name in (("1", "front view"), ("2", "side view"), ("3", "top view"), ("4", "three-quarter view")):
        page.get_by_role("button", name=name).click()
        seen[name] = pixels(page), pixels(page, 2)
        page.locator(".pa-arm").press("ArrowLeft")
        assert pixels(page) != seen[name][0]
        page.locator(".pa-arm").press(key)
        assert (pixels(page), pixels(page, 2)) == seen[name]
    assert len(set(seen.values())) == 4 and seen["three-quarter view"][0] == first


def test_keys_turn_zoom_move_and_fit(opened):
    page = opened()
    arm, first = page.locator(".pa-arm"), pixels(page)
    for there, back in (("ArrowRight", "ArrowLeft"), ("ArrowDown", "ArrowUp"), ("Shift+ArrowRight", "Shift+ArrowLeft"), ("Shift+ArrowUp", "Shift+ArrowDown"), ("+", "-")):
        arm.press(there)
        assert pixels(page) != first, there
        arm.press(back)
    for key in ("+", "+", "Shift+ArrowUp", "Home"):
        arm.press(key)
    assert pixels(page) == first
    cursor = page.locator(".pa").get_attribute("data-cursor")
    arm.press("End")
    assert page.locator(".pa").get_attribute("data-cursor") == cursor and pixels(page) == first


def test_the_wheel_zooms_with_the_focus_or_ctrl_and_a_drag_moves(opened):
    page = opened()
    arm, first = page.locator(".pa-arm"), pixels(page)
    box = arm.bounding_box()
    middle = box["x"] + 0.5 * box["width"], box["y"] + 0.5 * box["height"]
    page.mouse.move(*middle)
    page.mouse.wheel(0, 40)
    page.wait_for_timeout(50)
    assert pixels(page) == first
    page.evaluate("scrollTo(0, 0)")
    page.keyboard.down("Control")
    page.mouse.wheel(0, -120)
    page.keyboard.up("Control")
    assert pixels(page) != first
    page.get_by_role("button", name="Show all of path and arm").click()
    assert pixels(page) == first
    arm.focus()
    page.mouse.move(*middle)
    page.mouse.wheel(0, -120)
    assert pixels(page) != first and page.evaluate("scrollY") == 0
    arm.press("Home")
    for shift in (False, True):
        if shift:
            page.keyboard.down("Shift")
        page.mouse.move(*middle)
        page.mouse.down()
        page.mouse.move(middle[0] + 40, middle[1] + 20, steps=4)
        page.mouse.up()
        assert pixels(page) != first
        if shift:
            page.keyboard.up("Shift")
            for key in 5 * ["Shift+ArrowLeft"] + ["Shift+ArrowUp"]:      # 8 px each
                arm.press(key)
            assert pixels(page) != first
            page.mouse.move(*middle)
            page.keyboard.down("Shift")
            page.mouse.down()
            page.mouse.move(middle[0], middle[1] - 12, steps=2)
            page.mouse.up()
            page.keyboard.up("Shift")
        else:
            arm.press("4")
        assert pixels(page) == first


def test_the_path_is_coloured_by_what_is_chosen(opened):
    page = opened()
    choose = page.get_by_role("combobox", name="Colour of the path")
    names = choose.locator("option").all_inner_texts()
    assert names == ["severity", "busiest joint", "sigma_min", "tool speed", "factor"]
    pictures = []
    for name in names:
        choose.select_option(name)
        pictures.append(pixels(page))
    assert len(set(pictures)) == len(names)
    choose.select_option("severity")
    assert pixels(page) == pictures[0]


def test_the_ellipsoid_is_switched_and_follows_the_cursor(opened):
    page = opened()
    switch, without = page.get_by_role("button", name="Velocity ellipsoid"), pixels(page, 2)
    switch.press("Enter")
    assert switch.get_attribute("aria-pressed") == "true" and pixels(page, 2) != without
    switch.press(" ")
    assert switch.get_attribute("aria-pressed") == "false" and pixels(page, 2) == without


def test_the_focus_is_seen_and_keys_are_kept_from_the_lab(opened):
    page = opened()
    places = page.locator(".pa-arm-bar button, .pa-arm-bar select, .pa-arm")
    assert places.count() == 9
    for place in [*page.locator(".pa-arm-pane [tabindex]").all(), *places.all()]:
        assert place.get_attribute("data-lm-suppress-shortcuts") == "true" and (place.get_attribute("aria-label") or "").strip()
    page.locator(".pa-arm-bar button").first.focus()
    for k in range(places.count()):
        style = page.evaluate("() => { const s = getComputedStyle(document.activeElement); return [document.activeElement.closest('.pa-arm-pane') !== null, s.outlineStyle, s.outlineWidth]; }")
        assert style == [True, "solid", "2px"], k
        page.keyboard.press("Tab")


def test_the_help_lists_the_keys_and_gives_the_focus_back(opened):
    page = opened()
    page.get_by_role("button", name="Keys of the view").click()
    box = page.get_by_role("dialog", name="Keys of the view")
    words = box.inner_text()
    for part in ("turn, with Shift move", "top view", "Home", "all of path and arm", "nearer"):
        assert part in words
    place = box.bounding_box()
    assert place["x"] >= 0 and place["x"] + place["width"] <= 1200
    page.keyboard.press("Escape")
    assert not box.is_visible() and page.evaluate("document.activeElement.getAttribute('aria-label')") == "Keys of the view"


@pytest.mark.parametrize("dark", [False, True])
def test_the_arm_is_drawn_in_the_colours_of_the_page(opened, dark):
    page = opened("hanging")
    if dark:
        page.add_style_tag(content=".pa { --jp-layout-color0: #111; --jp-ui-font-color0: #eee }")
        page.wait_for_timeout(100)
    before = int(page.locator(".pa").get_attribute("data-painted"))
    page.locator(".pa-arm").press("1")
    page.wait_for_function("(n) => Number(document.querySelector('.pa').dataset.painted) > n", arg=before)
    shares = json.loads(page.locator(".pa-arm canvas:nth-child(2)").evaluate("""(canvas) => { const { data } = canvas.getContext('2d').getImageData(0, 0, canvas.width, canvas.height);
        let light = 0, dark = 0; for (let k = 0; k < data.length; k += 4) if (data[k + 3] > 250) data[k] > 190 ? light++ : data[k] < 90 ? dark++ : 0; return JSON.stringify([light, dark]); }"""))
    assert shares[1 if dark else 0] > 3 * shares[0 if dark else 1] > 0
