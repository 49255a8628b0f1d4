"""A timed path from JSON lines: one object a line, one sample an object, its keys the column names of a timed path."""

import json

import numpy as np

from ..errors import ReadError, one_line, quoted
from ..taskpath import MEANING, Path
from .columns import Columns, path_of
from .sources import decode

EXPECTED = "a timed path as JSON lines"
MOST = 2_000_000
"""Lines; a longer path belongs into CSV or Parquet, which are read several times as fast."""


def read_json_lines(data: bytes, name, sha256: str, options=None) -> Path:
    """The path in the bytes of a file; `name` stands in messages. Raises ReadError."""
    return path_of(json_columns(data, name), name, sha256)


def json_columns(data: bytes, name) -> Columns:
    """The values by key. Every line must have the keys of the first. Raises ReadError."""
    if data[:].count(b"\n") > MOST:
        raise ReadError(name, "", f"more than {MOST:,} lines", "a shorter file, or the same table as CSV or Parquet")
    header, values, lines = None, [], []
    for number, line in enumerate(decode(name, data[:], EXPECTED).split("\n"), 1):
        if line.strip():
            sample = _object(name, number, line)
            if header is None:
                header, values = tuple(sample), [[] for _ in sample]
                _check_keys(name, number, header)
            if len(sample) != len(header) or not all(key in sample for key in header):
                raise _other_keys(name, number, sample, header)
            for key, column in zip(header, values):
                column.append(sample[key])
            lines.append(number)
    if header is None:
        raise ReadError(name, "", "no lines with anything in them", EXPECTED)
    columns = dict(zip(header, values))
    label = tuple("" if value is None else str(value) for value in columns["label"]) if "label" in columns else None
    return Columns(
        header, tuple(map(tuple, values)), lambda column: _numbers(name, column, columns[column], lines), lambda row: f"line {lines[row]}", label,
        np.array(lines, np.int32),
    )  # fmt: skip


def _object(name, number, line):
    try:
        value = json.loads(line, object_pairs_hook=_Pairs, parse_constant=_no_constant)
    except RecursionError:
        raise ReadError(name, f"line {number}", "values nested too deeply", "one JSON object of numbers and texts") from None
    except ValueError as error:
        reason = error.msg if isinstance(error, json.JSONDecodeError) else error
        raise ReadError(name, f"line {number}", f"text that is no JSON object ({one_line(reason)})", "one JSON object on each line") from None
    if not isinstance(value, _Pairs):
        raise ReadError(name, f"line {number}", f"{quoted(line)}, which is no JSON object", "one JSON object on each line")
    if value.twice:
        raise ReadError(name, f"line {number}", f"the key {quoted(value.twice)} twice", "each key once")
    return value


class _Pairs(dict):
    """An object's values, and a key that stands twice in it."""

    def __init__(self, pairs):
        super().__init__(pairs)
        seen = set()
        self.twice = None if len(self) == len(pairs) else next(key for key, _ in pairs if key in seen or seen.add(key))


def _no_constant(word):
    raise ValueError(f"{word} is not in JSON")


def _check_keys(name, number, header):
    if not MEANING.intersection(header):
        raise ReadError(name, f"line {number}", f"the keys {quoted(', '.join(header))}", 'keys such as "t_s", "x_mm", "y_mm", "z_mm", "qw", "qx", "qy", "qz"')


def _other_keys(name, number, sample, header):
    missing = next((key for key in header if key not in sample), None)
    found = f"no {quoted(missing)}" if missing is not None else f"a key {quoted(next(key for key in sample if key not in header))} that the first line has not"
    return ReadError(name, f"line {number}", found, "the same keys in every line")


def _numbers(name, column, values, lines):
    kinds = (int, float)
    row = next((row for row, value in enumerate(values) if not isinstance(value, kinds) or (value is True or value is False) and column != "process"), None)
    if row is None:
        try:
            return np.array(values, np.float64)
        except OverflowError:
            row = next(row for row, value in enumerate(values) if abs(value) > 1e308)
    raise ReadError(name, f"line {lines[row]}, column {column}", quoted(json.dumps(values[row], default=str)), "a number")
