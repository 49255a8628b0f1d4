"""Programmed, retimed and largest tool speed along the path."""

import numpy as np
import pytest

from pathaudit import charts


def named(figure, name):
    return next(t for t in figure.data if t.name == name)


@pytest.mark.parametrize("style", [None, "even", "local"])
def test_the_three_speeds_and_the_factor(demo, style):
    retiming = demo.suggestion if style is None else demo.retime(style)
    figure = charts.speeds_along_path(demo, None if style is None else retiming)
    programmed = 1e3 * demo.rates.tool_speed
    np.testing.assert_allclose(named(figure, "programmed").y, programmed)
    np.testing.assert_allclose(named(figure, "retimed").y, retiming.factor * programmed)
    np.testing.assert_allclose(named(figure, "factor").y, 100 * retiming.factor)
    most = np.asarray(named(figure, "largest that the joint speeds allow").y)
    there = np.isfinite(most)
    np.testing.assert_allclose(most[there], 1e3 * demo.rates.tool_speed_limit[there])
    np.testing.assert_array_equal(there, np.isfinite(demo.rates.tool_speed_limit))
    assert len({named(figure, name).line.dash for name in ("programmed", "retimed", "largest that the joint speeds allow")}) == 3
    assert f"{retiming.duration:.2f} s retimed, 53.00 s as programmed" in figure.layout.title.text.replace("<br>", " ")


def test_the_retimed_speed_is_that_of_the_retimed_path(demo):
    again = demo.suggestion.audit()
    drawn = named(charts.speeds_along_path(demo), "retimed").y
    np.testing.assert_allclose(drawn, 1e3 * again.rates.tool_speed, atol=0.02 * drawn.max())


def test_units_axes_and_what_limits(demo):
    figure = charts.speeds_along_path(demo)
    assert figure.layout.yaxis.title.text == "tool speed, mm/s" and figure.layout.xaxis.title.text == "programmed time, s"
    assert all("mm/s" in named(figure, name).hovertemplate for name in ("programmed", "retimed"))
    words = named(figure, "factor").text
    slowed = demo.suggestion.factor < 1 - 1e-9
    assert [word == "nothing" for word in words] == list(~slowed) and "speed of joint j4" in words
    assert figure.layout.yaxis.range[1] == pytest.approx(1.6 * 1e3 * demo.rates.tool_speed[demo.path.process].max())


def test_a_retiming_of_another_path_is_refused(demo, arms):
    for other in (arms(6).suggestion, "even", 3):
        with pytest.raises(ValueError, match="expected a retiming of this path, of 2121 samples"):
            charts.speeds_along_path(demo, other)
