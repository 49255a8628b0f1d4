"""Large timed CSV files are read by an engine in blocks: the same values and the same words as by the careful reader."""

import os
import random
import sys
import tracemalloc

import numpy as np
import pytest

import pathaudit as pa
from pathaudit.reading import csv_table, sources

HEADER = "t_s,x_mm,y_mm,z_mm,i,j,k,process,label,wire"
ROWS = 900


def seam(rows=ROWS):
    rng = random.Random(3)
    return [f"{0.01 * k:.17g},{rng.uniform(-900, 900)!r},{-k},{k}e-2,0,0,-1,{k % 2},leg {k % 3},w{k}" for k in range(rows)]


@pytest.fixture(params=["pyarrow", "pandas"])
def engine(request, monkeypatch):
    """Files of any size are large, blocks are small, and one of the two engines is there."""
    if request.param == "pyarrow":
        pytest.importorskip("pyarrow")
    else:
        monkeypatch.setitem(sys.modules, "pyarrow", None)
        monkeypatch.setitem(sys.modules, "pyarrow.csv", None)
    monkeypatch.setattr(sources, "LARGE", 1)
    monkeypatch.setattr(csv_table, "BLOCK", 2000)
    return request.param


def outcome(file):
    try:
        path = pa.read_path(file)
    except pa.ReadError as error:
        return str(error)
    return path


def both(file, monkeypatch):
    """What the careful reader and the engine make of a file."""
    fast = outcome(file)
    with monkeypatch.context() as patch:
        patch.setattr(sources, "LARGE", 1 << 40)
        return outcome(file), fast


def same(careful, fast):
    if isinstance(careful, str) or isinstance(fast, str):
        assert careful == fast
        return
    for field in ("time", "position", "rotation", "process", "source_line"):
        np.testing.assert_array_equal(getattr(careful, field), getattr(fast, field))
    assert (careful.label, careful.columns, careful.sha256) == (fast.label, fast.columns, fast.sha256)
    assert [tuple(cells) for cells in fast.cells] == list(careful.cells)


CHANGES = {
    "as it is": lambda lines: lines,
    "windows": lambda lines: [line + "\r" for line in lines],
    "comments and blank lines": lambda lines: [*lines[:300], "# half", "  # way", "", "  ", *lines[300:600], "#", *lines[600:]],
    "quotes": lambda lines: [*lines[:400], lines[400].replace("leg 1", '"leg ""1"", left"'), *lines[401:]],
    "letters": lambda lines: [line.replace("leg 1", "Größe 角") for line in lines],
    "plus signs and blanks": lambda lines: [line.replace(",0,0,-1", ", 0 ,+0,-1.") for line in lines],
    "semicolons": lambda lines: [line.replace(",", ";") for line in lines],
    "no number": lambda lines: [*lines[:700], lines[700].replace(",-700,", ",seven,"), *lines[701:]],
    "a truth": lambda lines: [*lines[:700], lines[700].replace(",-700,", ",True,"), *lines[701:]],
    "grouped": lambda lines: [*lines[:700], lines[700].replace(",-700,", ",-7_00,"), *lines[701:]],
    "empty": lambda lines: [*lines[:700], lines[700].replace(",-700,", ",,"), *lines[701:]],
    "infinite": lambda lines: [*lines[:700], lines[700].replace(",-700,", ",1e999,"), *lines[701:]],
    "formula": lambda lines: [*lines[:700], lines[700].replace(",-700,", ",=A1+1,"), *lines[701:]],
    "decimal comma": lambda lines: [*lines[:700], lines[700].replace(",-700,", ",-700,5,"), *lines[701:]],
    "two widths that cancel": lambda lines: [*lines[:700], lines[700] + ",", lines[701].rsplit(",", 1)[0], *lines[702:]],
    "short": lambda lines: [*lines[:-1], lines[-1].rsplit(",", 1)[0]],
    "latin-1": lambda lines: [*lines[:700], lines[700].replace("leg", "Stra\udce4e"), *lines[701:]],
    "binary": lambda lines: [*lines[:700], lines[700].replace("leg", "l\0g"), *lines[701:]],
    "bad quotes": lambda lines: [*lines[:700], lines[700].replace("leg", 'l"g"'), *lines[701:], '"'],
    "time": lambda lines: [*lines[:700], lines[600], *lines[701:]],
    "process": lambda lines: [*lines[:700], lines[700].replace(",0,leg", ",0.5,leg"), *lines[701:]],
}


@pytest.mark.parametrize("change", CHANGES.values(), ids=list(CHANGES))
@pytest.mark.parametrize("end", ["\n", "", "\n\n"], ids=["end", "no end", "blank end"])
def test_the_same_values_and_the_same_words(tmp_path, monkeypatch, engine, change, end):
    file = tmp_path / "seam.csv"
    lines = change(["# a comment", HEADER, *seam()])
    file.write_bytes(("\n".join(lines) + end).encode("utf-8", "surrogateescape"))
    same(*both(file, monkeypatch))


def test_old_line_ends_and_one_endless_line(tmp_path, monkeypatch, engine):
    file = tmp_path / "seam.csv"
    file.write_bytes("\r".join([HEADER, *seam()]).encode())
    same(*both(file, monkeypatch))
    file.write_bytes(b"t_s," * 50_000)
    assert "line 1: found a header row of 200,000 bytes, expected at most 100,000" in outcome(file)


def test_damaged_files_come_out_the_same(tmp_path, monkeypatch, engine):
    """In a small file the first bad column is named, in a large one the first bad block: only the verdict is compared."""
    rng, text = random.Random(11), "\n".join([HEADER, *seam(120)]).encode()
    for _ in range(250):
        data = bytearray(text)
        for _ in range(rng.randint(1, 2)):
            at = rng.randrange(len(data))
            data[at : at + rng.randrange(3)] = rng.choice([b",", b"\n", b'"', b"#", b";", b"\r", b"-", b"e9", b"\xff", b"\0", b" ", b"True", b"\t", b"\x0b", b"\n \n", b"inf"])
        (tmp_path / "seam.csv").write_bytes(data)
        careful, fast = both(tmp_path / "seam.csv", monkeypatch)
        assert isinstance(careful, str) == isinstance(fast, str), (careful, fast)
        if not isinstance(careful, str):
            same(careful, fast)


def test_texts_are_split_when_they_are_asked_for(tmp_path, engine):
    file = tmp_path / "seam.csv"
    file.write_text("\n".join([HEADER, *seam()]))
    wire = pa.read_path(file).cells[-1]
    assert len(wire) == ROWS and wire[0] == "w0" and wire[-1] == f"w{ROWS - 1}" and wire[450:453] == ("w450", "w451", "w452")
    assert wire == [f"w{k}" for k in range(ROWS)] and wire != ["w0"]
    with pytest.raises(IndexError):
        wire[ROWS]


def test_a_file_that_changes_after_it_was_read_is_told(tmp_path, engine):
    file = tmp_path / "seam.csv"
    file.write_text("\n".join([HEADER, *seam()]))
    path = pa.read_path(file)
    (tmp_path / "new.csv").write_text("something else")
    os.replace(tmp_path / "new.csv", file)
    assert path.cells[-1][5] == "w5"  # the file that was read is still there, without a name
    file.write_text("\n".join([HEADER, *seam()]))
    path = pa.read_path(file)
    file.write_text("shorter")
    with pytest.raises(pa.ReadError, match="found a file that has changed since it was opened"):
        list(path.cells[-1])


def test_the_retimed_file_of_a_large_path_has_its_texts(tmp_path, engine):
    from types import SimpleNamespace

    from pathaudit.report.tables import retimed_csv

    file = tmp_path / "seam.csv"
    file.write_text("\n".join([HEADER, *seam()]) + "\n")
    path = pa.read_path(file)
    again = SimpleNamespace(time=path.time * 2, rates=SimpleNamespace(motion=SimpleNamespace(path=path)))
    written = [line.split(",", 1)[1] for line in retimed_csv(again).splitlines()]
    assert written == [line.split(",", 1)[1] for line in file.read_text().splitlines()]


def test_little_memory_is_needed_beside_the_arrays(tmp_path):
    """What Python and NumPy take while a file of 400,000 rows is read, of which the system hands over the large arrays themselves; an engine's own
    memory is measured by the benchmarks."""
    n = 400_000
    file = tmp_path / "long.csv"
    with open(file, "w") as stream:
        stream.write("t_s,x_mm,y_mm,z_mm,qw,qx,qy,qz\n")
        stream.writelines(f"{0.004 * k:.3f},{k % 977}.5,{k % 31},{k % 7},1,0,0,0\n" for k in range(n))
    pa.read_path(file)
    tracemalloc.start()
    path = pa.read_path(file)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    arrays = sum(array.nbytes for array in (path.time, path.position, path.rotation, path.process, path.source_line))
    assert path.samples == n and peak < arrays


def test_rows_that_grow_shorter_than_those_of_the_first_block(tmp_path, monkeypatch, engine):
    """The room that the first block lets expect is too small, again and again; what was put in stays."""
    monkeypatch.setattr(sources, "LARGE", 1)
    file = tmp_path / "seam.csv"
    rows = [f"{k},{1 / (k + 1):.{max(2, 40 - k // 12)}f},{-k},{k}e-2,0,0,-1,{k % 2},{'long ' * max(0, 9 - k // 40)},w{k}" for k in range(ROWS)]
    for end in ("\n", "\r\n", "\r"):
        file.write_bytes(end.join([HEADER, *rows]).encode())
        same(*both(file, monkeypatch))


def test_the_line_of_what_is_no_sample(tmp_path, engine):
    """Far behind comments, in a block read by the engine: what only the path's own checks refuse."""
    file, lines = tmp_path / "seam.csv", ["# one", HEADER, *seam()]
    lines[300:300] = ["", "# two"]
    for old, new, words in ((",0,0,-1,", ",0,0,-1.1,", "line 801: found a tool axis of length 1.1"), (",0,leg", ",7,leg", "line 801: found process = 7,"),
                            (lines[800].split(",")[0], "7e12", "line 801: found time 7e+12 s"), (",-796,", ",-796e9,", "line 801: found a tool centre point at -7.96e+08 m")):  # fmt: skip
        assert old in lines[800]
        file.write_text("\n".join([*lines[:800], lines[800].replace(old, new, 1), *lines[801:]]))
        assert words in outcome(file)
