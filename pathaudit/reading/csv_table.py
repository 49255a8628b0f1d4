"""Named columns from delimited text: a header row, one row a line, '#' comment lines.

The delimiter (',' or ';' or tab) is the one under which the header shows most known columns. One line holds one row, so that row
numbers in messages are those of the user's editor.

A small file is split at once. A large one stays on its disk: `large_csv` reads its numbers block by block, and its texts are split when
somebody asks for them. A block that the engine there does not take is read by the careful code below, which says what is wrong and in
which line; so both ways take and refuse the same files.
"""

import csv
import functools
from collections.abc import Sequence

import numpy as np

from ..errors import ReadError, first_repeated, one_line, quoted
from ..taskpath import MEANING
from . import sources
from .sources import check_text, not_utf8

NUMBER = "a number with a decimal point"
BLOCK = 1 << 20  # bytes; an engine asks the system for memory again and again from twice as many on
LONGEST_HEADER = 100_000  # bytes
NUMERIC = MEANING - {"label"}


class Table:
    """Cells by column, numbers by column, and the place of each row in the file; of a large file the blocks alone.

    data: bytes of UTF-8 text.  expected: what the file should be, for messages.  known: names of columns by which the header is recognised.
    whole: split a large file at once as well.
    header: names.  cells: for each column its texts.  lines (N,): the line of each row in the file, which is None in a large one.
    """

    label = None

    def __init__(self, file, data, expected, known=MEANING, whole=False):
        self.file, self.expected, self.large = file, expected, len(data) >= sources.LARGE and not whole
        check_text(file, data[:BLOCK], expected)
        if self.large and b"\n" not in data[:BLOCK]:
            data = data[:]  # line ends of another kind, or a line too long to be one
        if not self.large or isinstance(data, bytes):
            data = data.replace(b"\r\n", b"\n").replace(b"\r", b"\n") if b"\r" in data else data
        start, line, first = self._first_line(data)
        self.header, self.delimiter = split_header(first, known)
        self._check_header(known)
        self.blocks = _Blocks(self, data, start, line)
        if self.large:
            self.lines, self.cells = None, tuple(TextColumn(self.blocks, k) for k in range(len(self.header)))
        else:
            self.lines, columns = self.blocks.careful(0)
            self.cells = tuple(map(tuple, columns))

    def _first_line(self, data):
        """Where the text below the header starts, that line's number, and the header line."""
        at, number = 3 if data[:3] == b"\xef\xbb\xbf" else 0, 0
        while at < len(data):
            end = _line_end(data, at)
            line, number, at = data[at:end], number + 1, end
            if holds_cells(line):
                if len(line) > LONGEST_HEADER:
                    raise ReadError(self.file, f"line {number}", f"a header row of {len(line):,} bytes", f"at most {LONGEST_HEADER:,}")
                return at, number + 1, self.decoded(line, number).rstrip("\r\n")
        raise ReadError(self.file, "", "only comments", "a header row and samples")

    def _check_header(self, known):
        if not known & set(self.header):
            raise ReadError(self.file, "header", quoted(", ".join(self.header)), "column names such as t_s,x_mm,y_mm,z_mm,qw,qx,qy,qz")
        twice = first_repeated(filter(None, self.header))
        if twice:
            raise ReadError(self.file, "header", f"the column {quoted(twice)} twice", "each column once")

    def decoded(self, data, line):
        """The text of bytes that begin in this line of the file."""
        try:
            return data.decode("utf-8")
        except UnicodeDecodeError as error:
            raise not_utf8(self.file, line + data.count(b"\n", 0, error.start), data[error.start], self.expected) from None

    def place(self, row):
        """'line 7' for the row's line in the file."""
        return f"line {self.lines[row]}"

    def numbers(self, column):
        """What Python's float() makes of each cell: (N,) float64."""
        return numbers_of(self.file, column, self.cells[self.header.index(column)], self.lines)


def _line_end(data, at):
    """The place after the line that holds the byte at `at`."""
    step = 1 << 12
    while at < len(data):
        found = data[at : at + step].find(b"\n")
        if found >= 0:
            return at + found + 1
        at, step = at + step, 2 * step
    return len(data)


def _block_size():
    """Bytes of a block: pandas' engine takes some milliseconds for each, whatever its size."""
    try:
        import pyarrow.csv  # noqa: F401
    except ImportError:
        return 4 * BLOCK
    return BLOCK


class _Blocks:
    """The rows of a table in pieces of whole lines; each is taken out when it is asked for."""

    def __init__(self, table, data, start, line):
        self.table, self.data, self.line = table, data, line
        size, self.bounds = _block_size() if table.large else len(data), [start]
        while self.bounds[-1] < len(data):
            self.bounds.append(_line_end(data, min(self.bounds[-1] + size, len(data) - 1)))
        self.rows = None  # the first row of each block and the number of all rows, once they are known
        self.careful_kept = functools.lru_cache(maxsize=2)(self.careful)

    def __len__(self):
        return len(self.bounds) - 1

    def raw(self, k):
        """The bytes of block k as they are in the file."""
        return self.data[self.bounds[k] : self.bounds[k + 1]] if k < len(self) else b""

    def clean(self, k, data):
        """The raw bytes of block k with '\\n' line ends."""
        if b"\r" in data:
            data = data.replace(b"\r\n", b"\n").replace(b"\r", b"\n")
        if b"\0" in data:
            line = self.first_line(k) + data.count(b"\n", 0, data.index(0))
            raise ReadError(self.table.file, f"line {line}", "binary data", self.table.expected)
        return data

    def first_line(self, k):
        """The number of the first line of block k; counted only when a message or a comment in the block needs it."""
        ends = (self.data[self.bounds[j] : self.bounds[j + 1]] for j in range(k))
        return self.line + sum(end.count(b"\n") + end.count(b"\r") - end.count(b"\r\n") for end in ends)

    def careful(self, k):
        """The line of each row of block k, and its columns of texts. Raises ReadError at the first line that does not fit."""
        table, first = self.table, self.first_line(k)
        lines = table.decoded(self.clean(k, self.raw(k)), first).split("\n")
        numbered = [(number, line) for number, line in enumerate(lines, first) if holds_cells(line)]
        numbers, used = [number for number, _ in numbered], [line for _, line in numbered]
        widths, cells = self._split(used, numbers)
        wanted = len(table.header)
        row = next((row for row, width in enumerate(widths) if width != wanted), None)
        if row is not None:
            hint = "; a decimal comma splits a number in two" if table.delimiter == "," and widths[row] > wanted else ""
            raise ReadError(table.file, f"line {numbers[row]}", f"{widths[row]} cells", f"{wanted} as in the header{hint}")
        return np.array(numbers, np.int32), [cells[c::wanted] for c in range(wanted)]

    def _split(self, lines, numbers):
        """How many cells each line has, and all cells in one list."""
        delimiter = self.table.delimiter
        if not any('"' in line for line in lines):  # the usual file, some four times as fast as csv
            return [line.count(delimiter) + 1 for line in lines], delimiter.join(lines).split(delimiter) if lines else []
        rows = []
        for number, line in zip(numbers, lines):
            try:
                rows.append(next(csv.reader([line], delimiter=delimiter, strict=True)))
            except csv.Error as error:
                raise ReadError(self.table.file, f"line {number}", f"quotes that cannot be read ({error})", "every quoted cell closed on its own line") from None
        return [len(row) for row in rows], [cell for row in rows for cell in row]


class TextColumn(Sequence):
    """The texts of one column of a large file, split when they are asked for."""

    def __init__(self, blocks, column):
        self.blocks, self.column = blocks, column

    def __len__(self):
        return int(self.blocks.rows[-1])

    def __getitem__(self, row):
        if isinstance(row, slice):
            return tuple(self[k] for k in range(*row.indices(len(self))))
        row = range(len(self))[row]
        k = int(np.searchsorted(self.blocks.rows, row, "right")) - 1
        return self.blocks.careful_kept(k)[1][self.column][row - int(self.blocks.rows[k])]

    def __iter__(self):
        for k in range(len(self.blocks)):
            yield from self.blocks.careful_kept(k)[1][self.column]

    def __eq__(self, other):
        return isinstance(other, Sequence) and len(self) == len(other) and all(mine == theirs for mine, theirs in zip(self, other))


def holds_cells(line):
    """Whether a line (text or bytes) is neither blank nor a comment."""
    start = line.lstrip()
    return bool(start) and start[:1] not in ("#", b"#")


def split_header(line, known=MEANING):
    """The column names and the delimiter of a header line."""
    best = max(",;\t", key=lambda delimiter: len(known & set(_names(line, delimiter))))
    return _names(line, best), best


def _names(line, delimiter):
    try:
        return tuple(name.strip() for name in next(csv.reader([line], delimiter=delimiter)))
    except csv.Error:
        return (one_line(line),)


def numbers_of(file, column, cells, lines):
    """(N,) float64: what Python's float() makes of each cell; `lines` holds the line of each, None where there are only rows. Raises ReadError."""
    try:
        values = np.fromiter(map(float, cells), np.float64, len(cells))
    except ValueError:
        values = None
    if values is None or not all(map(str.isascii, cells)) or any("_" in cell for cell in cells):  # float() takes 1_000 and other scripts' digits
        row = next((k for k, cell in enumerate(cells) if not is_number(cell)), None)
        if row is not None:
            place = f"row {row + 1}" if lines is None else f"line {lines[row]}"
            raise ReadError(file, f"{place}, column {column}", *not_a_number(cells[row]))
    return values


def is_number(cell):
    """Whether float() takes the cell and a spreadsheet would too: no digit grouping by '_', no digits of other scripts."""
    try:
        float(cell)
    except ValueError:
        return False
    return cell.isascii() and "_" not in cell


def not_a_number(cell):
    """What was found in a cell that is no number, and what is expected."""
    if not cell.strip():
        return "an empty cell", "a number"
    if cell.count(",") == 1 and is_number(cell.replace(",", ".")):
        return f"{quoted(cell)}", f"{NUMBER} (write a point in place of the decimal comma)"
    if cell.lstrip().startswith("="):
        return f"{quoted(cell)}", f"{NUMBER} (a formula: save the sheet with its values)"
    return f"{quoted(cell)}", NUMBER
