"""Timed paths from CSV files: every allowed form of the text, every refusal with its line, and files made of rubbish."""

import csv
import io
import os
import random
import threading

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

import pathaudit as pa

pytestmark = pytest.mark.filterwarnings("error")

HEADER = "t_s,x_mm,y_mm,z_mm,i,j,k,process,label,wire"
ROWS = ["0.0,0,0,0,0,0,-1,1,start,8.50", "0.5,10.5,0,0,0,0,-1,1,seam,08.5", "1.25,21,-3e0,0,0,0,-1,0,end,?"]
SEAM = "\n".join([HEADER, *ROWS]) + "\n"


@pytest.fixture
def read(tmp_path):
    def read(text, name="seam.csv"):
        file = tmp_path / name
        file.write_bytes(text if isinstance(text, bytes) else text.encode("utf-8"))
        return pa.read_path(file)

    return read


@pytest.fixture
def refused(read, tmp_path):
    def refused(text):
        with pytest.raises(pa.ReadError) as caught:
            read(text)
        message = str(caught.value)
        assert message.startswith(f"{tmp_path / 'seam.csv'}: ") and "\n" not in message
        return message.removeprefix(f"{tmp_path / 'seam.csv'}: ")

    return refused


def same(one, other):
    for field in ("time", "position", "rotation", "process"):
        np.testing.assert_array_equal(getattr(one, field), getattr(other, field))
    assert one.label == other.label and one.columns == other.columns and one.cells == other.cells


def test_a_plain_file(read):
    p = read(SEAM)
    assert p.time.tolist() == [0.0, 0.5, 1.25]
    assert p.position.tolist() == [[0, 0, 0], [0.0105, 0, 0], [0.021, -0.003, 0]]
    assert p.process.tolist() == [True, True, False] and p.label == ("start", "seam", "end")
    assert p.columns == tuple(HEADER.split(",")) and p.spin_free
    assert p.cells[-1] == ("8.50", "08.5", "?") and p.cells[0] == ("0.0", "0.5", "1.25")


@pytest.mark.parametrize(
    "change",
    [
        lambda text: text.replace("\n", "\r\n"),
        lambda text: text.replace("\n", "\r"),
        lambda text: text.rstrip("\n"),
        lambda text: text + "\n\n",
        lambda text: text.replace(",", ";"),
        lambda text: text.replace(",", "\t"),
        lambda text: "\ufeff" + text,
        lambda text: "# made by hand; with, all\tdelimiters\n  # and more\n" + text.replace("\n0.5,", "\n\n# half way\n0.5,"),
        lambda text: text.replace("x_mm", " x_mm "),
        lambda text: text.replace("start", '"start"').replace("t_s", '"t_s"'),
        lambda text: "\ufeff# first line a comment\n" + text,
    ],
)
def test_every_form_of_the_text_reads_the_same(read, change):
    same(read(change(SEAM)), read(SEAM))


def test_labels_with_delimiters_and_quotes(read):
    text = SEAM.replace("seam", '"seam 2, upper ""A"" side"')
    assert read(text).label[1] == 'seam 2, upper "A" side'


def test_the_delimiter_is_the_one_that_shows_known_columns(read):
    text = "t_s;x_mm;y_mm;z_mm;i;j;k;heat, in kJ\n0;0;0;0;0;0;1;1,5\n1;1;0;0;0;0;1;1,6\n"
    assert read(text).cells[-1] == ("1,5", "1,6")


def test_the_hash_is_that_of_the_bytes(read):
    import hashlib

    assert read(SEAM).sha256 == hashlib.sha256(SEAM.encode()).hexdigest()


@settings(deadline=None)
@given(st.lists(st.floats(-1e3, 1e3), min_size=2, max_size=20))
def test_numbers_are_the_doubles_that_python_reads(tmp_path_factory, values):
    file = tmp_path_factory.mktemp("csv") / "n.csv"
    texts = [f"{v:.17g}" for v in values]
    file.write_text("t_s,x_m,y_m,z_m,i,j,k\n" + "".join(f"{n},{text},0,0,0,0,1\n" for n, text in enumerate(texts)))
    assert pa.read_path(file).position[:, 0].tolist() == [float(text) for text in texts]


@settings(deadline=None)
@given(st.lists(st.text(st.characters(exclude_categories=["Cs", "Cc", "Zl", "Zp"])), min_size=2, max_size=6), st.sampled_from([",", ";", "\t"]))
def test_free_text_is_handed_through_untouched(tmp_path_factory, texts, delimiter):
    file = tmp_path_factory.mktemp("csv") / "n.csv"
    buffer = io.StringIO()
    writer = csv.writer(buffer, delimiter=delimiter, lineterminator="\n")
    writer.writerow(["t_s", "x_m", "y_m", "z_m", "i", "j", "k", "label"])
    writer.writerows([n, 0, 0, 0, 0, 0, 1, text] for n, text in enumerate(texts))
    file.write_bytes(buffer.getvalue().encode("utf-8"))
    assert pa.read_path(file).label == tuple(texts)


CELLS_THAT_ARE_NO_NUMBERS = [
    ("", "found an empty cell, expected a number"),
    ("  ", "found an empty cell"),
    ("ten", "found 'ten', expected a number with a decimal point"),
    ("1.5mm", "found '1.5mm'"),
    ("1_000", "found '1_000'"),
    ("١٢", "found '١٢'"),
    ("0x10", "found '0x10'"),
    ("nan", "found nan, expected a finite number"),
    ("-inf", "found -inf, expected a finite number"),
    ("1e999", "found inf, expected a finite number"),
    ("=A1+1", "found '=A1+1'"),
    ('"10,5"', "found '10,5', expected a number with a decimal point (write a point in place of the decimal comma)"),
]


@pytest.mark.parametrize("cell, words", CELLS_THAT_ARE_NO_NUMBERS)
def test_cells_that_are_no_numbers(refused, cell, words):
    message = refused("# comment\n\n" + SEAM.replace("10.5", cell))
    assert message.startswith(f"line 5, column x_mm: {words}")


@pytest.mark.parametrize(
    "text, words",
    [
        (b"", "found an empty file"),
        (b" \r\n\n \t", "found an empty file"),
        ("# only\n# comments\n", "found only comments, expected a header row and samples"),
        (HEADER, "found 0 samples, expected at least 2"),
        (HEADER + "\n# none\n", "found 0 samples"),
        ("\n".join([HEADER, ROWS[0]]), "found 1 sample, expected at least 2"),
        ("\n".join(ROWS), "header: found '0.0, 0, 0, 0, 0, 0, -1, 1, start, 8.50', expected column names such as t_s"),
        ("hello world\n", "found text that begins with 'hello world', expected a path: CSV with t_s,x_mm,y_mm,z_mm and an orientation, points with a speed"),
        (SEAM.replace("wire", "x_mm"), "header: found the column 'x_mm' twice"),
        (SEAM.replace("x_mm", "x"), "header: found a column 'x' without a unit, expected the tool centre point's x as x_mm, x_m or x_in"),
        (SEAM.replace("\n0.5,", "\n0.5,7,"), "line 3: found 11 cells, expected 10 as in the header; a decimal comma"),
        (SEAM.replace(",seam,08.5", ""), "line 3: found 8 cells, expected 10 as in the header"),
        (SEAM + ",,,,,,,,,\n", "line 5, column t_s: found an empty cell"),
        (SEAM.replace("1.25", "0.5"), "line 4: found time 0.5 s after 0.5 s in line 3, expected times that strictly increase"),
        ("# a\n" + SEAM.replace("1.25", "\n#\n0.25"), "line 7: found time 0.25 s after 0.5 s in line 4"),
        (SEAM.replace(",-1,0", ",-0.9,0"), "line 4: found a tool axis of length 0.9 (i, j, k), expected length 1"),
        (SEAM.replace(",-1,0", ",-1,yes"), "line 4, column process: found 'yes'"),
        (SEAM.replace(",-1,0", ",-1,0.5"), "line 4: found process = 0.5, expected 1 while the process runs or 0 on an air move"),
        (SEAM.replace("seam", '"seam'), "line 3: found quotes that cannot be read (unexpected end of data)"),
        (SEAM.replace("seam", '"sea"m'), "line 3: found quotes that cannot be read"),
        (SEAM.encode("utf-16"), "found UTF-16 text, expected a path as text saved as UTF-8"),
        (SEAM.encode("utf-16-le"), "found UTF-16 text, expected a path as text saved as UTF-8"),
        (SEAM.encode("utf-16-be"), "found UTF-16 text, expected a path as text saved as UTF-8"),
        (SEAM.replace("seam", "Naht für Blech").encode("latin-1"), "line 3: found a byte 0xfc that is not UTF-8"),
        (SEAM.encode().replace(b"end", b"e\0d"), "line 4: found binary data, expected a timed path"),
        (SEAM.replace(",", "|"), "header: found 't_s|x_mm|y_mm|z_mm|i|j|k|process|label|wire', expected column names"),
        (SEAM.replace("seam", '"' + "x" * 200_000 + '"'), "line 3: found quotes that cannot be read (field larger than"),
    ],
)
def test_refusals_name_the_line(refused, text, words):
    assert refused(text).startswith(words)


def test_a_missing_file_a_folder_and_a_device(tmp_path):
    with pytest.raises(pa.ReadError, match="no such file, expected a timed path"):
        pa.read_path(tmp_path / "none.csv")
    with pytest.raises(pa.ReadError, match="found a folder"):
        pa.read_path(tmp_path)
    with pytest.raises(pa.ReadError, match="found a device"):
        pa.read_path("/dev/zero")
    with pytest.raises(pa.ReadError, match="a name that no file can have"):
        pa.read_path("a\0b")
    with pytest.raises(pa.ReadError, match="cannot be read"):
        pa.read_path(tmp_path / ("x" * 5000))


def test_a_pipe(tmp_path):
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    writer = threading.Thread(target=pipe.write_text, args=(SEAM,))
    writer.start()
    assert pa.read_path(pipe).samples == 3
    writer.join()


def survives(file, data):
    """The file is read, or refused with one line: nothing else."""
    file.write_bytes(data)
    try:
        path = pa.read_path(file)
    except pa.PathAuditError as error:
        assert len(str(error).splitlines()) == 1
    else:
        assert path.samples >= 2 and np.isfinite(path.rotation).all() and (np.diff(path.time) > 0).all()


@settings(max_examples=150, deadline=None)
@given(st.binary(max_size=300))
@example(b"\xef\xbb\xbf")
@example(b'"')
@example(b"t_s\n0\n1\n")
def test_rubbish_is_refused_in_one_line(tmp_path_factory, data):
    survives(tmp_path_factory.mktemp("csv") / "n.csv", data)


@settings(max_examples=150, deadline=None)
@given(st.lists(st.lists(st.sampled_from(["0", "1", "-1", "", "nan", '"', '"a"', "1e400", "#", "x_mm", "\t", "1,5", "i", "t_s"]), max_size=12), max_size=6))
def test_rubbish_tables_are_refused_in_one_line(tmp_path_factory, rows):
    text = HEADER + "\n" + "\n".join(",".join(row) for row in rows)
    survives(tmp_path_factory.mktemp("csv") / "n.csv", text.encode())


def test_damaged_files_are_read_or_refused_in_one_line(tmp_path):
    rng = random.Random(1)
    for _ in range(1500):
        data = bytearray(SEAM.encode())
        for _ in range(rng.randint(1, 4)):
            at = rng.randrange(len(data))
            match rng.randrange(4):
                case 0:
                    data[at] = rng.randrange(256)
                case 1:
                    del data[at : at + rng.randint(1, 20)]
                case 2:
                    data[at:at] = rng.choice([b",", b"\n", b'"', b"#", b";", b"\r", b"-", b"e9", b"\xff", b"\0", b"x_mm"])
                case 3:
                    data[at:at] = data[at : at + rng.randint(1, 40)]
            data = data or bytearray(b" ")
        survives(tmp_path / "seam.csv", bytes(data))
