"""Each reader as a function of bytes, the good files that its mutations begin with, and what must hold whatever the bytes are."""

import io
import os
import resource
import tempfile
from pathlib import Path
from time import process_time

import numpy as np

import pathaudit as pa
from pathaudit.reading import csv_table, door, sources
from pathaudit.reading.cell_toml import read_cell_toml
from pathaudit.reading.options import ReadOptions
from pathaudit.reading.urdf import arm_from_urdf

DEMO = Path(__file__).resolve().parents[2] / "pathaudit" / "demo"
CORPUS = Path(__file__).resolve().parents[1] / "reading" / "corpus"

AXIS, CEILINGS = (0.0, 0.0, -1.0), {"speed_mm_s": 200.0, "acceleration_mm_s2": 1000.0, "turn_speed_deg_s": 90.0, "turn_acceleration_deg_s2": 300.0, "step_s": 1.0}
SLOWEST = 1.0  # s
MEMORY = 256 << 20, 500
"""Bytes that one execution may add to the process: this much, and so many times its input."""


def _path(kind, **choices):
    options = ReadOptions(kind, **choices)

    def read(data):
        path = door.path_of_data(data, "fuzzed", options)
        assert path.samples >= 2 and np.isfinite(path.rotation).all() and np.isfinite(path.position).all() and (np.diff(path.time) > 0).all()
        for cells in path.cells:
            assert len(cells) == path.samples

    return read


def _large(data):
    """Timed CSV by the engine, whatever its size."""
    before = sources.LARGE, csv_table.BLOCK
    sources.LARGE, csv_table.BLOCK = 0, 200
    try:
        _path("timed")(data)
    finally:
        sources.LARGE, csv_table.BLOCK = before


def _cell(data):
    folder = _scratch()
    (folder / "cell.toml").write_bytes(data)
    read_cell_toml(folder / "cell.toml")


def _scratch(made=[]):  # noqa: B006  one folder a process
    if not made:
        made.append(Path(tempfile.mkdtemp(prefix="fuzzing-", dir="/dev/shm" if os.path.isdir("/dev/shm") else None)))
        (made[0] / "arm.urdf").write_bytes((DEMO / "arm.urdf").read_bytes())
    return made[0]


READERS = {
    "door": lambda data: door.path_of_data(data, "fuzzed"),
    "timed": _path("timed"),
    "timed-large": _large,
    "json-lines": _path("json-lines"),
    "parquet": _path("parquet"),
    "feather": _path("feather"),
    "recorded": _path("recorded", smooth_ms=100.0),
    "waypoints": _path("waypoints", corner="2mm", **CEILINGS),
    "iso6983": _path("iso6983", axis=AXIS, units="mm", inch_codes=True, corner="20mm/s", **CEILINGS),
    "cutter-location": _path("cutter-location", units="mm", corner="2mm", **CEILINGS),
    "cell": _cell,
    "urdf": lambda data: arm_from_urdf("fuzzed", data),
}


def good_files(reader):
    """Small good files of the format."""
    lines = (DEMO / "seam.csv").read_bytes().split(b"\n")
    seam = b"\n".join(lines[:3] + lines[3:2000:400]) + b"\n"
    if reader in ("timed", "timed-large", "door"):
        bead = (DEMO / "bead.csv").read_bytes().split(b"\n")
        yield from (seam, seam.replace(b",", b";"), b"\n".join(bead[:9]) + b"\n")
    if reader in ("recorded",):
        yield b"\n".join(lines[:30]) + b"\n"
        yield b"\n".join([*lines[:9], lines[8], lines[10], lines[9], *lines[14:30]]) + b"\n"
    if reader in ("json-lines", "parquet", "feather", "door", "recorded"):
        from pathaudit.converting import converted

        path = door.path_of_data(b"\n".join(lines[:30]) + b"\n" if reader == "recorded" else seam, "seam")
        for kind in ("json-lines", "parquet", "feather"):
            if reader in (kind, "door", "recorded"):
                content = converted(path, kind).content
                yield content if isinstance(content, bytes) else content.encode()
    if reader == "parquet":
        yield from _plain_parquet(seam)
    if reader == "cell":
        yield from (file.read_bytes() for file in sorted(DEMO.glob("cell*.toml")))
    if reader == "urdf":
        yield (DEMO / "arm.urdf").read_bytes()
    texts = {"waypoints": "*points*.csv", "iso6983": "*.nc", "cutter-location": "*.cl"}
    if reader in texts or reader == "door":
        for pattern in [texts[reader]] if reader in texts else texts.values():
            yield from (file.read_bytes()[:3000] for file in sorted(DEMO.glob(pattern)))
    yield from MORE.get(reader, ())


MORE = {
    "waypoints": (
        b"x_mm,y_mm,z_mm,i,j,k,speed_mm_s,move,blend_mm\n0,0,0,0,0,-1,20,line,0\n50,0,0,0,0,-1,20,line,2\n60,10,0,0,0,-1,20,arc,0\n70,0,0,0,0,-1,20,arc,0\n90,9,1,0,0.6,-0.8,30,curve,0\n99,9,1,0,0,-1,30,curve,0\n",
    ),
    "iso6983": (
        b"%\nN10 G71 G90 G17 G94\nN20 G00 X0 Y0 Z5\nN30 G01 Z0 F600\nN40 X40\nN50 G02 X50 Y-10 I0 J-10\nN60 G03 X50 Y-10 Z4 I5 J5\nN65 G04 F1.5\nN70 G18 G91 G02 X5 Z5 I5 K0\nN80 M02\n",
        b"G20 G90 G94 G00 X0 Y0 Z0\nG91 G19 G03 Y1 Z1 J1 K0 F10 (a comment)\nN5 G1 X.5\n",
    ),
    "cutter-location": (
        b"PARTNO TEST ONE\nUNITS/MM\nMULTAX/ON\nFROM/0,0,100,0,0,1\nRAPID\nGOTO/10,0,5,0,0,1\nFEDRAT/600,MMPM\nGOTO/10,0,0,0,0.6,0.8 $$ here\nGOTO/60,$\n0,0,0,0,1\nGODLTA/0,5,0\nGODLTA/-5\nFINI\n",
    ),
}


def _plain_parquet(seam):
    """Without compression and dictionaries, and with nulls: other pages of the format."""
    import pyarrow
    from pyarrow import parquet

    table = pyarrow.table({"t_ms": [0, 10, 20], **{f"{c}_m": [0.0, 0.1, 0.2] for c in "xyz"}, "i": [0] * 3, "j": [0] * 3, "k": [1] * 3, "note": ["a", None, "b"]})
    for options in ({"compression": "none", "use_dictionary": False}, {"compression": "zstd", "data_page_version": "2.0", "use_dictionary": False}):
        stream = io.BytesIO()
        parquet.write_table(table, stream, **options)
        yield stream.getvalue()


def corpus(reader):
    """The cases that were found once, by name."""
    return sorted((CORPUS / reader).glob("*")) if (CORPUS / reader).is_dir() else []


def peak():
    """Bytes that this process had at most so far."""
    return 1024 * resource.getrusage(resource.RUSAGE_SELF).ru_maxrss


def one(reader, data):
    """Give the bytes to a reader: it reads them, or refuses them by the package's own error in one line, within the time. Gives the processor's seconds, which a busy machine does not stretch."""
    before, start = peak(), process_time()
    try:
        READERS[reader](data)
    except pa.PathAuditError as error:
        assert len(str(error).splitlines()) == 1 and str(error).isprintable(), repr(str(error))
        assert len(str(error)) < 3000, f"a message of {len(str(error))} letters"
    taken = process_time() - start
    assert peak() - before < MEMORY[0] + MEMORY[1] * len(data), f"{(peak() - before) >> 20} MiB for {len(data)} bytes"
    return taken
