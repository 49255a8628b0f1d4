"""Named columns, whatever file they come from: what the readers of tables give and `taskpath.assemble` takes."""

from collections.abc import Callable
from dataclasses import dataclass

from ..taskpath import Path, assemble


@dataclass(frozen=True)
class Columns:
    """header: names.  cells: for each its N values as given.  numbers(column) -> (N,) float64, raises ReadError.  place(row) -> words.

    label: the texts of the column of that name, or None where the cells have them.  lines (N,): the line of each row, or None.
    """

    header: tuple
    cells: tuple
    numbers: Callable
    place: Callable
    label: tuple | None = None
    lines: object = None


def path_of(columns, name, sha256) -> Path:
    """The timed path that the columns hold; `columns` is a Columns or has the same attributes. Raises ReadError."""
    return assemble(
        columns.header, columns.cells, columns.numbers, name=name, sha256=sha256, place=columns.place, label=columns.label, lines=columns.lines,
    )  # fmt: skip
