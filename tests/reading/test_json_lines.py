"""Timed paths from JSON lines."""

import json

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import pathaudit as pa
from pathaudit.reading import json_lines

ROWS = [{"t_s": 0.1 * k, "x_mm": k, "y_mm": 0.5, "z_mm": -k / 3, "i": 0, "j": 0.6, "k": -0.8, "process": k > 0, "label": None if k == 1 else f"leg {k}", "wire": [8.5, k]} for k in range(3)]
TEXT = "".join(json.dumps(row) + "\n" for row in ROWS)


@pytest.fixture
def read(tmp_path):
    def read(text):
        (tmp_path / "seam.jsonl").write_bytes(text if isinstance(text, bytes) else text.encode())
        return pa.read_path(tmp_path / "seam.jsonl", "json-lines")

    return read


def test_a_plain_file(read):
    p = read(TEXT)
    assert p.time.tolist() == [0.0, 0.1, 0.2] and p.position[2].tolist() == [0.002, 0.0005, -2 / 3 / 1000]
    assert p.process.tolist() == [False, True, True] and p.label == ("leg 0", "", "leg 2") and p.spin_free
    assert p.columns == tuple(ROWS[0]) and p.cells[-1] == ([8.5, 0], [8.5, 1], [8.5, 2]) and p.source_line.tolist() == [1, 2, 3]


@pytest.mark.parametrize("change", [lambda t: t.replace("\n", "\r\n"), lambda t: "\ufeff" + t, lambda t: t.replace("\n", "\n\n"), lambda t: t.rstrip()])
def test_line_ends_and_blank_lines(read, change):
    np.testing.assert_array_equal(read(change(TEXT)).position, read(TEXT).position)


def test_the_order_of_keys_does_not_matter(read):
    text = "".join(json.dumps(dict(sorted(row.items(), reverse=k == 1))) + "\n" for k, row in enumerate(ROWS))
    np.testing.assert_array_equal(read(text).position, read(TEXT).position)


@pytest.mark.parametrize(
    "change, words",
    [
        (lambda t: t.replace('"x_mm": 1', '"x_mm": "1"'), "line 2, column x_mm: found '\"1\"', expected a number"),
        (lambda t: t.replace('"x_mm": 1', '"x_mm": true'), "line 2, column x_mm: found 'true', expected a number"),
        (lambda t: t.replace('"x_mm": 1', '"x_mm": [1]'), "line 2, column x_mm: found '[1]'"),
        (lambda t: t.replace('"x_mm": 1', '"x_mm": NaN'), "line 2: found text that is no JSON object (NaN is not in JSON)"),
        (lambda t: t.replace('"x_mm": 1', '"x_mm": 1e999'), "line 2, column x_mm: found inf, expected a finite number"),
        (lambda t: t.replace('"x_mm": 1', '"x_mm": 1' + "0" * 400), "line 2, column x_mm: found '1000"),
        (lambda t: t.replace('"x_mm": 1', '"x_mm": 1' + "0" * 5000), "line 2: found text that is no JSON object"),
        (lambda t: t.replace('"x_mm": 1', '"x_mm": 1,5'), "line 2: found text that is no JSON object"),
        (lambda t: t.replace('"x_mm": 1', '"x_mm": 1, "x_mm": 2'), "line 2: found the key 'x_mm' twice"),
        (lambda t: t.replace('"x_mm": 1, ', ""), "line 2: found no 'x_mm', expected the same keys in every line"),
        (lambda t: t.replace('"x_mm": 2', '"x_mm": 2, "new": 1'), "line 3: found a key 'new' that the first line has not"),
        (lambda t: t + "[1]\n", "line 4: found '[1]', which is no JSON object"),
        (lambda t: t + "[" * 100_000 + "\n", "line 4: found values nested too deeply"),
        (lambda t: t + '{"t_s": 9\n', "line 4: found text that is no JSON object"),
        (lambda t: '{"a": 1}\n', "line 1: found the keys 'a', expected keys such as"),
        (lambda t: t.splitlines()[0], "found 1 sample, expected at least 2"),
        (lambda t: t.encode("latin-1").replace(b"leg", b"l\xe4g"), "line 1: found a byte 0xe4 that is not UTF-8"),
    ],
)
def test_refusals_name_the_line(read, change, words):
    with pytest.raises(pa.ReadError) as caught:
        read(change(TEXT))
    assert words in str(caught.value) and "\n" not in str(caught.value)


def test_the_limit_is_stated(read, monkeypatch):
    monkeypatch.setattr(json_lines, "MOST", 2)
    with pytest.raises(pa.ReadError, match="more than 2 lines, expected a shorter file, or the same table as CSV or Parquet"):
        read(TEXT)


@settings(max_examples=100, deadline=None)
@given(st.lists(st.dictionaries(st.sampled_from(["t_s", "x_mm", "label", "i", ""]), st.recursive(st.none() | st.booleans() | st.floats() | st.integers() | st.text(), lambda v: st.lists(v))), max_size=4), st.binary(max_size=9))
def test_rubbish_is_read_or_refused_in_one_line(tmp_path_factory, rows, more):
    file = tmp_path_factory.mktemp("j") / "a.jsonl"
    file.write_bytes("\n".join(map(json.dumps, rows)).encode() + more)
    for kind in (None, "json-lines"):
        try:
            assert pa.read_path(file, kind).samples >= 2
        except pa.PathAuditError as error:
            assert len(str(error).splitlines()) == 1
