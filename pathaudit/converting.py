"""A path as the content of a file that can be read again: timed CSV, JSON lines, Parquet, Feather; and what such a file cannot hold.

The columns are those of the path's source, in its order and units. Known columns are numbers in every format, the same doubles;
all others are handed through as they are.
"""

import csv
import io
import itertools
import json
import math
import os
import re
from typing import NamedTuple

import numpy as np

from .errors import UsageError, WriteError, quoted
from .reading.csv_table import NUMERIC
from .reading.options import FORMATS
from .reading.tables import INSTALL, ArrowColumn

ENDINGS = {
    ".csv": "timed", ".txt": "timed", ".tsv": "timed", ".jsonl": "json-lines", ".ndjson": "json-lines", ".parquet": "parquet", ".pq": "parquet",
    ".feather": "feather", ".arrow": "feather",
}  # fmt: skip
WRITTEN = tuple(dict.fromkeys(ENDINGS.values()))


class Converted(NamedTuple):
    """What to write, and what it does not keep, in phrases."""

    content: str | bytes
    lost: tuple


def kind_of(file, kind=None) -> str:
    """The format to write: the one that was asked for, else the one that the file's ending says. Raises UsageError."""
    if kind is not None:
        return kind
    ending = os.path.splitext(os.fspath(file))[1].lower()
    if ending not in ENDINGS:
        raise UsageError(f"{file}: found the ending {quoted(ending)}, expected one of {', '.join(ENDINGS)}, or --to with one of {', '.join(WRITTEN)}")
    return ENDINGS[ending]


def converted(path, kind) -> Converted:
    """The path as the content of a file of one of the kinds WRITTEN. Raises WriteError where pyarrow is needed and missing."""
    lost = list(_lines_lost(path))
    columns = [_values(name, cells, kind, lost) for name, cells in zip(path.columns, path.cells)]
    if kind == "timed":
        return Converted(csv_text(path.columns, columns), tuple(lost))
    if kind == "json-lines":
        return Converted(_json_lines(path.columns, columns), tuple(lost))
    return Converted(_table(path, columns, kind, lost), tuple(lost))


def _lines_lost(path):
    """A table of lines keeps its rows; what stood between them, or before the header, is not in the path."""
    lines = path.source_line
    if path.made:
        yield "the exact geometry or the records that the samples were made from"
    elif lines is not None and (lines[0] > 2 or (np.diff(lines) != 1).any()):
        yield "comment and blank lines"


def csv_text(header, columns) -> str:
    """Columns of texts as delimited text. A first cell that begins with '#' would make its line a comment: then every cell is quoted."""
    first = columns[0] if isinstance(columns[0], (list, tuple)) else list(columns[0])
    marked = any(text.lstrip().startswith("#") for text in (header[0], *first))
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n", quoting=csv.QUOTE_ALL if marked else csv.QUOTE_MINIMAL)
    writer.writerow(header)
    writer.writerows(zip(first, *columns[1:]))
    return stream.getvalue()


def texts(cells, said=None):
    """The values of a column as cells of a CSV file: texts as they are, numbers so that they are read as the same doubles, 1 and 0 for yes and no.

    said: a set that gets a phrase for each thing that a text cannot keep.
    """
    said = set() if said is None else said
    return [value if type(value) is str else _text(value, said) for value in _plain(cells)]


_BREAKS = re.compile(r"\r\n|[\n\r\0]")  # one line holds one row


def _cells_of_lines(name, cells, lost):
    said = set()
    found = texts(cells, said)
    if any(map(_BREAKS.search, found)):
        found = [_BREAKS.sub(" ", text) for text in found]
        said.add("line breaks in texts, which became blanks")
    lost += [f"column {quoted(name)}: {words}" for words in sorted(said)]
    return found


def _text(value, said):
    if value is None:
        said.add("missing values, which became empty cells")
        return ""
    if isinstance(value, bool):
        return str(int(value))
    if isinstance(value, (int, float)):
        return repr(value)
    if isinstance(value, (list, dict)):
        said.add("lists, which became texts")
        return json.dumps(value)
    said.add(f"the type {type(value).__name__}, whose values became texts")
    return str(value)


def _plain(cells):
    """An iterable of Python values."""
    return cells.tolist() if isinstance(cells, np.ndarray) else cells


def _values(name, cells, kind, lost):
    """One column as the writer of this kind takes it; appends to `lost` what it does not keep."""
    if kind == "timed":
        return _cells_of_lines(name, cells, lost)
    if isinstance(cells, ArrowColumn) and kind in ("parquet", "feather"):
        return cells
    if isinstance(cells, np.ndarray) and cells.dtype.kind in "biuf":
        return cells if kind != "json-lines" else [_jsonable(value, name, lost) for value in cells.tolist()]
    values = list(_plain(cells))
    if name in NUMERIC and values and type(values[0]) is str:
        numbers = np.fromiter(map(float, values), np.float64, len(values))
        if any(repr(number) != text for number, text in itertools.islice(zip(numbers.tolist(), values), 1000)):
            _say_once(lost, "how numbers are spelled (0.10 for 0.1); they are the same doubles")
        if name == "process":
            numbers = numbers.astype(np.int8)
        return numbers if kind != "json-lines" else numbers.tolist()
    return [_jsonable(value, name, lost) for value in values] if kind == "json-lines" else values


def _say_once(lost, words):
    if words not in lost:
        lost.append(words)


def _jsonable(value, name, lost):
    if isinstance(value, float) and not math.isfinite(value):
        _say_once(lost, f"column {quoted(name)}: values that are no numbers (nan, inf), which became null")
        return None
    if value is None or isinstance(value, (str, bool, int, float, list, dict)):
        return value
    _say_once(lost, f"column {quoted(name)}: the type {type(value).__name__}, whose values became texts")
    return str(value)


def _json_lines(header, columns):
    keys = [json.dumps(name) + ": " for name in header]
    encode = json.JSONEncoder(ensure_ascii=False, allow_nan=False).encode
    return "".join("{" + ", ".join(key + encode(value) for key, value in zip(keys, row)) + "}\n" for row in zip(*columns))


def _table(path, columns, kind, lost):
    try:
        import pyarrow
    except ImportError:
        raise WriteError(FORMATS[kind], f"it needs {INSTALL}") from None
    stream = pyarrow.BufferOutputStream()
    table = pyarrow.table([_arrow(name, values, lost) for name, values in zip(path.columns, columns)], names=list(path.columns))
    if kind == "parquet":
        from pyarrow import parquet

        parquet.write_table(table, stream)
    else:
        from pyarrow import feather

        feather.write_feather(table, stream)
    return stream.getvalue().to_pybytes()


def _arrow(name, values, lost):
    import pyarrow

    if isinstance(values, ArrowColumn):
        return values.arrow
    if name in NUMERIC and not isinstance(values, np.ndarray):
        return pyarrow.array(values, pyarrow.float64() if name != "process" or not all(isinstance(value, bool) for value in values) else pyarrow.bool_())
    if any(isinstance(value, (list, dict)) for value in values):
        lost.append(f"column {quoted(name)}: lists, which became texts")
        return pyarrow.array([json.dumps(value) for value in values], pyarrow.string())
    try:
        return pyarrow.array(values)
    except (pyarrow.ArrowException, ValueError, TypeError, OverflowError):
        lost.append(f"column {quoted(name)}: values of several types, which became texts")
        return pyarrow.array([None if value is None else str(value) for value in values], pyarrow.string())
