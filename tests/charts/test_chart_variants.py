"""Variants side by side."""

from dataclasses import replace

import numpy as np
import pytest
from example_arms import path_of_poses

import pathaudit as pa
from pathaudit import charts
from pathaudit.findings import peak_shares
from pathaudit.kernels import linkage


def bars(figure, axis):
    return [t for t in figure.data if t.type == "bar" and t.xaxis == axis]


def test_every_column_holds_the_numbers_of_the_audits(demo, arms):
    audits = {"as programmed": demo, "retimed": demo.suggestion.audit(), "seven joints": arms(7)}
    figure = charts.variants_compared(audits)
    wanted = {
        "x": [100 * np.nanmax(peak_shares(a.rates)) for a in audits.values()], "x2": [np.nanmin(a.rates.sigma_min) for a in audits.values()],
        "x3": [np.nanmin(a.rates.reserve) for a in audits.values()], "x4": [a.path.duration for a in audits.values()],
    }  # fmt: skip
    for axis, values in wanted.items():
        (bar,) = bars(figure, axis)
        np.testing.assert_allclose(bar.x, values)
    fail, warn = bars(figure, "x5")
    for bar, severity in ((fail, "fail"), (warn, "warn")):
        assert bar.name == severity and list(bar.x) == [sum(f.severity == severity for f in a.finding_list) for a in audits.values()]
    assert fail.marker.pattern.shape != warn.marker.pattern.shape
    assert list(figure.layout.yaxis.ticktext) == list(audits)
    assert bars(figure, "x")[0].customdata[0] == "174 %, joint j4 at 27.525 s"
    titles = [figure.layout[f"xaxis{k}"].title.text.replace("<br>", " ") for k in ("", 2, 3, 4, 5)]
    assert titles == ["worst joint speed, % of its limit", "least sigma_min", "least reserve, times programmed", "duration, s", "findings"]


def test_bounds_are_drawn_where_all_variants_share_them(demo, arms):
    def drawn(figure, axis):
        return [shape.x0 for shape in figure.layout.shapes if shape.xref == axis]

    same = charts.variants_compared({"a": demo, "b": arms(6)})
    assert drawn(same, "x") == [100.0] and drawn(same, "x2") == [0.06, 0.02] and drawn(same, "x3") == [1.0]
    other = replace(demo, cell=replace(demo.cell, thresholds=replace(demo.cell.thresholds, sigma_min_warn=0.1)))
    assert drawn(charts.variants_compared({"a": demo, "b": other}), "x2") == []


def test_an_audit_that_reaches_nothing_and_odd_names_are_shown(gap):
    poses = linkage.poses(*gap.cell.chain, gap.joints[:20])
    poses[:, 0, 3] += 9.0
    nothing = pa.audit(path_of_poses(np.linspace(0, 1, 20), poses), gap.cell)
    assert not nothing.motion.reached.any()
    figure = charts.variants_compared({"<i>far</i> away": nothing, 7: gap})
    assert figure.layout.yaxis.ticktext == ("&lt;i&gt;far&lt;/i&gt; away", "7")
    words = [t.text for t in figure.data if t.type == "scatter"]
    assert [column[0] for column in words[:3]] == ["none"] * 3 and figure.to_json()


@pytest.mark.parametrize("audits", [{}, [], None, "audits"])
def test_what_is_no_mapping_of_audits_is_refused(audits):
    with pytest.raises(ValueError, match="expected a mapping of names to audits"):
        charts.variants_compared(audits)
