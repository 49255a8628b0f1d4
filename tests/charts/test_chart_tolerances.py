"""Charts of a study under tolerances."""

import numpy as np
import plotly.graph_objects as go
import pytest
from tolerant_cells import EVERY, near_a_limit

from pathaudit import charts
from pathaudit.spread.study import study


@pytest.fixture(scope="module")
def wide():
    return study(near_a_limit(2, **EVERY), draws=200)


def test_bars_are_the_shares_the_longest_first_and_sum_to_all(wide):
    figure = charts.sensitivities(wide)
    bars = figure.data[0]
    told = [s for s in wide.sensitivities() if s.share > 0]
    assert list(bars.y[:5]) == [s.dimension.name for s in told[:5]] and sum(bars.x) == pytest.approx(100.0)
    np.testing.assert_allclose(bars.x[:5], [100 * s.share for s in told[:5]])
    assert wide.name(wide.deciding) in figure.layout.title.text and figure.layout.yaxis.autorange == "reversed"
    assert len(bars.x) <= 15 and (len(told) <= 15 or bars.y[-1] == f"{len(told) - 14} more")


def test_any_finding_can_be_asked_for_and_an_unknown_one_is_refused(wide):
    figure = charts.sensitivities(wide, finding="joint speed, j2")
    assert "joint speed, j2" in figure.layout.title.text and charts.image_options(figure)["toImageButtonOptions"]["filename"] == "sensitivities-joint-speed-j2"
    with pytest.raises(ValueError, match="expected one of unreachable"):
        charts.sensitivities(wide, finding="joint speed, j22")


@pytest.mark.parametrize("along", ["time", "distance"])
def test_the_band_holds_the_draws_and_the_line_is_the_cell_as_stated(wide, along):
    figure = charts.bands_along_path(wide, along=along)
    by_name = {(t.name, t.yaxis): t for t in figure.data}
    low, high = by_name["5 % of the draws are below", "y"], by_name["90 % of the draws", "y"]
    stated, middle = by_name["as stated", "y"], by_name["middle of the draws", "y"]
    np.testing.assert_allclose(stated.y, 100 * wide.audit.rates.speed_share.max(axis=1))
    np.testing.assert_allclose(low.y, 100 * wide.bands.busiest[0])
    assert (np.array(low.y) <= np.array(middle.y)).all() and (np.array(middle.y) <= np.array(high.y)).all()
    np.testing.assert_allclose(by_name["as stated", "y2"].y, wide.audit.rates.sigma_min)
    assert high.fill == "tonexty" and list(figure.data).index(high) == list(figure.data).index(low) + 1
    assert type(figure) is go.Figure and figure.to_json() == charts.bands_along_path(wide, along=along).to_json()


def test_where_draws_do_not_reach_the_band_has_a_gap(wide):
    from dataclasses import replace

    share = wide.bands.busiest.copy()
    share[2, 10:20] = np.inf
    figure = charts.bands_along_path(replace(wide, bands=replace(wide.bands, busiest=share)))
    high = next(t for t in figure.data if t.name == "90 % of the draws")
    assert np.isnan(np.asarray(high.y, float)[10:20]).all() and np.isfinite(np.asarray(high.y, float)[21:]).all()
