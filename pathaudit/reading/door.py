"""From a file to a path: what the content is, the reader that it needs, and the choices that belong to it."""

from dataclasses import fields, replace
from importlib import import_module

import numpy as np

from ..conventions import DEG, MM
from ..errors import ModelError, ReadError
from ..taskpath import Path
from . import sources
from .options import FORMATS, ReadOptions
from .sniffing import A_FILE, sniff

READERS = {
    "timed": ("timed_csv", "read_timed_csv"),
    "waypoints": ("waypoints", "read_waypoints"),
    "iso6983": ("machine_code", "read_machine_code"),
    "cutter-location": ("cutter_location", "read_cutter_location"),
    "parquet": ("tables", "read_parquet"),
    "feather": ("tables", "read_feather"),
    "json-lines": ("json_lines", "read_json_lines"),
    "recorded": ("recorded", "read_recorded"),
}
"""Format: the module and its function (data, name, sha256, options) -> Path or Course."""

_SAMPLING = {"speed_mm_s", "acceleration_mm_s2", "turn_speed_deg_s", "turn_acceleration_deg_s2", "corner", "chord_mm", "angle_deg", "step_s"}
USES = {
    "waypoints": {"axis", *_SAMPLING},
    "iso6983": {"axis", "inch_codes", "units", *_SAMPLING},
    "cutter-location": {"axis", "units", *_SAMPLING},
    "recorded": {"smooth_ms"},
}
"""The choices that a format has, beside `format` itself."""

TABLES_OF_SAMPLES = {"timed", "parquet", "feather", "json-lines"}
"""The formats in which a recorded path may come."""


def path_of_file(file, options: ReadOptions) -> Path:
    """The path in a file. Raises ReadError or ModelError."""
    data = sources.read_all(file, FORMATS.get(options.format, A_FILE))
    return path_of_data(data, file, options, lambda: sources.hash_of(data))


def path_of_data(data, name, options: ReadOptions = ReadOptions(), sha256=lambda: "") -> Path:
    """The path in the bytes of a file; `name` stands in messages, sha256() gives the hash. Raises ReadError or ModelError."""
    kind = options.format or sniff(name, data)
    _check_choices(kind, options)
    module, function = READERS[kind]
    read = getattr(import_module(f"{__package__}.{module}"), function)
    large_table = kind == "timed" and len(data) >= sources.LARGE
    try:
        path = read(data if large_table else data[:], name, "" if large_table else sha256(), options)
        if not isinstance(path, Path):
            path = _timed(path, options)
    except ReadError as error:
        raise _explained(error, name, data, kind, options) from None
    return path if path.sha256 else replace(path, sha256=sha256())


def _check_choices(kind, options):
    """Refuse a choice that the format has no use for: nothing is left aside without a word."""
    for field in fields(options):
        value = getattr(options, field.name)
        if field.name != "format" and value not in (None, False) and field.name not in USES.get(kind, ()):
            having = [FORMATS[name] for name, choices in USES.items() if field.name in choices]
            raise ModelError(field.name, value, f"no such choice for {FORMATS[kind]}; it belongs to {', '.join(having)}")


def _explained(error, name, data, kind, options):
    """The error, with what the file was taken for where that is not plain, and with the mend of a hole in a log."""
    words = [_taken_for(name, data, kind, options)]
    if kind in TABLES_OF_SAMPLES and import_module(f"{__package__}.recorded").leaves_out(error.where.rpartition("column ")[2], error.found):
        words.append("a recorded log with holes is repaired with --format recorded")
    words = "; ".join(filter(None, words))
    return ReadError(error.file, error.where, error.found, f"{error.expected} ({words})") if words else error


def _taken_for(name, data, kind, options):
    """In words, or ''."""
    if options.format is None:
        return "" if kind == "timed" else f"taken for {FORMATS[kind]}"
    try:
        seen = sniff(name, data)
    except ReadError:
        return ""
    same = seen == kind or kind == "recorded" and seen in TABLES_OF_SAMPLES
    return "" if same else f"the content looks like {FORMATS[seen]}"


def _timed(course, options):
    """The samples of untimed geometry, by the choices that were made."""
    from .. import course as courses

    scale = {
        "speed": (options.speed_mm_s, MM), "acceleration": (options.acceleration_mm_s2, MM), "turn_speed": (options.turn_speed_deg_s, DEG),
        "turn_acceleration": (options.turn_acceleration_deg_s2, DEG), "chord": (options.chord_mm, MM), "angle": (options.angle_deg, DEG),
        "step": (options.step_s, 1.0),
    }  # fmt: skip
    choices = {key: float(np.multiply(value, unit)) for key, (value, unit) in scale.items() if value is not None}
    if options.corner is not None:
        choices["corner"] = courses.corner_from(options.corner)
    return courses.timed(course, **choices)
