"""What all charts along the path share: the axis, thinning that keeps peaks, gaps, bands of findings."""

from dataclasses import replace

import numpy as np
import pytest

from pathaudit import charts


def line(figure, k=0):
    return figure.data[k]


def bands(figure, severity):
    """(start, end) pairs of the bands in the first row."""
    trace = next(t for t in figure.data if t.name == f"{severity}: flagged stretch")
    x = np.array(trace.x, dtype=float).reshape(-1, 5)
    np.testing.assert_array_equal(np.array(trace.y, dtype=float).reshape(-1, 5)[:, :4], [[0, 1, 1, 0]] * len(x))
    return x[:, [0, 2]]


def test_time_and_distance_are_what_the_reports_write(demo, gap):
    np.testing.assert_allclose(line(charts.joint_over_time(demo, 0)).x, demo.time)
    np.testing.assert_allclose(line(charts.joint_over_time(demo, 0, along="distance")).x, 1e3 * demo.path.distance)
    assert charts.joint_over_time(demo, 0).layout.xaxis.title.text == "time, s"
    assert charts.joint_over_time(demo, 0, along="distance").layout.xaxis.title.text == "distance along the path, mm"
    np.testing.assert_allclose(line(charts.joint_over_time(gap, 0)).x, np.linspace(0, 3, 301), atol=1e-6)  # not the clock's date
    late = replace(demo, path=replace(demo.path, time=demo.time + 100.0))
    assert line(charts.speeds_along_path(late, demo.suggestion)).x[0] == 100.0


@pytest.mark.parametrize("draw", [lambda a: charts.joint_over_time(a, 0, along="x"), lambda a: charts.reserve_along_path(a, along=None), lambda a: charts.speeds_along_path(a, along="")])
def test_an_unknown_axis_is_refused(demo, draw):
    with pytest.raises(ValueError, match="expected 'time' or 'distance'"):
        draw(demo)


def test_gaps_stay_gaps(gap):
    for figure in (charts.joint_over_time(gap, 1), charts.reserve_along_path(gap), charts.speeds_along_path(gap)):
        y = line(figure).y
        assert np.isnan(y[100:140]).all() and np.isfinite(y[:100]).sum() > 90 and not line(figure).connectgaps
        assert "unreachable" in " ".join(a.text for a in figure.layout.annotations)


def test_a_long_path_keeps_the_peaks_of_every_line_and_every_worst_place(long):
    figure = charts.joint_over_time(long, 1)
    wanted = np.degrees([long.joints[:, 1], long.rates.joint_speed[:, 1], long.rates.joint_acceleration[:, 1]])
    lines = [t for t in figure.data if t.name in ("position", "speed", "acceleration")]
    for trace, values in zip(lines, wanted, strict=True):
        assert trace.y.max() == values.max() and trace.y.min() == values.min() and len(trace.y) <= 5000
    mine = [f for f in long.finding_list if f.joint == "j2"]
    assert mine and {long.time[f.worst] for f in mine} <= set(lines[0].x)


def test_bands_stand_where_the_findings_are_and_tell_severity_by_pattern_and_word(demo):
    figure = charts.reserve_along_path(demo)
    found = {severity: [(f.t_start, f.t_end) for f in demo.finding_list if f.severity == severity] for severity in ("warn", "fail")}
    least = 0.004 * 53.0  # narrower ones are widened to be seen, about their middle
    for severity, spans in found.items():
        drawn = bands(figure, severity)
        np.testing.assert_allclose(drawn.mean(axis=1), np.mean(spans, axis=1))
        np.testing.assert_allclose(np.diff(drawn, axis=1)[:, 0], np.maximum(np.diff(spans, axis=1)[:, 0], least))
    patterns = {t.fillpattern.shape for t in figure.data if t.fillpattern.shape}
    assert len(patterns) == 2
    words = [a.text for a in figure.layout.annotations]
    for number, finding in enumerate(demo.finding_list, 1):
        assert f"{number} {finding.severity}: {finding.kind} {finding.joint or ''}".strip() in words


def test_bands_by_distance(demo):
    drawn = bands(charts.joint_over_time(demo, "j6", along="distance"), "fail")
    (finding,) = [f for f in demo.finding_list if f.joint == "j6"]
    assert drawn.mean() == pytest.approx((finding.from_mm + finding.to_mm) / 2)


def test_the_worst_place_is_marked_with_its_sentence(demo):
    figure = charts.joint_over_time(demo, "j4")
    speed = next(f for f in demo.finding_list if f.joint == "j4" and f.kind == "joint speed")
    mark = next(t for t in figure.data if t.name == "fail: worst place" and t.yaxis == "y2")
    assert mark.x[0] == demo.time[speed.worst] and mark.y[0] == pytest.approx(np.degrees(demo.rates.joint_speed[speed.worst, 3]))
    assert mark.text[0].startswith("3 fail: joint speed j4 711.9 deg/s (limit 410)") and mark.text[0].replace("<br>", " ").endswith(speed.why)
    assert mark.marker.symbol == "x"


def test_labels_of_bands_never_lie_on_each_other(gap):
    figure = charts.reserve_along_path(gap)
    labels = [a for a in figure.layout.annotations if a.yref == "paper"]
    assert len(labels) >= 10
    for a in labels:
        for b in labels:
            if a is not b and a.yshift == b.yshift:
                assert abs(a.x - b.x) * 660 >= 3.2 * (len(a.text) + len(b.text)) - 1e-6


def test_a_path_of_two_samples_is_drawn(arms):
    audit = arms(6, samples=2)
    for figure in (charts.joint_over_time(audit, 0), charts.reserve_along_path(audit), charts.speeds_along_path(audit)):
        assert len(line(figure).x) == 2 and figure.to_json()
