"""A timed path from a CSV file: a header row, one sample a line, '#' comment lines.

The delimiter (',' or ';' or tab) is the one under which the header shows most known columns. One line holds one sample, so
that row numbers in messages are those of the user's editor.
"""

import csv

import numpy as np

from ..errors import ReadError, first_repeated, one_line, quoted
from ..taskpath import MEANING, Path, assemble
from .sources import decode, read_bytes

EXPECTED = "a timed path as CSV text"
NUMBER = "a number with a decimal point"


def read_timed_csv(file) -> Path:
    """The path in `file`. Raises ReadError."""
    data, sha256 = read_bytes(file, EXPECTED)
    table = _Table(file, decode(file, data, EXPECTED))
    return assemble(table.header, table.cells, table.numbers, name=file, sha256=sha256, place=table.place)


class _Table:
    """Cells by column, and the place of each row in the file."""

    def __init__(self, file, text):
        self.file = file
        self.lines = text.split("\n")
        used = [line for line in self.lines if _holds_cells(line)]
        if not used:
            raise ReadError(file, "", "only comments", "a header row and samples")
        self.header, delimiter = _split_header(used[0])
        self._check_header()
        widths, cells = self._split(used[1:], delimiter)
        self._check_widths(widths, delimiter)
        self.plain = all(line.isascii() and "_" not in line for line in used[1:])  # float() takes 1_000 and other scripts' digits
        self.cells = tuple(tuple(cells[k :: len(self.header)]) for k in range(len(self.header)))

    def _check_header(self):
        if not MEANING.intersection(self.header):
            raise ReadError(self.file, "header", quoted(", ".join(self.header)), "column names such as t_s,x_mm,y_mm,z_mm,qw,qx,qy,qz")
        twice = first_repeated(filter(None, self.header))
        if twice:
            raise ReadError(self.file, "header", f"the column {quoted(twice)} twice", "each column once")

    def _split(self, lines, delimiter):
        """How many cells each line has, and all cells in one list."""
        if not any('"' in line for line in lines):  # the usual file, some four times as fast as csv
            return [line.count(delimiter) + 1 for line in lines], delimiter.join(lines).split(delimiter) if lines else []
        try:
            rows = [next(csv.reader([line], delimiter=delimiter, strict=True)) for line in lines]
        except csv.Error:
            raise self._bad_quotes(lines, delimiter) from None
        return [len(row) for row in rows], [cell for row in rows for cell in row]

    def _bad_quotes(self, lines, delimiter):
        for row, line in enumerate(lines):
            try:
                next(csv.reader([line], delimiter=delimiter, strict=True))
            except csv.Error as error:
                return ReadError(self.file, self.place(row), f"quotes that cannot be read ({error})", "every quoted cell closed on its own line")

    def _check_widths(self, widths, delimiter):
        wanted = len(self.header)
        row = next((row for row, width in enumerate(widths) if width != wanted), None)
        if row is not None:
            hint = "; a decimal comma splits a number in two" if delimiter == "," and widths[row] > wanted else ""
            raise ReadError(self.file, self.place(row), f"{widths[row]} cells", f"{wanted} as in the header{hint}")

    def place(self, row):
        """'line 7' for the row's line in the file; counted only when a message needs it."""
        numbers = (number for number, line in enumerate(self.lines, 1) if _holds_cells(line))
        for _ in range(row + 1):
            next(numbers)
        return f"line {next(numbers)}"

    def numbers(self, column):
        """(N,) float64: what Python's float() makes of each cell."""
        cells = self.cells[self.header.index(column)]
        try:
            values = np.fromiter(map(float, cells), np.float64, len(cells))
        except ValueError:
            values = None
        if values is None or not self.plain:
            row = next((k for k, cell in enumerate(cells) if not _is_number(cell)), None)
            if row is not None:
                raise ReadError(self.file, f"{self.place(row)}, column {column}", *_not_a_number(cells[row]))
        return values


def _holds_cells(line):
    start = line.lstrip()
    return bool(start) and start[0] != "#"


def _split_header(line):
    best = max(",;\t", key=lambda delimiter: len(MEANING.intersection(_names(line, delimiter))))
    return _names(line, best), best


def _names(line, delimiter):
    try:
        return tuple(name.strip() for name in next(csv.reader([line], delimiter=delimiter)))
    except csv.Error:
        return (one_line(line),)


def _is_number(cell):
    """Whether float() takes the cell and a spreadsheet would too: no digit grouping by '_', no digits of other scripts."""
    try:
        float(cell)
    except ValueError:
        return False
    return cell.isascii() and "_" not in cell


def _not_a_number(cell):
    if not cell.strip():
        return "an empty cell", "a number"
    if cell.count(",") == 1 and _is_number(cell.replace(",", ".")):
        return f"{quoted(cell)}", f"{NUMBER} (write a point in place of the decimal comma)"
    return f"{quoted(cell)}", NUMBER
