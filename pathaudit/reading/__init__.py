"""Files in: one module a format, and this one door. Each format is loaded when it is first read."""


def read_path(
    file, format=None, *, axis=None, inch_codes=False, units=None, speed_mm_s=None, acceleration_mm_s2=None, turn_speed_deg_s=None,
    turn_acceleration_deg_s2=None, corner=None, chord_mm=None, angle_deg=None, step_s=None, smooth_ms=None,
):  # fmt: skip
    """The path in a file -> taskpath.Path. Raises ReadError, or ModelError for a choice that makes no sense.

    The file's content says what it is; `format` (a key of reading.options.FORMATS) asks for one. The other choices are those of
    reading.options.ReadOptions; where a file needs one that was not made, the error names it.

    >>> path = read_path("seam.csv")  # doctest: +SKIP
    """
    from .door import path_of_file
    from .options import ReadOptions

    return path_of_file(file, ReadOptions(
        format, axis, inch_codes, units, speed_mm_s, acceleration_mm_s2, turn_speed_deg_s, turn_acceleration_deg_s2, corner, chord_mm, angle_deg,
        step_s, smooth_ms,
    ))  # fmt: skip


def read_cell(file):
    """A cell (TOML) and the arm it names -> cell.Cell. Raises ReadError or ModelError."""
    from .cell_toml import read_cell_toml

    return read_cell_toml(file)


def read_urdf(file, base=None, tip=None):
    """The serial chain between two links of a URDF file -> arm.Arm. Raises ReadError or ModelError."""
    from .urdf import read_urdf_arm

    return read_urdf_arm(file, base, tip)
