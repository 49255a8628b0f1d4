"""The charts in a real browser: from a file without a network, and as outputs in JupyterLab. They draw, nothing is cut or overlaps, and they save as a picture."""

import base64
import io

import hosts
import numpy as np
import pytest
from PIL import Image

import pathaudit as pa
from pathaudit import charts

FLAT = {
    "joint": lambda a: charts.joint_over_time(a, "j4"),
    "joint by distance": lambda a: charts.joint_over_time(a, "j1", along="distance"),
    "velocity": lambda a: charts.velocity_capacity(a, 27.525, plane="xy"),
    "force": lambda a: charts.force_capacity(a, 10.0, plane="xz", axes="tool"),
    "variants": lambda a: charts.variants_compared({"as programmed": a, "retimed as suggested": a.suggestion.audit(), "one even speed, because the bead must stay even": a.retime("even").audit()}),
    "reserve": lambda a: charts.reserve_along_path(a),
    "speeds": lambda a: charts.speeds_along_path(a),
    "even speeds": lambda a: charts.speeds_along_path(a, a.retime("even"), along="distance"),
}
SPATIAL = {"velocity in space": lambda a: charts.velocity_capacity(a, 27.525), "force in space": lambda a: charts.force_capacity(a, 27.525)}
WIDTHS = (760, 1800)

BOXES = """(name) => {
    const chart = document.getElementById(name), frame = chart.getBoundingClientRect();
    const words = [...chart.querySelectorAll('.gtitle, .annotation-text, .xtitle, .ytitle, .x2title, .x3title, .x4title, .x5title, .y2title, .y3title, .legendtext')];
    const ticks = [...chart.querySelectorAll('.xtick text, .ytick text, .x2tick text, .x3tick text, .x4tick text, .x5tick text, .y2tick text, .y3tick text')];
    const box = (e) => { const b = e.getBoundingClientRect(); return [e.textContent, b.left - frame.left, b.top - frame.top, b.right - frame.left, b.bottom - frame.top]; };
    return { width: frame.width, height: frame.height, words: words.map(box), ticks: ticks.map(box),
             small: [...chart.querySelectorAll('text')].filter((e) => e.textContent.trim() && parseFloat(getComputedStyle(e).fontSize) < 11).map((e) => e.textContent) };
}"""

HOVER = """([name, at]) => {
    Plotly.Fx.hover(name, at, 'xy');
    return document.getElementById(name).querySelector('.hoverlayer').textContent.replaceAll('\\u2212', '-');
}"""


@pytest.fixture(scope="module")
def audit():
    return pa.audit(pa.read_path(hosts.DEMO / "seam.csv"), pa.read_cell(hosts.DEMO / "cell.toml"))


@pytest.fixture(scope="module")
def sheet(chromium, tmp_path_factory, audit):
    """One page, opened from a file that holds plotly itself and all charts, each in an element of its name."""
    draws, parts = {**FLAT, **SPATIAL}, []
    for name, draw in draws.items():
        figure = draw(audit)
        parts.append(figure.to_html(full_html=False, include_plotlyjs=not parts, div_id=name, config=charts.image_options(figure)))
    file = tmp_path_factory.mktemp("charts") / "charts.html"
    file.write_text(f"<!doctype html><meta charset=utf-8>{''.join(parts)}", encoding="utf-8")
    watched = hosts.Watched(chromium, width=WIDTHS[0])
    watched.page.goto(file.as_uri())
    watched.page.wait_for_function("(n) => document.querySelectorAll('.js-plotly-plot .main-svg .infolayer').length >= n", arg=len(draws), timeout=60000)
    yield watched
    watched.close()


@pytest.fixture
def page(sheet):
    yield sheet.page
    assert sheet.faults == []


def picture(page, name):
    """What the button of the mode bar would save."""
    address = page.evaluate("(name) => Plotly.toImage(document.getElementById(name), { format: 'png', width: 900, height: 600 })", name)
    return np.asarray(Image.open(io.BytesIO(base64.b64decode(address.partition(",")[2]))).convert("RGB"))


def shares(image, colour, near=40):
    """Which part of a picture has about that colour"""
    return float((np.abs(image.astype(int) - [int(colour[k : k + 2], 16) for k in (1, 3, 5)]).max(axis=2) < near).mean())


@pytest.mark.parametrize("width", WIDTHS)
def test_every_flat_chart_draws_with_nothing_cut_and_no_words_on_each_other(page, width):
    page.set_viewport_size({"width": width, "height": 1000})
    page.wait_for_function("(w) => [...document.querySelectorAll('.js-plotly-plot')].every((e) => Math.abs(e._fullLayout.width - w) < 40)", arg=width, timeout=30000)
    for name in FLAT:
        found = page.evaluate(BOXES, name)
        assert found["width"] > 0.9 * width and found["height"] > 150 and found["words"] and found["ticks"] and not found["small"]
        for words, left, top, right, bottom in found["words"] + found["ticks"]:
            assert left > -1 and top > -1 and right < found["width"] + 1 and bottom < found["height"] + 1, (name, words)
        boxes = [box for box in found["words"] if box[3] > box[1]]
        for k, (words, left, top, right, bottom) in enumerate(boxes):
            for other in boxes[k + 1:]:
                assert right < other[1] + 2 or other[3] < left + 2 or bottom < other[2] + 4 or other[4] < top + 4, (name, words, other[0])


def test_every_flat_chart_saves_as_a_picture_with_its_lines(page):
    colours = {"joint": "#0072b2", "joint by distance": "#0072b2", "velocity": "#009e73", "force": "#009e73", "variants": "#0072b2", "reserve": "#0072b2", "speeds": "#0072b2", "even speeds": "#0072b2"}
    for name, colour in colours.items():
        image = picture(page, name)
        assert image.shape == (600, 900, 3) and (image[0, 0] == 255).all() and shares(image, colour) > 0.0004, name


def test_the_button_saves_under_a_name_that_says_what_is_shown(page):
    page.locator("#joint").hover()
    with page.expect_download(timeout=15000) as download:
        page.locator("#joint .modebar-btn[data-title*=png i]").click()
    assert download.value.suggested_filename == "joint-j4.png"


def test_hover_labels_carry_units(page, audit):
    k = 1101
    at = {"xval": float(audit.time[k]), "yval": 0.0}
    shown = page.evaluate(HOVER, ["joint", at])
    assert f"at {1e3 * audit.path.distance[k]:.1f} mm" in shown and f"position {np.degrees(audit.joints[k, 3]):.2f} deg" in shown
    assert "27.525 s" in shown and f"speed {np.degrees(audit.rates.joint_speed[k, 3]):.2f} deg/s" in shown and "deg/s2" in shown
    assert "3 fail: joint speed j4" in shown
    shown = page.evaluate(HOVER, ["reserve", {"xval": float(audit.time[k]), "yval": 1.0}])
    assert "reserve 0.58" in shown and "most loaded: j4, 173.6 % of its speed limit" in shown
    assert "programmed 24.0 mm/s" in page.evaluate(HOVER, ["speeds", at])


def test_charts_in_space_draw_and_save(page):
    for name, colour in zip(SPATIAL, ("#56b4e9", "#00224e"), strict=True):
        box = page.locator(f"[id='{name}'] .gl-container canvas").first.bounding_box()
        assert box["width"] > 300 and box["height"] > 300
        assert shares(picture(page, name), colour, 60) > 0.001


def test_charts_draw_in_jupyterlab_from_the_output_alone(lab, desk):
    desk.faults.clear()
    lab.write("charts.ipynb", f"""import pathaudit as pa
from pathaudit import charts
audit = pa.audit(pa.read_path({str(hosts.DEMO / "seam.csv")!r}), pa.read_cell({str(hosts.DEMO / "cell.toml")!r}))
figure = charts.joint_over_time(audit, 'j4')
figure.show(config=charts.image_options(figure))""", "charts.velocity_capacity(audit, 27.525)")
    lab.open(desk.page, "charts.ipynb")
    lab.run(desk.page)
    desk.page.wait_for_function("() => document.querySelectorAll('.jp-RenderedPlotly .main-svg .infolayer').length >= 2", timeout=120000)
    assert desk.page.locator(".jp-RenderedPlotly .gl-container canvas").first.bounding_box()["height"] > 300
    assert "Joint j4 along the path" in desk.page.locator(".jp-RenderedPlotly .gtitle").first.text_content()
    lab.save(desk.page)
    desk.page.wait_for_function("() => !jupyterapp.shell.currentWidget.context.model.dirty", timeout=20000)
    outputs = [output["data"] for cell in lab.read("charts.ipynb")["cells"] for output in cell["outputs"]]
    for data in outputs:  # JupyterLab itself adds a picture, for readers that cannot draw
        assert {"application/vnd.plotly.v1+json"} <= set(data) <= {"application/vnd.plotly.v1+json", "image/png"}
    assert len(outputs) == 2 and outputs[0]["application/vnd.plotly.v1+json"]["config"]["toImageButtonOptions"]["filename"] == "joint-j4"
    assert desk.faults == []
