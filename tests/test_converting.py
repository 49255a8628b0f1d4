"""`convert`: the same doubles from every format to every other, and a line that says what is not kept."""

import itertools
import os

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import pathaudit as pa
from pathaudit import cli
from pathaudit.converting import ENDINGS, WRITTEN, converted, kind_of
from pathaudit.errors import UsageError

pytest.importorskip("pyarrow")

CSV = (
    "t_s,x_mm,y_mm,z_mm,i,j,k,process,label,wire,formula\n"
    "0.0,0.10,1e-3,-0.0,0,0.6,-0.8,1,start,08.5,=A1+1\n"
    '0.1,0.30000000000000004,5e-324,123456789.125e-3,0,0.6,-0.8,0,"a, ""b""",,@x\n'
    "0.30000000000000004,1.7976931348623157e1,-1,2,0,0,-1,1,Größe 角,?,+1\n"
)
NUMBERS = "t_s x_mm y_mm z_mm i j k process".split()


def files(folder):
    return {kind: folder / f"a{ending}" for ending, kind in reversed(ENDINGS.items())}


def bits(path):
    """Every number of a path as its bits."""
    arrays = [path.time, path.position, path.rotation, path.process]
    return [array.tobytes() for array in arrays], path.label, path.columns, path.spin_free


def write(path, file, kind):
    content, lost = converted(path, kind)
    file.write_bytes(content.encode() if isinstance(content, str) else content)
    return lost


@pytest.mark.parametrize("one, other", list(itertools.product(WRITTEN, WRITTEN)))
def test_every_format_to_every_other_and_back(tmp_path, one, other):
    place = files(tmp_path)
    (tmp_path / "source.csv").write_text(CSV, encoding="utf-8")
    first = pa.read_path(tmp_path / "source.csv")
    write(first, place[one], one)
    middle = pa.read_path(place[one])
    write(middle, place[other], other)
    write(pa.read_path(place[other]), place[one], one)
    last = pa.read_path(place[one])
    assert bits(first) == bits(middle) == bits(last) and first.source_line is not None
    for name in ("wire", "formula", "label"):
        k = first.columns.index(name)
        assert list(last.cells[k]) == list(first.cells[k])  # texts that look like numbers or formulas stay texts


def test_a_csv_stays_as_it_is(tmp_path):
    (tmp_path / "source.csv").write_text(CSV, encoding="utf-8")
    assert write(pa.read_path(tmp_path / "source.csv"), tmp_path / "b.csv", "timed") == ()
    assert (tmp_path / "b.csv").read_text(encoding="utf-8") == CSV


@settings(deadline=None, max_examples=60)
@given(st.lists(st.tuples(st.floats(-9e3, 9e3), st.floats(-1e300, 1e300) | st.sampled_from([5e-324, -0.0, 1e308])), min_size=2, max_size=9), st.sampled_from(WRITTEN))
def test_any_double_comes_back(tmp_path_factory, values, kind):
    x, extra = np.array(values).T
    n = len(x)
    path = pa.path_from({"t_s": np.arange(n) / 7, "x_m": x, "y_m": np.zeros(n), "z_m": np.zeros(n), "i": np.zeros(n), "j": np.zeros(n), "k": np.ones(n), "extra": extra})
    file = files(tmp_path_factory.mktemp("c"))[kind]
    assert write(path, file, kind) == ()
    again = pa.read_path(file)
    assert bits(again) == bits(path)
    assert np.array([float(value) for value in again.cells[-1]]).tobytes() == extra.tobytes()


def test_types_of_a_table_are_kept_where_the_format_has_them(tmp_path):
    frame = pd.DataFrame({"t_ms": [0, 10], "x_m": np.float32([0.1, 0.2]), "y_m": 0.0, "z_m": 0.0, "i": 0, "j": 0, "k": 1, "process": [True, False], "wire": [None, 8.5], "day": pd.to_datetime(["2026-01-02", "2026-01-03"])})
    frame.to_parquet(tmp_path / "a.parquet")
    path = pa.read_path(tmp_path / "a.parquet")
    assert write(path, tmp_path / "b.feather", "feather") == ()
    again = pa.read_path(tmp_path / "b.feather")
    assert bits(again) == bits(path) and [str(cells.arrow.type) for cells in again.cells] == [str(cells.arrow.type) for cells in path.cells]
    assert again.cells[-2][0] is None
    lost = write(path, tmp_path / "b.csv", "timed")
    assert len(lost) == 2 and lost[0] == "column 'wire': missing values, which became empty cells" and lost[1].startswith("column 'day': the type ")
    assert bits(pa.read_path(tmp_path / "b.csv")) == bits(path)
    assert write(path, tmp_path / "b.jsonl", "json-lines") == lost[1:]
    assert bits(pa.read_path(tmp_path / "b.jsonl")) == bits(path) and pa.read_path(tmp_path / "b.jsonl").cells[7] == (True, False)


def test_what_is_not_kept_is_said(tmp_path):
    (tmp_path / "a.csv").write_text("# made by hand\n" + CSV, encoding="utf-8")
    lost = write(pa.read_path(tmp_path / "a.csv"), tmp_path / "a.parquet", "parquet")
    assert lost == ("comment and blank lines", "how numbers are spelled (0.10 for 0.1); they are the same doubles")
    rows = '{"t_s": %d, "x_m": 0, "y_m": 0, "z_m": 0, "i": 0, "j": 0, "k": 1, "label": "a\\nb", "more": [1, {"a": 2}], "odd": %s}\n'
    (tmp_path / "a.jsonl").write_text(rows % (0, "1") + rows % (1, '"x"'))
    path = pa.read_path(tmp_path / "a.jsonl")
    assert write(path, tmp_path / "b.csv", "timed") == ("column 'label': line breaks in texts, which became blanks", "column 'more': lists, which became texts")
    again = pa.read_path(tmp_path / "b.csv")
    assert again.label == ("a b", "a b") and again.cells[-2][0] == '[1, {"a": 2}]'
    lost = write(path, tmp_path / "b.parquet", "parquet")
    assert lost == ("column 'more': lists, which became texts", "column 'odd': values of several types, which became texts")
    assert pa.read_path(tmp_path / "b.parquet").label == ("a\nb", "a\nb")
    nan = pa.path_from({"t_s": [0, 1], "x_m": [0, 0], "y_m": [0, 0], "z_m": [0, 0], "i": [0, 0], "j": [0, 0], "k": [1, 1], "heat": [1.0, np.nan]})
    assert write(nan, tmp_path / "c.jsonl", "json-lines") == ("column 'heat': values that are no numbers (nan, inf), which became null",)


def test_the_ending_says_the_format_unless_it_is_asked_for():
    assert kind_of("a.PARQUET") == "parquet" and kind_of("a.bin", "feather") == "feather" and kind_of("a.ndjson") == "json-lines"
    with pytest.raises(UsageError, match="a.xlsx: found the ending '.xlsx', expected one of .csv, .txt"):
        kind_of("a.xlsx")


@pytest.fixture
def here(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "seam.csv").write_text(CSV, encoding="utf-8")
    return tmp_path


def test_the_command_line_converts_and_says_what_it_did(here, capsys):
    assert cli.main(["convert", "seam.csv", "seam.feather"]) == 0
    assert capsys.readouterr().out == "seam.feather: 3 samples as a Feather table\nnot kept: how numbers are spelled (0.10 for 0.1); they are the same doubles\n"
    assert cli.main(["convert", "seam.feather", "out", "--to", "json-lines"]) == 0
    assert capsys.readouterr().out == "out: 3 samples as JSON lines\nnothing was lost: the same columns, the same doubles\n"
    assert bits(pa.read_path("out")) == bits(pa.read_path("seam.csv"))


def test_geometry_is_written_as_samples_and_that_is_said(here, capsys):
    (here / "seam.nc").write_text("%\nN1 G71 G90 G17 G94\nN2 G00 X0 Y0 Z5\nN3 G01 X40 F600\nN4 M02\n")
    assert cli.main(["convert", "seam.nc", "seam.csv.csv", "--axis", "0,0,-1", "--acceleration", "500", "--speed", "200"]) == 0
    assert "not kept: the exact geometry" in capsys.readouterr().out
    assert pa.read_path("seam.csv.csv").length == pytest.approx(pa.read_path("seam.nc", axis="0,0,-1", acceleration_mm_s2=500, speed_mm_s=200).length)


@pytest.mark.parametrize(
    "arguments, words",
    [
        (["convert", "seam.csv"], "the following arguments are required: OUT"),
        (["convert", "seam.csv", "seam.xlsx"], "seam.xlsx: found the ending '.xlsx'"),
        (["convert", "seam.csv", "./seam.csv"], "OUT ./seam.csv: found the same file as the input seam.csv, expected a file of its own"),
        (["convert", "seam.csv", "none/a.csv"], "none/a.csv: cannot be written: there is no folder none"),
        (["convert", "seam.csv", "a.csv", "--to", "xml"], "argument --to: invalid choice: 'xml'"),
        (["convert", "seam.csv", "a.csv", "--format", "xml"], "--format: found 'xml', expected one of timed, waypoints"),
        (["convert", "seam.csv", "a.csv", "--axis", "up"], "--axis: found 'up', expected three numbers i,j,k"),
        (["convert", "seam.csv", "a.csv", "--smooth", "20"], "--smooth: found 20.0, expected no such choice for a timed path (CSV)"),
        (["convert", "seam.csv", "-", "--to", "timed"], "OUT: found '-', expected a file name"),
    ],
)
def test_what_is_wrong_is_said_in_one_line(here, capsys, arguments, words):
    assert cli.main(arguments) == 2
    out, err = capsys.readouterr()
    assert out == "" and err.count("\n") == 1 and words in err
    assert os.listdir(here) == ["seam.csv"]


def test_without_pyarrow_one_line_says_what_to_install(here, capsys, monkeypatch):
    import sys

    monkeypatch.setitem(sys.modules, "pyarrow", None)
    assert cli.main(["convert", "seam.csv", "a.parquet"]) == 2
    assert "cannot be written: it needs the package pyarrow, which this command installs: pip install 'pathaudit[tables]'" in capsys.readouterr().err
