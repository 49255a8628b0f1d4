"""Files in: one module a format, and this one door. Each format is loaded when it is first read."""


def read_path(file):
    """A timed path (CSV) -> taskpath.Path. Raises ReadError.

    >>> path = read_path("seam.csv")  # doctest: +SKIP
    """
    from dataclasses import replace

    from .sources import hash_meanwhile, read_all
    from .timed_csv import EXPECTED, read_timed_csv

    data = read_all(file, EXPECTED)
    with hash_meanwhile(data) as sha256:
        return replace(read_timed_csv(data, file, ""), sha256=sha256())


def read_cell(file):
    """A cell (TOML) and the arm it names -> cell.Cell. Raises ReadError or ModelError."""
    from .cell_toml import read_cell_toml

    return read_cell_toml(file)


def read_urdf(file, base=None, tip=None):
    """The serial chain between two links of a URDF file -> arm.Arm. Raises ReadError or ModelError."""
    from .urdf import read_urdf_arm

    return read_urdf_arm(file, base, tip)
