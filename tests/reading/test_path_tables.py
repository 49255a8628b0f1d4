"""Timed paths from Parquet and Feather tables."""

import io
import subprocess
import sys

import numpy as np
import pandas as pd
import pytest

import pathaudit as pa
from pathaudit.reading import tables

arrow = pytest.importorskip("pyarrow")
from pyarrow import feather, parquet  # noqa: E402

N = 7
FRAME = {
    "t_ms": np.arange(N, dtype=np.int64) * 10, "x_m": np.linspace(0, 1, N), "y_m": np.linspace(0, 1, N, dtype=np.float32), "z_m": np.zeros(N),
    "qw": np.ones(N), "qx": np.zeros(N), "qy": np.zeros(N), "qz": np.zeros(N), "process": np.arange(N) % 2 == 0,
    "label": [f"leg {k // 3}" for k in range(N)], "wire": [None, 8.5] * 3 + [1.0], "count": np.arange(N, dtype=np.uint8),
}  # fmt: skip


def written(table, kind, **options):
    table = table if isinstance(table, arrow.Table) else arrow.table(table)
    stream = io.BytesIO()
    parquet.write_table(table, stream, **options) if kind == "parquet" else feather.write_feather(table, stream, **options)
    return stream.getvalue()


@pytest.fixture(params=["parquet", "feather"])
def kind(request):
    return request.param


@pytest.fixture
def read(tmp_path, kind):
    def read(table, **options):
        file = tmp_path / "seam.csv"  # the content counts
        file.write_bytes(table if isinstance(table, bytes) else written(table, kind, **options))
        return pa.read_path(file)

    return read


@pytest.fixture
def refused(read):
    def refused(table, **options):
        with pytest.raises(pa.ReadError) as caught:
            read(table, **options)
        assert "\n" not in str(caught.value)
        return str(caught.value)

    return refused


def test_a_plain_table(read):
    p = read(FRAME)
    assert p.time.tolist() == (np.arange(N) * 10 / 1000).tolist() and p.position[:, 0].tolist() == FRAME["x_m"].tolist()
    assert p.position[:, 1].tolist() == FRAME["y_m"].astype(float).tolist()
    assert p.process.tolist() == FRAME["process"].tolist() and p.label == tuple(FRAME["label"]) and not p.spin_free
    assert p.columns == tuple(FRAME) and p.cells[-2] == (None, 8.5) * 3 + (1.0,) and p.cells[-1][2] == 2 and p.cells[-1][1:3] == (1, 2)
    assert p.source_line is None


def test_the_same_as_from_a_data_frame(read, kind):
    frame = pd.DataFrame(FRAME).astype({"label": "category"})
    stream = io.BytesIO()
    frame.to_parquet(stream) if kind == "parquet" else frame.to_feather(stream)
    one, other = read(stream.getvalue()), pa.path_from(frame)
    for field in ("time", "position", "rotation", "process"):
        np.testing.assert_array_equal(getattr(one, field), getattr(other, field))
    assert one.label == other.label


def test_many_row_groups_and_compressions(read, kind):
    n = 200_000
    long = {"t_s": np.arange(n) * 0.004, "x_mm": np.sin(np.arange(n)), **{c: np.zeros(n) for c in ("y_mm", "z_mm", "i", "j")}, "k": np.ones(n)}
    for options in ({"compression": "zstd"}, {"row_group_size": 1000}) if kind == "parquet" else ({"compression": "zstd"}, {"compression": "uncompressed", "chunksize": 999}):
        p = read(long, **options)
        assert p.samples == n and p.position[:, 0].tolist() == (long["x_mm"] / 1000).tolist()


@pytest.mark.parametrize(
    "change, words",
    [
        ({"x_m": [None, *[0.0] * (N - 1)]}, "row 1, column x_m: found no value, expected a number"),
        ({"x_m": [0.0, np.nan, *[0.0] * (N - 2)]}, "row 2, column x_m: found nan, expected a finite number"),
        ({"x_m": [*["1.5"] * (N - 1), "1,5"]}, f"row {N}, column x_m: found '1,5', expected a number with a decimal point (write a point"),
        ({"x_m": [*["1.5"] * (N - 1), "=B2"]}, f"row {N}, column x_m: found '=B2'"),
        ({"x_m": np.arange(N).astype("M8[ns]")}, "column x_m: found values of type timestamp"),
        ({"wire": [[1, 2]] * N}, "column 'wire': found values of type list"),
        ({"wire": [b"a"] * N}, "column 'wire': found values of type binary"),
        ({"process": [2] * N}, "row 1: found process = 2"),
        ({"t_ms": [0] * N}, "row 2: found time 0 s after 0 s in row 1"),
        ({"x_m": None}, "header: found the columns"),
        ({name: None for name in FRAME if name != "wire"}, "columns: found 'wire', expected column names"),
        ({name: values[:1] for name, values in FRAME.items()}, "found 1 sample, expected at least 2"),
        ({name: values[:0] for name, values in FRAME.items() if name not in ("label", "wire")} | {"label": None, "wire": None}, "found 0 samples"),
    ],
)
def test_refusals_name_the_row(refused, kind, change, words):
    message = refused({name: values for name, values in {**FRAME, **change}.items() if values is not None})
    mend = "; a recorded log with holes is repaired with --format recorded" if words.split("found ")[1].startswith(("no value", "nan")) else ""
    assert words in message and message.endswith(f"(taken for a {kind.capitalize()} table{mend})")


def test_columns_that_stand_twice(refused):
    table = arrow.table(FRAME)
    assert "column 'x_m': found the column twice" in refused(table.append_column("x_m", table["x_m"]))


def test_texts_that_are_numbers_are_read(read):
    p = read({**FRAME, "x_m": [f"{k}.5" for k in range(N)]})
    assert p.position[3, 0] == 3.5 and p.cells[1][3] == "3.5"


def test_a_small_file_that_claims_much_is_refused(refused, kind, monkeypatch):
    monkeypatch.setattr(tables, "ROOM", 1 << 20)
    monkeypatch.setattr(tables, "MULTIPLE", 2)
    n = 300_000
    long = {"t_ms": np.arange(n), **{c: np.zeros(n) for c in ("x_m", "y_m", "z_m", "i", "j")}, "k": np.ones(n)}
    assert "found a table whose values take more than" in refused(long, compression="zstd")


def test_a_truncated_or_damaged_table_is_refused_in_one_line(refused, kind):
    data = written(FRAME, kind)
    for end in (7, 50, len(data) // 2, len(data) - 9):
        assert "table that cannot be read" in refused(data[:end])


def test_without_pyarrow_one_line_says_what_to_install(refused, kind, monkeypatch):
    data = written(FRAME, kind)
    monkeypatch.setitem(sys.modules, "pyarrow", None)
    assert "found a Parquet table" in refused(data).replace("Feather", "Parquet") and "pip install 'pathaudit[tables]'" in refused(data)


def test_pyarrow_is_loaded_for_tables_only(tmp_path):
    (tmp_path / "a.csv").write_text("t_s,x_m,y_m,z_m,i,j,k\n0,0,0,0,0,0,1\n1,0,0,0,0,0,1\n")
    code = f"import sys, pathaudit as pa; pa.read_path({str(tmp_path / 'a.csv')!r}); sys.exit('pyarrow' in sys.modules or 'pandas' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code]).returncode == 0


def test_days_outside_of_the_calendar_are_handed_through_as_texts(read):
    days = arrow.array([2**60] * N, arrow.timestamp("us"))
    p = read(arrow.table({**FRAME, "day": days}))
    assert list(p.cells[-1]) == [arrow.scalar(2**60, arrow.timestamp("us")).cast(arrow.string()).as_py()] * N
