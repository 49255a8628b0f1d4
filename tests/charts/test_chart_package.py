"""The charts as a whole: what an import loads, what all figures have in common."""

import subprocess
import sys

import plotly.graph_objects as go
import pytest

from pathaudit import charts

DRAWN = {
    "joint": lambda a: charts.joint_over_time(a, "j4"),
    "joint by distance": lambda a: charts.joint_over_time(a, 3, along="distance"),
    "velocity in a plane": lambda a: charts.velocity_capacity(a, 27.525, plane="xy"),
    "velocity in space": lambda a: charts.velocity_capacity(a, 27.525),
    "force in a plane": lambda a: charts.force_capacity(a, sample=400, plane="xz", axes="tool"),
    "force in space": lambda a: charts.force_capacity(a, sample=400),
    "variants": lambda a: charts.variants_compared({"as programmed": a, "retimed": a.suggestion.audit()}),
    "reserve": lambda a: charts.reserve_along_path(a),
    "speeds": lambda a: charts.speeds_along_path(a, along="distance"),
}


def test_plotly_is_loaded_when_a_chart_is_drawn_and_not_before():
    code = ("import sys, pathaudit\nfrom pathaudit import charts\ncharts.joint_over_time, charts.image_options\n"
            "print(sorted({m.split('.')[0] for m in sys.modules} & {'plotly', 'pandas', 'numba', 'PIL', 'scipy', 'ipywidgets', 'anywidget'}))")
    assert subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout.strip() == "[]"


@pytest.mark.parametrize("name", DRAWN)
def test_every_chart_is_a_plain_new_figure_with_title_white_ground_and_a_name_to_save_it_under(demo, name):
    figure, again = DRAWN[name](demo), DRAWN[name](demo)
    assert type(figure) is go.Figure and figure is not again and figure.to_json() == again.to_json()
    assert figure.layout.title.text and figure.layout.paper_bgcolor is None and figure.layout.template.layout.paper_bgcolor == "white"
    assert figure.layout.font.family.startswith("system-ui")
    image = charts.image_options(figure)["toImageButtonOptions"]
    assert image["filename"].replace("-", "").isalnum() and image["filename"] != "chart"


@pytest.mark.parametrize("name", DRAWN)
def test_no_trace_of_a_chart_is_without_units_or_words_on_hover(demo, name):
    for trace in DRAWN[name](demo).data:
        hover = trace.hovertemplate
        assert trace.hoverinfo == "skip" or any(word in hover for word in ("mm/s", "deg", " N", "%{text}", "%{customdata}", "reserve", "mm", "fail", "warn", "%"))


def test_the_names_of_pictures_say_what_is_shown(demo):
    names = [charts.image_options(draw(demo))["toImageButtonOptions"]["filename"] for draw in DRAWN.values()]
    assert names == ["joint-j4", "joint-j4", "velocity-xy-sample-1101", "velocity-3d-sample-1101", "force-xz-sample-400", "force-3d-sample-400", "variants",
                     "reserve-by-time", "tool-speed-by-distance"]
    assert charts.image_options(go.Figure())["toImageButtonOptions"]["filename"] == "chart"


def test_a_chart_of_a_long_path_stays_small(long):
    for figure in (charts.joint_over_time(long, 2), charts.reserve_along_path(long), charts.speeds_along_path(long, long.retime("even"))):
        assert 4000 < len(figure.data[0].x) <= 5000
        assert len(figure.to_json()) < 1_000_000
