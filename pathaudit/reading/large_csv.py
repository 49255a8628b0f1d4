"""A timed path from a large CSV file: blocks of whole lines go to several threads, each of which writes what it reads into the path's own arrays.

The numbers are parsed by pyarrow's or pandas' engine; what an engine does not take is read by `csv_table`'s careful code, which names the line.
A number that is no sample (not finite, no unit quaternion ...) is refused by `taskpath.Filling`, with its line as well.
"""

import csv
import hashlib
import os
import re
from collections import deque
from concurrent.futures import Future, ThreadPoolExecutor

import numpy as np

from ..taskpath import Filling, Path
from . import sources
from .csv_table import numbers_of

SLACK = 1.02
"""Rows for which room is made, as a multiple of those that the file has if all are as long as those of its first block."""


def threads():
    return min(os.cpu_count() or 1, 4)


def read_large(table, sha256="") -> Path:
    """The path in a large table; its hash is formed on the way where the table's file is open. Raises ReadError."""
    reading = _Reading(table)
    reading.read()
    if isinstance(table.blocks.data, sources.LargeFile):
        sha256 = reading.digest.hexdigest()
    lines, rows = reading.lines[: reading.rows], reading.rows
    return reading.filling.path(rows, table.cells, sha256=sha256, place=lambda row: f"line {lines[row]}", label=reading.label, lines=lines)


class _Reading:
    """The work on one table. lines: the line of each row.  label: texts, or None where there is no such column."""

    def __init__(self, table):
        self.table, self.blocks = table, table.blocks
        self.filling = Filling(table.header, table.file)
        self.engine = _engine(table, self.filling.columns)
        self.digest = hashlib.sha256(self.blocks.data[: self.blocks.bounds[0]])
        self.lines, self.rows, self.label = np.empty(0, np.int32), 0, None

    def read(self):
        jobs, done, most = deque(), [], 0
        last = Future()
        last.set_result((0, self.blocks.line))
        with ThreadPoolExecutor(threads()) as pool:
            try:
                for k in range(len(self.blocks)):
                    data = self.blocks.raw(k)
                    most += _line_ends(data) + (k == len(self.blocks) - 1)
                    while jobs and (len(jobs) > 4 * threads() or most > len(self.lines)):  # the file must not pile up in memory
                        done.append(jobs.popleft().result())
                    if most > len(self.lines):
                        self._make_room(k, most)
                    before, last = last, Future()
                    jobs.append(pool.submit(self._block, k, data, before, last))
                    self.digest.update(data)
                done += [job.result() for job in jobs]
            except BaseException:
                pool.shutdown(cancel_futures=True)
                raise
        ends = [end for end, _ in done]
        self.blocks.rows, self.rows = np.array([0, *ends]), ends[-1] if ends else 0
        if "label" in self.table.header:
            self.label = [text for _, texts in done for text in texts]

    def _make_room(self, k, most):
        """Room for at least `most` rows, which are those up to block k; nobody writes into the arrays meanwhile."""
        first, bounds = self.blocks.bounds[0], self.blocks.bounds
        rows = most + int(SLACK * most * (bounds[-1] - bounds[k + 1]) / (bounds[k + 1] - first))
        old, self.lines = self.lines, np.empty(rows, np.int32)
        self.lines[: len(old)] = old
        self.filling.make_room(rows)

    def _block(self, k, data, before, after):
        """Read block k, given as its raw bytes, into the arrays; gives the row after its last one, and its labels.

        before, after: where the block's first row and line are found, and where the next block's are told.
        """
        try:
            height, lines, values, labels = self._parsed(k, data)
            start, line = before.result()
            rows = len(values[0])
            after.set_result((start + rows, line + height))
        except BaseException as error:
            after.set_exception(error)
            raise
        place = self.lines[start : start + rows]
        place[:] = np.arange(line, line + rows, dtype=np.int32) if lines is None else lines
        self.filling.put(start, values, lambda row: f"line {place[row]}")
        return start + rows, labels

    def _parsed(self, k, data):
        """The number of lines of block k, the line of each row (None: each line is a row), the wanted columns' numbers, the labels."""
        table, blocks, wanted = self.table, self.blocks, self.filling.columns
        data = blocks.clean(k, data)
        if not data.isascii():
            try:
                data.decode("utf-8")
            except UnicodeDecodeError:
                table.decoded(data, blocks.first_line(k))
        height = _line_ends(data) + (not data.endswith(b"\n"))
        if b'"' not in data and b"#" not in data:
            read = self.engine(data)
            if read is not None and read[0] == height:  # an engine leaves out blank lines
                return height, None, *read[1:]
        lines, cells = blocks.careful(k)
        read = self.engine(_COMMENT.sub(b"", data)) if b'"' not in data else None
        if read is None or read[0] != len(lines):
            texts = cells[table.header.index("label")] if "label" in table.header else ()
            read = len(lines), [numbers_of(table.file, column, cells[table.header.index(column)], lines) for column in wanted], texts
        return height, lines, *read[1:]


def _line_ends(data):
    ends = int(np.count_nonzero(np.frombuffer(data, np.uint8) == ord("\n")))  # several times as fast as data.count
    return ends + (data.count(b"\r") - data.count(b"\r\n") if b"\r" in data else 0)


_COMMENT = re.compile(rb"^[ \t]*#[^\n]*\n?", re.M)
_TRUTH = (b"True", b"TRUE", b"true", b"False", b"FALSE", b"false")  # pandas takes them for 1 and 0
_NO_NUMBERS = (b"r", b"R", b"s", b"S")  # one of them is in each of these words and in no number; to look for letters is some twenty times as fast


def _engine(table, wanted):
    """A function of bytes -> (rows, arrays of the wanted columns, labels), or None where it does not get rows of numbers from them."""
    try:
        import pyarrow.csv  # noqa: F401
    except ImportError:
        return _pandas_engine(table, wanted)
    return _arrow_engine(table, wanted)


def _arrow_engine(table, wanted):
    import pyarrow as arrow
    from pyarrow import csv as arrow_csv

    names = [f"c{k}" for k in range(len(table.header))]
    types = {names[table.header.index(column)]: arrow.float64() for column in wanted}
    if "label" in table.header:
        types[names[table.header.index("label")]] = arrow.dictionary(arrow.int32(), arrow.utf8())
    convert = arrow_csv.ConvertOptions(column_types=types, include_columns=list(types), null_values=[], strings_can_be_null=False, check_utf8=False)
    parse = arrow_csv.ParseOptions(delimiter=table.delimiter, quote_char=False)

    def engine(data):
        read = arrow_csv.ReadOptions(use_threads=False, block_size=len(data) + 1, column_names=names)
        try:
            found = arrow_csv.read_csv(arrow.BufferReader(data), read, parse, convert)
        except (arrow.ArrowException, ValueError, OSError):
            return None
        labels = ()
        if "label" in table.header:
            column = found.column(len(wanted)).combine_chunks()
            words = column.dictionary.to_pylist()
            labels = [words[code] for code in column.indices.to_pylist()]
        return found.num_rows, [found.column(k).to_numpy() for k in range(len(wanted))], labels

    return engine


def _pandas_engine(table, wanted):
    import io

    import pandas

    places = [table.header.index(column) for column in wanted]
    spot = table.header.index("label") if "label" in table.header else None
    kinds = {**{k: np.float64 for k in places}, **({} if spot is None else {spot: str})}
    options = {"header": None, "names": range(len(table.header)), "usecols": list(kinds), "dtype": kinds, "sep": table.delimiter}
    options |= {"na_filter": False, "quoting": csv.QUOTE_NONE, "engine": "c", "index_col": False, "low_memory": False}
    if tuple(map(int, pandas.__version__.split(".")[:2])) < (3, 1):  # from there on the one converter is exact
        options["float_precision"] = "round_trip"
    row = np.frombuffer(table.delimiter.encode() * (len(table.header) - 1) + b"\n", np.uint8)

    def engine(data):
        marks = _marks(data if data.endswith(b"\n") else data + b"\n", row)
        if len(marks) % len(row) or (marks.reshape(-1, len(row)) != row).any():
            return None
        if any(letter in data for letter in _NO_NUMBERS) and any(word in data for word in _TRUTH):
            return None
        try:
            found = pandas.read_csv(io.BytesIO(data), **options)
        except (ValueError, OverflowError):
            return None
        if len(found) != len(marks) // len(row):
            return None
        return len(found), [found[k].to_numpy() for k in places], () if spot is None else found[spot].tolist()

    return engine


def _marks(data, row, piece=1 << 16):
    """The delimiters and line ends of the bytes, one after the other; `row` holds those of one row. In pieces that stay in the processor's cache."""
    letters = np.frombuffer(data, np.uint8)
    pieces = (letters[at : at + piece] for at in range(0, len(letters), piece))
    return np.concatenate([part[(part == row[0]) | (part == row[-1])] for part in pieces])
