"""Checks whether this arm, mounted here, with this tool, can run a weld seam or a dispense bead as programmed.

>>> import pathaudit as pa
>>> audit = pa.audit(pa.read_path("seam.csv"), pa.read_cell("cell.toml"))  # doctest: +SKIP
>>> audit.verdict, audit.findings, audit.retime()  # doctest: +SKIP

The public names are loaded when they are first used.
"""

from importlib import import_module

__version__ = "0.1.0"

_HOMES = {
    "Arm": "arm",
    "Path": "taskpath",
    "path_from": "taskpath",
    "Cell": "cell",
    "Thresholds": "cell",
    "Tolerances": "tolerances",
    "read_path": "reading",
    "read_cell": "reading",
    "audit": "pipeline",
    "Audit": "pipeline",
    "study": "spread.study",
    "Study": "spread.study",
    "show": "widgets.timeline",
    "read_notes": "notes",
    "velocity_ellipsoid": "capacity",
    "velocity_polytope": "capacity",
    "force_ellipsoid": "capacity",
    "largest_force": "capacity",
    "largest_speed": "capacity",
    "PathAuditError": "errors",
    "ReadError": "errors",
    "ModelError": "errors",
}

__all__ = ["__version__", *_HOMES]


def __getattr__(name):
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value = getattr(import_module(f"{__name__}.{_HOMES[name]}"), name)
    globals()[name] = value
    return value


def __dir__():
    return sorted({*globals(), *__all__})
