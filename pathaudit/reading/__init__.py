"""Files in: one module a format, and this one door. Each format is loaded when it is first read."""


def read_path(file):
    """A timed path (CSV) -> taskpath.Path. Raises ReadError.

    >>> path = read_path("seam.csv")  # doctest: +SKIP
    """
    from .timed_csv import read_timed_csv

    return read_timed_csv(file)


def read_cell(file):
    """A cell (TOML) and the arm it names -> cell.Cell. Raises ReadError or ModelError."""
    from .cell_toml import read_cell_toml

    return read_cell_toml(file)


def read_urdf(file, base=None, tip=None):
    """The serial chain between two links of a URDF file -> arm.Arm. Raises ReadError or ModelError."""
    from .urdf import read_urdf_arm

    return read_urdf_arm(file, base, tip)
