"""The reserve along the path."""

import numpy as np
import pytest

from pathaudit import charts


@pytest.mark.parametrize("n", [2, 6, 7, 9])
def test_the_reserve_and_the_joint_that_is_loaded_most(arms, n):
    audit = arms(n)
    figure = charts.reserve_along_path(audit)
    reserve, loaded = figure.data[0], next(t for t in figure.data if t.name.startswith("joint"))
    np.testing.assert_allclose(reserve.y, audit.rates.reserve)
    names, share = np.array(audit.cell.arm.joint_names), audit.rates.speed_share
    assert list(loaded.text) == list(names[share.argmax(axis=1)])
    np.testing.assert_allclose(loaded.customdata, 100 * share.max(axis=1))
    np.testing.assert_array_equal(loaded.y, share.argmax(axis=1))
    assert list(figure.layout.yaxis2.ticktext) == list(names) and figure.layout.yaxis.type == "log"


def test_the_line_of_one_is_drawn_and_within_the_range(demo):
    figure = charts.reserve_along_path(demo)
    limit = next(t for t in figure.data if t.name == "at the limit")
    assert list(limit.y) == [1.0, 1.0] and limit.line.dash == "dash"
    low, high = 10.0 ** np.array(figure.layout.yaxis.range)
    assert low < np.nanmin(demo.rates.reserve) and 1.0 < high <= 1000.0
    assert "times" in figure.layout.yaxis.title.text and "% of its speed limit" in next(t for t in figure.data if t.name.startswith("joint")).hovertemplate


def test_where_the_arm_rests_there_is_a_gap(demo):
    rests = np.isinf(demo.rates.reserve)
    assert rests.any()
    assert np.isnan(np.asarray(charts.reserve_along_path(demo).data[0].y)[rests]).all()
