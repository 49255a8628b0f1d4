"""What a file is, by its content."""

import re

from ..errors import ReadError, quoted
from ..taskpath import MEANING
from .csv_table import holds_cells, split_header
from .sources import check_text

HEAD = 1 << 16  # bytes that are looked at

A_FILE = "a timed path or another file that holds a path"

EXPECTED = "a path: CSV with t_s,x_mm,y_mm,z_mm and an orientation, points with a speed, ISO 6983-1 machine code, cutter-location text, JSON lines, Parquet or Feather"

TABLES = {b"PAR1": "parquet", b"ARROW1": "feather"}

REFUSED = {
    b"FEA1": ("a Feather table of the first version", "one of version 2 (pandas' to_feather and pyarrow write it)"),
    b"PK\x03\x04": ("a spreadsheet or zip archive", "the sheet saved as CSV (UTF-8)"),
    b"\xd0\xcf\x11\xe0": ("an old spreadsheet or document", "the sheet saved as CSV (UTF-8)"),
    b"\x1f\x8b": ("a gzip archive", "the file unpacked"),
    b"BZh": ("a bzip2 archive", "the file unpacked"),
    b"\xfd7zXZ": ("an xz archive", "the file unpacked"),
    b"\x28\xb5\x2f\xfd": ("a zstd archive", "the file unpacked"),
    b"7z\xbc\xaf": ("a 7z archive", "the file unpacked"),
    b"\x89HDF": ("an HDF5 file", "its table as Parquet or CSV"),
    b"SQLite format": ("a database", "its table as Parquet or CSV"),
    b"%PDF": ("a PDF document", EXPECTED),
    b"\x89PNG": ("a picture", EXPECTED),
    b"\xff\xd8\xff": ("a picture", EXPECTED),
}
"""What is known and not read: the first bytes, what they begin, and the mend."""

_TOML = re.compile(r"\[{1,2}[A-Za-z_][\w. -]*\]{1,2}\s*(#.*)?$|[A-Za-z_][\w-]*\s*=\s*\S")
_WORDS = re.compile(r"/?\s*(N\s*\d+\s*)?([GMXYZFSTIJKRABC]\s*[-+.\d]|\(|%)|%|[:O]\d+\s*$")
_LOCATION = re.compile(
    r"(\$\$|(PARTNO|REMARK|PPRINT|INSERT)\b|(UNITS|FROM|GOTO|GODLTA|MULTAX|FEDRAT|RAPID|LOADTL|SPINDL|COOLNT|TOOLNO|MACHIN|CUTTER|CIRCLE|MOVARC|CYCLE|INDIRV|TLON|INTOL|OUTTOL|MODE|STOP|END|FINI)"
    r"\s*(/|$|\$))"
)


def sniff(name, data) -> str:
    """The format (a key of options.FORMATS) that the bytes begin with. Raises ReadError for what is not known or not read."""
    head = data[:HEAD]
    for magic, kind in TABLES.items():
        if head.startswith(magic):
            return kind
    for magic, (found, expected) in REFUSED.items():
        if head.startswith(magic):
            raise ReadError(name, "", found, expected)
    check_text(name, head.replace(b"\0", b" ") if b"\0" in head[64:] and b"\0" not in head[:64] else head, "a path as text")
    lines = head.decode("utf-8-sig", "replace").replace("\r", "\n").split("\n")
    first = next((line.strip() for line in lines if holds_cells(line)), "")
    kind = _of_brackets(name, first, lines) or _of_columns(name, first) or _of_words(first)
    if kind:
        return kind
    if not first or _looks_like_a_table(first):
        return "timed"  # whose reader says what is wrong with its header
    raise ReadError(name, "", f"text that begins with {quoted(first)}", EXPECTED)


def _of_brackets(name, first, lines):
    """JSON, XML, TOML."""
    text = "\n".join(lines[:200])
    if first.startswith("<"):
        raise ReadError(name, "", "XML text" + (" (an arm in URDF)" if "<robot" in text else ""), EXPECTED)
    if first.startswith("{") and first != "{" and '"pathaudit.check/' not in text:
        return "json-lines"
    if first.startswith("{") or first.startswith("[") and not _TOML.match(first):
        if '"pathaudit.check/' in text:
            raise ReadError(name, "", "the results of a check (JSON), which hold no poses", "the path that was checked, or the CSV that --retimed writes")
        raise ReadError(name, "", "a JSON document", "JSON lines: one object on each line, one sample an object")
    if _TOML.match(first):
        raise ReadError(name, "", "a TOML text such as a cell", f"{EXPECTED} (did the path and the cell change places?)")
    return None


def _of_columns(name, first):
    header, _ = split_header(first)
    if {"sigma_min", "speed_use"} <= set(header):
        raise ReadError(name, "header", "the joint motion that --joints writes, which holds no poses", "the path that was checked, or the CSV that --retimed writes")
    if not MEANING.intersection(header):
        return None
    places = [column for column in header if column in MEANING and column[:2] in ("x_", "y_", "z_")]
    times = [column for column in header if column[:2] == "t_" or column.lower() in ("t", "time")]
    return "waypoints" if places and not times else "timed"


def _of_words(first):
    if _LOCATION.match(first.upper()):
        return "cutter-location"
    return "iso6983" if _WORDS.match(first.upper()) and "," not in first else None


def _looks_like_a_table(first):
    return any(delimiter in first for delimiter in ",;\t") or any(name in first for name in MEANING if len(name) > 2)
