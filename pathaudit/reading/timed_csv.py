"""A timed path from a CSV file: a header row, one sample a line, '#' comment lines."""

from ..taskpath import Path
from .columns import path_of
from .csv_table import Table
from .large_csv import read_large

EXPECTED = "a timed path as CSV text"


def read_timed_csv(data: bytes, name, sha256: str, options=None) -> Path:
    """The path in the bytes of a file; `name` stands in messages. Raises ReadError."""
    table = Table(name, data, EXPECTED)
    return read_large(table, sha256) if table.large else path_of(table, name, sha256)
