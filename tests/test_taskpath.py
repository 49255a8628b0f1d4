"""A path from columns in memory: units, orientation forms, refusals, values that do not change."""

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

import pathaudit as pa
from pathaudit.kernels import rotations as rot

pytestmark = pytest.mark.filterwarnings("error")

BASE = {"t_s": [0.0, 0.5, 2.0], "x_mm": [0.0, 30.0, 30.0], "y_mm": [0.0, 40.0, 40.0], "z_mm": [0.0, 0.0, -10.0]}
AXIS = {"i": [0.0] * 3, "j": [0.0] * 3, "k": [-1.0] * 3}
TURNS = Rotation.random(3, rng=np.random.default_rng(0))
QUATERNION = dict(zip(("qw", "qx", "qy", "qz"), TURNS.as_quat(scalar_first=True).T))


def path(*parts, **more):
    return pa.path_from({k: v for part in (*parts, more) for k, v in part.items()})


def without(columns, *names):
    return {k: v for k, v in columns.items() if k not in names}


def refused(*parts, name="arrays", **more):
    with pytest.raises(pa.ReadError) as caught:
        path(*parts, **more)
    assert str(caught.value).startswith(name) and "\n" not in str(caught.value)
    return str(caught.value)


def test_times_positions_and_lengths():
    p = path(BASE, AXIS)
    assert p.time.tolist() == [0.0, 0.5, 2.0] and p.duration == 2.0 and p.samples == 3
    assert p.position.tolist() == [[0, 0, 0], [0.03, 0.04, 0], [0.03, 0.04, -0.01]]
    np.testing.assert_allclose(p.distance, [0.0, 0.05, 0.06], rtol=1e-15)
    assert p.length == p.distance[-1]
    assert p.process.tolist() == [True] * 3 and p.label == ("", "", "")


def test_every_unit_gives_the_same_path():
    plain = path(BASE, AXIS)
    for convert in [
        {"x_mm": ("x_m", 1000.0)},
        {"y_mm": ("y_in", 25.4)},
        {"t_s": ("t_ms", 0.001)},
        {"x_mm": ("x_in", 25.4), "y_mm": ("y_m", 1000.0), "z_mm": ("z_in", 25.4)},
    ]:
        columns = {convert[k][0] if k in convert else k: np.array(v) / (convert[k][1] if k in convert else 1.0) for k, v in BASE.items()}
        other = path(columns, AXIS)
        np.testing.assert_allclose(other.position, plain.position, rtol=1e-15, atol=1e-18)
        np.testing.assert_allclose(other.time, plain.time, rtol=1e-15)


def test_decimal_millimetres_become_the_nearest_metres():
    p = path(BASE, AXIS, x_mm=[123.456, 0.1, 1001.7], t_s=[0, 1, 2])
    assert p.position[:, 0].tolist() == [0.123456, 0.0001, 1.0017]


def test_every_orientation_form_gives_the_same_rotations():
    expected = TURNS.as_matrix()
    rx, ry, rz = TURNS.as_euler("xyz").T
    forms = [QUATERNION, {"rx_rad": rx, "ry_rad": ry, "rz_rad": rz}, {"rx_deg": np.rad2deg(rx), "ry_rad": ry, "rz_deg": np.rad2deg(rz)}]
    for form in forms:
        p = path(BASE, form)
        np.testing.assert_allclose(p.rotation, expected, atol=1e-14)
        assert not p.spin_free


def test_a_tool_axis_leaves_the_spin_free_and_is_carried_without_spin():
    p = path(BASE, {"i": expected_axis()[:, 0], "j": expected_axis()[:, 1], "k": expected_axis()[:, 2]})
    assert p.spin_free
    np.testing.assert_allclose(p.rotation[:, :, 2], expected_axis(), atol=1e-15)
    np.testing.assert_allclose(p.rotation, rot.carry_frames(expected_axis()), atol=1e-15)


def expected_axis():
    return TURNS.as_matrix()[:, :, 2]


@given(st.lists(st.sampled_from([-1.0, 1.0]), min_size=3, max_size=3))
def test_quaternion_signs_do_not_matter(signs):
    flipped = {k: np.array(v) * signs for k, v in QUATERNION.items()}
    np.testing.assert_allclose(path(BASE, flipped).rotation, path(BASE, QUATERNION).rotation, atol=1e-15)


@given(st.floats(-9e-4, 9e-4))
def test_rounded_quaternions_and_axes_are_scaled_to_length_1(error):
    for form in (QUATERNION, AXIS):
        scaled = {k: np.array(v) * (1.0 + error) for k, v in form.items()}
        p = path(BASE, scaled)
        np.testing.assert_allclose(np.swapaxes(p.rotation, 1, 2) @ p.rotation, np.broadcast_to(np.eye(3), (3, 3, 3)), atol=1e-14)


@pytest.mark.parametrize("scale", [0.0, 0.5, 0.998, 1.002, 1e200])
def test_vectors_that_are_not_unit_are_refused(scale):
    for form, title in ((QUATERNION, "quaternion"), (AXIS, "tool axis")):
        scaled = {k: np.array(v) * [1.0, scale, 1.0] for k, v in form.items()}
        message = refused(BASE, scaled)
        assert "row 2" in message and title in message and "length 1" in message


def test_process_label_and_other_columns():
    p = path(BASE, AXIS, process=[0, 1, 1], label=["air", "seam", "seam"], wire_m_min=[0.0, 8.5, 8.5])
    assert p.process.dtype == bool and p.process.tolist() == [False, True, True]
    assert p.label == ("air", "seam", "seam")
    assert p.columns[-1] == "wire_m_min" and list(p.cells[-1]) == [0.0, 8.5, 8.5]


def test_a_data_frame_and_a_mapping_give_the_same_path():
    columns = {**BASE, **QUATERNION, "process": [True, True, False], "label": ["a", "b", ""]}
    one, other = pa.path_from(columns), pa.path_from(pd.DataFrame(columns))
    np.testing.assert_array_equal(one.rotation, other.rotation)
    assert one.columns == other.columns and one.label == other.label and one.process.tolist() == other.process.tolist()


def test_the_hash_follows_the_values():
    assert path(BASE, AXIS).sha256 == path(BASE, AXIS).sha256
    assert path(BASE, AXIS).sha256 != path(BASE, AXIS, x_mm=[0.0, 30.0, 31.0]).sha256
    assert path(BASE, AXIS, label=["a", "b", "c"]).sha256 != path(BASE, AXIS, label=["a", "b", "d"]).sha256


def test_a_path_is_a_value():
    times = np.array([0.0, 0.5, 2.0])
    p = path(BASE, AXIS, t_s=times)
    times[0] = -1.0
    assert p.time[0] == 0.0 and p.cells[0][0] == 0.0
    for array in (p.time, p.position, p.rotation, p.process, p.distance):
        with pytest.raises(ValueError):
            array[0] = 0
    with pytest.raises(AttributeError):
        p.time = times


@pytest.mark.parametrize(
    "columns, words",
    [
        (without({**BASE, **AXIS}, "t_s"), ["time", "t_s or t_ms"]),
        ({**without(BASE, "x_mm"), **AXIS, "x": [0, 1, 2]}, ["'x'", "without a unit", "x_mm, x_m or x_in"]),
        ({**without(BASE, "x_mm"), **AXIS, "X_mm": [0, 1, 2]}, ["'X_mm'", "x_mm, x_m or x_in"]),
        ({**without(BASE, "y_mm"), **AXIS, "y_cm": [0, 1, 2]}, ["'y_cm'", "y_mm, y_m or y_in"]),
        ({**without(BASE, "t_s"), **AXIS, "time": [0, 1, 2]}, ["'time'", "without a unit", "t_s or t_ms"]),
        ({**without(BASE, "t_s"), **AXIS, "time [s]": [0, 1, 2]}, ["'time [s]'", "t_s or t_ms"]),
        ({**without(BASE, "z_mm"), **AXIS}, ["t_s, x_mm, y_mm", "z_mm, z_m or z_in"]),
        ({**BASE, **AXIS, "x_m": [0, 1, 2]}, ["both x_mm and x_m"]),
        ({**BASE, **AXIS, "t_ms": [0, 1, 2]}, ["both t_s and t_ms"]),
        ({**BASE, **AXIS, **QUATERNION}, ["two forms", "qw", "i, j, k", "exactly one"]),
        (BASE, ["no orientation", "i,j,k"]),
        ({**BASE, **without(QUATERNION, "qz")}, ["without qz"]),
        ({**BASE, **without(AXIS, "j")}, ["without j"]),
        ({**BASE, "rx_deg": [0, 0, 0], "ry_rad": [0, 0, 0]}, ["without rz_deg or rz_rad"]),
        ({**BASE, "rx": [0, 0, 0], "ry": [0, 0, 0], "rz": [0, 0, 0]}, ["'rx'", "rx_deg"]),
        ({**BASE, **AXIS, "process": [0, 2, 1]}, ["row 2", "process = 2", "1 while the process runs"]),
        ({**BASE, **AXIS, "t_s": [0, 1, 1]}, ["row 3", "row 2", "strictly increase"]),
        ({**BASE, **AXIS, "t_s": [0, 2, 1]}, ["row 3", "strictly increase"]),
        ({**BASE, **AXIS, "t_s": [0, 1, 1 + 1e-12]}, ["row 3", "strictly increase"]),
        ({**BASE, **AXIS, "t_s": [0, 1, 1e11]}, ["row 3", "1e+11 s", "check the unit"]),
        ({**BASE, **AXIS, "y_mm": [0, np.nan, 1]}, ["row 2, column y_mm", "nan", "finite"]),
        ({**BASE, **AXIS, "y_mm": [0, 1, np.inf]}, ["row 3, column y_mm", "inf"]),
        ({**BASE, **AXIS, "y_mm": [0, 1, 1e9]}, ["row 3", "check the unit"]),
        ({**BASE, **AXIS, "y_mm": [0, 1]}, ["2 and 3 values"]),
        ({**BASE, **AXIS, "y_mm": [[0], [1], [2]]}, ["y_mm", "(3, 1)"]),
        ({**BASE, **AXIS, "y_mm": ["a", "b", "c"]}, ["row 1, column y_mm", "a number"]),
        ({**BASE, **AXIS, "y_mm": [1j, 2j, 3j]}, ["y_mm", "complex128", "numbers"]),
        ({**BASE, **AXIS, "t_s": np.array([0, 1, 2], "M8[s]")}, ["t_s", "datetime64", "numbers"]),
        ({**BASE, **AXIS, "y_mm": [[1, 2], [3], [4]]}, ["y_mm", "different shapes"]),
        ({**BASE, **AXIS, "y_mm": [None, {}, 1]}, ["row 1, column y_mm", "NoneType", "a number"]),
        ({k: v[:1] for k, v in {**BASE, **AXIS}.items()}, ["1 sample", "at least 2"]),
        ({k: v[:0] for k, v in {**BASE, **AXIS}.items()}, ["0 samples", "at least 2"]),
        ({}, ["time"]),
    ],
)
def test_refusals_name_the_place_what_was_found_and_what_is_wanted(columns, words):
    message = refused(columns)
    for word in words:
        assert word in message


def test_columns_of_another_meaning_may_share_a_stem():
    p = path(BASE, QUATERNION, i=[1, 2, 3], x=[7, 8, 9])  # a row counter, and a second x, beside a complete form
    assert p.columns[-2:] == ("i", "x") and not p.spin_free


def test_errors_name_the_source_that_the_caller_named():
    with pytest.raises(pa.ReadError, match="^planner output: "):
        pa.path_from(BASE, name="planner output")


def test_a_path_knows_its_lines_and_how_it_was_made_only_where_somebody_says_so():
    p = path(BASE, AXIS)
    assert p.source_line is None and p.made == ()
    told = replace(p, source_line=np.array([2, 3, 4]), made=("Sampled.",))
    assert told.source_line.tolist() == [2, 3, 4] and told.made == ("Sampled.",) and told.length == p.length


# what is formed in blocks of rows is the same at any block


@pytest.mark.parametrize("form", ["qw qx qy qz", "i j k", "rx_deg ry_deg rz_deg"])
def test_a_path_longer_than_a_block_has_the_same_frames(monkeypatch, form):
    from pathaudit import taskpath

    rng, n = np.random.default_rng(7), 1000
    values = np.cumsum(rng.normal(size=(n, len(form.split()))) * 0.3, axis=0)
    if form[0] != "r":
        values /= np.linalg.norm(values, axis=1)[:, None]
    columns = {"t_s": np.arange(n), "x_mm": rng.normal(size=n), "y_mm": np.zeros(n), "z_mm": np.zeros(n), **dict(zip(form.split(), values.T))}
    whole = pa.path_from(columns)
    monkeypatch.setattr(taskpath, "BLOCK", 7)
    pieces = pa.path_from(columns)
    np.testing.assert_allclose(pieces.rotation, whole.rotation, rtol=0, atol=1e-12)
    for field, value, words in (("x_mm", 1e9, "row 900: found a tool centre point at 1e\\+06 m"), (form.split()[0], np.nan, f"row 900, column {form.split()[0]}")):
        broken = {**columns, field: np.where(np.arange(n) == 899, value, columns[field])}
        with pytest.raises(pa.ReadError, match=words):
            pa.path_from(broken)


def test_a_value_that_is_no_number_is_named_with_its_row():
    columns = {"t_s": [0, 1], "y_mm": [0, 0], "z_mm": [0, 0], "i": [0, 0], "j": [0, 0], "k": [1, 1]}
    for value, words in (("1,5", "row 2, column x_mm: found '1,5', expected a number .write a point"), ("=A1+1", "row 2, column x_mm: found '=A1\\+1'")):
        with pytest.raises(pa.ReadError, match=words):
            pa.path_from({**columns, "x_mm": ["0", value]})
