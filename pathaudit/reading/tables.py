"""A timed path from a Parquet or a Feather table, through pyarrow (the optional extra `tables`)."""

from collections.abc import Sequence

from ..errors import ReadError, first_repeated, one_line, quoted
from ..taskpath import MEANING, Path
from .columns import Columns, path_of
from .csv_table import numbers_of
from .options import FORMATS

INSTALL = "the package pyarrow, which this command installs: pip install 'pathaudit[tables]'"
ROOM, MULTIPLE = 64 << 20, 200
"""Bytes that the values of a table may take: this much, and so many times the file's size. A small file can claim any number of rows."""


def read_parquet(data: bytes, name, sha256: str, options=None) -> Path:
    """The path in the bytes of a Parquet file; `name` stands in messages. Raises ReadError."""
    return path_of(table_columns(data, name, "parquet"), name, sha256)


def read_feather(data: bytes, name, sha256: str, options=None) -> Path:
    """The path in the bytes of a Feather (Arrow IPC) file; `name` stands in messages. Raises ReadError."""
    return path_of(table_columns(data, name, "feather"), name, sha256)


def table_columns(data: bytes, name, kind) -> Columns:
    """The columns of a 'parquet' or 'feather' file. Raises ReadError."""
    table = _table(data[:], name, kind)
    header = tuple(table.column_names)
    if not MEANING.intersection(header):
        raise ReadError(name, "columns", quoted(", ".join(header)), "column names such as t_s,x_mm,y_mm,z_mm,qw,qx,qy,qz")
    twice = first_repeated(header)
    if twice is not None:
        raise ReadError(name, f"column {quoted(twice)}", "the column twice", "each column once")
    columns = {column: ArrowColumn(table.column(column)) for column in header}
    label = tuple("" if text is None else str(text) for text in columns["label"]) if "label" in columns else None
    return Columns(header, tuple(columns.values()), lambda column: _numbers(name, column, columns[column]), lambda row: f"row {row + 1}", label)


class ArrowColumn(Sequence):
    """A column of an Arrow table as the values that Python has for it; `.arrow` is the column itself."""

    def __init__(self, arrow):
        import pyarrow

        self.arrow = arrow.cast(arrow.type.value_type) if pyarrow.types.is_dictionary(arrow.type) else arrow

    def __len__(self):
        return len(self.arrow)

    def __getitem__(self, row):
        return tuple(self[k] for k in range(*row.indices(len(self)))) if isinstance(row, slice) else self.arrow[row].as_py()

    def __iter__(self):
        import pyarrow

        for piece in self.arrow.chunks:
            try:
                yield from piece.to_pylist()
            except (ValueError, OverflowError, pyarrow.ArrowException):  # a day that Python's calendar does not have
                yield from piece.cast(pyarrow.string()).to_pylist()

    def __eq__(self, other):
        return isinstance(other, Sequence) and len(self) == len(other) and all(mine == theirs for mine, theirs in zip(self, other))


def _table(data, name, kind):
    try:
        import pyarrow
    except ImportError:
        raise ReadError(name, "", FORMATS[kind], INSTALL) from None
    most = ROOM + MULTIPLE * len(data)
    try:
        batches = _parquet_batches(name, data, most) if kind == "parquet" else _feather_batches(data)
        schema, kept, size = next(batches), [], 0
        _check_types(name, schema)
        for batch in batches:
            batch.validate(full=True)  # texts that are no UTF-8, places outside of the data
            size += batch.nbytes
            if size > most:
                raise _too_much(name, most)
            kept.append(batch)
        return pyarrow.Table.from_batches(kept, schema)
    except MemoryError:
        raise _too_much(name, most) from None
    except (pyarrow.ArrowException, ValueError, OSError, TypeError, KeyError, OverflowError) as error:
        raise ReadError(name, "", f"a {kind.capitalize()} table that cannot be read ({_reason(error)})", "a whole file, as it was written") from None


def _reason(error):
    return quoted(one_line(error) or type(error).__name__)[1:-1]


def _parquet_batches(name, data, most):
    """The schema, then the rows in pieces."""
    import pyarrow
    import pyarrow.parquet

    file = pyarrow.parquet.ParquetFile(pyarrow.BufferReader(data), memory_map=False)
    head = file.metadata
    stated = sum(max(head.row_group(k).total_byte_size, 0) for k in range(head.num_row_groups))
    if max(stated, 8 * head.num_rows * head.num_columns) > most:
        raise _too_much(name, most)
    yield file.schema_arrow
    yield from file.iter_batches(batch_size=1 << 16, use_threads=False)


def _feather_batches(data):
    import pyarrow

    file = pyarrow.ipc.open_file(pyarrow.BufferReader(data))
    yield file.schema
    for k in range(file.num_record_batches):
        yield file.get_batch(k)


def _check_types(name, schema):
    """Numbers, texts, times and yes or no: what a row of a table is handed through as."""
    from pyarrow import types

    known = "integer floating decimal boolean string large_string string_view date time timestamp duration null".split()
    for field in schema:
        column = quoted(field.name)  # bytes that are no text raise here
        kind = field.type.value_type if types.is_dictionary(field.type) else field.type
        if not any(getattr(types, f"is_{word}")(kind) for word in known):
            raise ReadError(name, f"column {column}", f"values of type {one_line(kind)}", "numbers or texts")


def _too_much(name, most):
    return ReadError(name, "", f"a table whose values take more than {most >> 20:,} MiB", f"at most {ROOM >> 20} MiB and {MULTIPLE} times the size of the file")


def _numbers(name, column, cells):
    import pyarrow
    from pyarrow import types

    arrow = cells.arrow
    kind = arrow.type
    if arrow.null_count:
        row = next(row for row, value in enumerate(cells) if value is None)
        raise ReadError(name, f"row {row + 1}, column {column}", "no value", "a number")
    if types.is_string(kind) or types.is_large_string(kind) or types.is_string_view(kind):
        return numbers_of(name, column, arrow.to_pylist(), None)
    if not (types.is_integer(kind) or types.is_floating(kind) or types.is_boolean(kind) or types.is_decimal(kind)):
        raise ReadError(name, f"column {column}", f"values of type {kind}", "numbers")
    if types.is_boolean(kind):
        arrow = arrow.cast(pyarrow.int8())
    return arrow.cast(pyarrow.float64(), safe=False).to_numpy()
