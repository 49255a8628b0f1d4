"""Makes the demo's two paths from their geometry.

`python tests/make_demo.py` writes them, runs the notebooks, copies the demo to notebooks/ and draws the README's picture.

Closed forms in plain Python floats, so that the files come out the same everywhere. Lengths in mm, angles in rad, times in s. Both
parts are invented. The seam: the foot of a bent wall on a floor sheet, welded from inside the bend. The bead: a gasket on a housing.
"""

import json
import math
import shutil
from pathlib import Path

ROOT = Path(__file__).parents[1]
DEMO = ROOT / "pathaudit" / "demo"
NOTEBOOKS = ROOT / "notebooks"

SEAM_START, SEAM_HEADING = (60.0, 50.0), math.radians(35.0)
SEAM = ((610.0, 1 / 1100), (20.0 * math.radians(80.0), 1 / 20.0), (562.0, -1 / 850))
"""(length, curvature) of each arc, seen from above; positive curvature turns left. The second is the corner."""

WELD_SPEED, WELD_RAMP = 24.0, 0.3  # MAG on thin sheet; the corner at the same speed
ARC_ON, CRATER_FILL = 0.4, 0.3  # the torch stands still
WORK_ANGLE = math.radians(45.0)  # between the floor sheet and the plane of seam and torch
PUSH_ANGLE = math.radians(10.0)  # the wire leans forward along the seam
SPIN = math.radians(-140.0)  # of the torch about its wire, from the neck's bend straight back along the seam
SEAM_AVERAGED = 24.0  # the torch's heading is the mean of the seam's over this length before and after
SEAM_STEP = 0.025

HOUSING, CORNER_RADIUS, OVERLAP = (360.0, 240.0), 30.0, 12.0
BEAD_SPEED, BEAD_RAMP = 100.0, 0.1
NOZZLE_OPEN, NOZZLE_CLOSE = 0.15, 0.1
TRAIL_ANGLE = math.radians(8.0)  # the nozzle leans back from the normal, so that the bead is laid behind it
BEAD_AVERAGED = 20.0
BEAD_STEP = 0.01

AIR_SPEED, AIR_RAMP, LEAD = 200.0, 0.25, 150.0


def ramp_area(x):
    """Integral from 0 to x <= 1 of 10 x^3 - 15 x^4 + 6 x^5, a rise from 0 to 1 with two derivatives of zero at both ends."""
    return x**4 * (2.5 + x * (-3.0 + x))


def move_time(length, speed, ramp):
    """Duration of a move from rest to rest."""
    return length / speed + ramp


def travelled(t, length, speed, ramp):
    """Distance at time t of a move from rest to rest that reaches `speed` in `ramp` seconds."""
    total = move_time(length, speed, ramp)
    if t <= 0.0:
        return 0.0
    if t < ramp:
        return speed * ramp * ramp_area(t / ramp)
    if t <= total - ramp:
        return speed * (t - ramp / 2.0)
    return length - speed * ramp * ramp_area((total - t) / ramp) if t < total else length


def walk(arcs, start, heading, s):
    """(x, y) and heading after s along arcs (length, curvature) that follow each other without a kink."""
    (x, y), last = start, len(arcs) - 1
    for number, (length, curvature) in enumerate(arcs):
        step = s if number == last else min(s, length)
        turned = heading + curvature * step
        if curvature:
            x += (math.sin(turned) - math.sin(heading)) / curvature
            y -= (math.cos(turned) - math.cos(heading)) / curvature
        else:
            x += step * math.cos(heading)
            y += step * math.sin(heading)
        heading, s = turned, s - step
    return x, y, heading


def smooth_rise(x, reach):
    """max(x, 0) averaged from x - reach to x + reach with the weight 15/16 (1 - u^2)^2."""
    if abs(x) >= reach:
        return max(x, 0.0)
    u = x / reach
    return reach * (15.0 / 16.0 * (u**2 / 2.0 - u**4 / 6.0 + u**6 / 30.0) + u / 2.0 + 5.0 / 32.0)


def averaged_heading(arcs, heading, s, reach):
    """The heading at s averaged from s - reach to s + reach; the first and the last arc go on beyond their ends."""
    at = before = 0.0
    for number, (length, curvature) in enumerate(arcs):
        heading += (curvature - before) * (smooth_rise(s - at, reach) if number else s)
        at, before = at + length, curvature
    return heading


def dot(a, b):
    return sum(p * q for p, q in zip(a, b, strict=True))


def cross(a, b):
    return (a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0])


def mix(*terms):
    """Sum of factor * vector."""
    return tuple(sum(factor * vector[k] for factor, vector in terms) for k in range(3))


def unit(v):
    return mix((1.0 / math.sqrt(dot(v, v)), v))


def quaternion(x, y, z):
    """(w, x, y, z) of the frame with these axes; the largest of the four is positive."""
    squares = (1.0 + x[0] + y[1] + z[2], 1.0 + x[0] - y[1] - z[2], 1.0 - x[0] + y[1] - z[2], 1.0 - x[0] - y[1] + z[2])
    rows = (
        (squares[0], y[2] - z[1], z[0] - x[2], x[1] - y[0]),
        (y[2] - z[1], squares[1], x[1] + y[0], z[0] + x[2]),
        (z[0] - x[2], x[1] + y[0], squares[2], y[2] + z[1]),
        (x[1] - y[0], z[0] + x[2], y[2] + z[1], squares[3]),
    )
    largest = max(range(4), key=squares.__getitem__)
    size = math.sqrt(dot(rows[largest], rows[largest]))
    return tuple(value / size for value in rows[largest])


def torch(s):
    """The torch at s along the seam: its axes x, y, z (z out along the wire) and the direction in which it comes and leaves."""
    heading = averaged_heading(SEAM, SEAM_HEADING, s, SEAM_AVERAGED)
    along, inside, up = (math.cos(heading), math.sin(heading), 0.0), (-math.sin(heading), math.cos(heading), 0.0), (0.0, 0.0, 1.0)
    away = mix((math.cos(WORK_ANGLE), inside), (math.sin(WORK_ANGLE), up))
    wire = mix((-math.cos(PUSH_ANGLE), away), (math.sin(PUSH_ANGLE), along))
    back = unit(mix((-1.0, along), (dot(along, wire), wire)))
    x = mix((math.cos(SPIN), back), (math.sin(SPIN), cross(wire, back)))
    return x, cross(wire, x), wire, away


def seam_length():
    return sum(length for length, _ in SEAM)


def seam_row(t):
    """One sample of the weld path."""
    on = move_time(LEAD, AIR_SPEED, AIR_RAMP)
    start = on + ARC_ON
    stop = start + move_time(seam_length(), WELD_SPEED, WELD_RAMP)
    off = stop + CRATER_FILL
    s = travelled(t - start, seam_length(), WELD_SPEED, WELD_RAMP)
    height = LEAD - travelled(t, LEAD, AIR_SPEED, AIR_RAMP) if t < start else travelled(t - off, LEAD, AIR_SPEED, AIR_RAMP)
    corner = (SEAM[0][0], SEAM[0][0] + SEAM[1][0])
    leg = "first leg" if s < corner[0] else "corner" if s <= corner[1] else "second leg"
    label = next(word for end, word in ((on, "lead-in"), (start, "arc on"), (stop, leg), (off, "crater fill"), (math.inf, "lead-out")) if t < end)
    x, y, z, away = torch(s)
    place = mix((1.0, (*walk(SEAM, SEAM_START, SEAM_HEADING, s)[:2], 0.0)), (height, away))
    return t, *place, *quaternion(x, y, z), int(on <= t < off), label


def seam_rows():
    total = 2.0 * move_time(LEAD, AIR_SPEED, AIR_RAMP) + ARC_ON + CRATER_FILL + move_time(seam_length(), WELD_SPEED, WELD_RAMP)
    return [seam_row(k * SEAM_STEP) for k in range(math.ceil(total / SEAM_STEP) + 1)]


def bead_arcs():
    """The loop from the middle of a long side, anticlockwise, and on over the start."""
    long, short = HOUSING[0] - 2.0 * CORNER_RADIUS, HOUSING[1] - 2.0 * CORNER_RADIUS
    turn = (CORNER_RADIUS * math.pi / 2.0, 1.0 / CORNER_RADIUS)
    return ((long / 2.0, 0.0), turn, (short, 0.0), turn, (long, 0.0), turn, (short, 0.0), turn, (long / 2.0 + OVERLAP, 0.0))


def bead_row(t):
    """One sample of the dispense path."""
    arcs = bead_arcs()
    length = sum(arc for arc, _ in arcs)
    on = move_time(LEAD, AIR_SPEED, AIR_RAMP)
    start = on + NOZZLE_OPEN
    stop = start + move_time(length, BEAD_SPEED, BEAD_RAMP)
    off = stop + NOZZLE_CLOSE
    s = travelled(t - start, length, BEAD_SPEED, BEAD_RAMP)
    height = LEAD - travelled(t, LEAD, AIR_SPEED, AIR_RAMP) if t < start else travelled(t - off, LEAD, AIR_SPEED, AIR_RAMP)
    x, y, _ = walk(arcs, (HOUSING[0] / 2.0, 0.0), 0.0, s)
    heading = averaged_heading(arcs, 0.0, s, BEAD_AVERAGED)
    lean = math.sin(TRAIL_ANGLE)
    return t, x, y, height, -lean * math.cos(heading), -lean * math.sin(heading), -math.cos(TRAIL_ANGLE), int(on <= t < off)


def bead_rows():
    total = 2.0 * move_time(LEAD, AIR_SPEED, AIR_RAMP) + NOZZLE_OPEN + NOZZLE_CLOSE + move_time(sum(arc for arc, _ in bead_arcs()), BEAD_SPEED, BEAD_RAMP)
    return [bead_row(k * BEAD_STEP) for k in range(math.ceil(total / BEAD_STEP) + 1)]


def text(comments, columns, formats, rows):
    lines = [*(f"# {comment}" for comment in comments), ",".join(columns)]
    lines += [",".join(format(value, spec) for value, spec in zip(row, formats, strict=True)) for row in rows]
    return "\n".join(lines) + "\n"


def seam_csv():
    comments = (
        "Fillet weld: a bent wall on a floor sheet, two curved legs and a corner of 80 deg with a radius of 20 mm, welded from inside.",
        "Tool centre point and torch in the part frame. 24 mm/s, work angle 45 deg, push angle 10 deg. label says what goes on.",
    )
    columns = ("t_s", "x_mm", "y_mm", "z_mm", "qw", "qx", "qy", "qz", "process", "label")
    return text(comments, columns, ("z.3f", "z.4f", "z.4f", "z.4f", "z.8f", "z.8f", "z.8f", "z.8f", "d", "s"), steady(seam_rows()))


def steady(rows):
    """The same rows, each quaternion with the sign that is nearer to the one before."""
    before = rows[0][4:8]
    for row in rows:
        sign = 1.0 if dot(before, row[4:8]) >= 0.0 else -1.0
        before = tuple(sign * value for value in row[4:8])
        yield (*row[:4], *before, *row[8:])


def bead_csv():
    comments = (
        "Gasket bead around a housing of 360 x 240 mm, corners with a radius of 30 mm, 12 mm of overlap. 100 mm/s.",
        "i,j,k is the nozzle's axis in the part frame, leaning back 8 deg from the normal; how the nozzle is turned about it is free.",
    )
    columns = ("t_s", "x_mm", "y_mm", "z_mm", "i", "j", "k", "process")
    return text(comments, columns, ("z.3f", "z.4f", "z.4f", "z.4f", "z.8f", "z.8f", "z.8f", "d"), bead_rows())


def bead_jsonl():
    """The bead at every fourth sample."""
    names = ("t_s", "x_mm", "y_mm", "z_mm", "i", "j", "k", "process")
    rows = ((*(round(value, 6) for value in row[:-1]), row[-1]) for row in bead_rows()[::4])
    return "".join(json.dumps(dict(zip(names, row, strict=True))) + "\n" for row in rows)


def bead_recorded_csv():
    """The bead as a recorder on the line might have seen it: a clock of whole milliseconds that starts anywhere, noise, and all that goes wrong."""
    noise, rows = noise_of(7), []
    for number, row in enumerate(bead_rows()[::2]):
        time = 81_204_000 + 1000.0 * row[0] + 2.0 * next(noise)
        rows.append((round(time), *(value + 0.03 * next(noise) for value in row[1:4]), *row[4:7], row[7]))
        if number in (100, 260, 261, 500):
            rows[-1] = (rows[-1][0], *rows[-2][1:])  # a pose that was not read anew
    lines = [",".join(format(value, spec) for value, spec in zip(row, ("d", "z.3f", "z.3f", "z.3f", "z.5f", "z.5f", "z.5f", "d"), strict=True)) for row in rows]
    lines[150] = lines[150].split(",")[0] + ",,,,,,," + lines[150][-1]
    lines[320], lines[321] = lines[321], lines[320]
    lines[400:400] = [lines[399]]
    del lines[430:436]
    head = ["# Recorded on the line, every 20 ms. Read it as: pathaudit check bead-recorded.csv --format recorded --cell cell-bead.toml", "t_ms,x_mm,y_mm,z_mm,i,j,k,process"]
    return "\n".join([*head, *lines]) + "\n"


def noise_of(seed):
    """Numbers of mean 0 and variance 1/2, the same everywhere: sums of six from a linear congruential generator (Knuth's MMIX constants)."""
    while True:
        total = 0.0
        for _ in range(6):
            seed = (6364136223846793005 * seed + 1442695040888963407) % 2**64
            total += seed / 2**64
        yield total - 3.0


MADE = {"seam.csv": seam_csv, "bead.csv": bead_csv, "bead.jsonl": bead_jsonl, "bead-recorded.csv": bead_recorded_csv}
TABLES = {"bead.parquet": "parquet", "bead.feather": "feather"}
"""The same samples as bead.jsonl; their bytes depend on the library that writes them."""


def write_tables(folder):
    from pathaudit.converting import converted
    from pathaudit.reading import read_path

    for name, kind in TABLES.items():
        (folder / name).write_bytes(converted(read_path(folder / "bead.jsonl"), kind).content)


NOTEBOOK_NAMES = ("01-check-a-seam.ipynb", "02-try-other-speeds.ipynb", "03-hand-over-with-notes.ipynb", "06-a-verdict-that-holds.ipynb")


def run_notebook(folder, name):
    """A notebook of the demo in `folder` with the outputs of a run there, and without the traces of when and how it ran."""
    import nbformat
    from nbclient import NotebookClient

    from pathaudit.kernels import clocks, linkage, rates, steps  # noqa: F401  compiled here, so that the notebook need not tell of it

    notebook = nbformat.read(folder / name, 4)
    NotebookClient(notebook, timeout=120, resources={"metadata": {"path": str(folder)}}, store_widget_state=False).execute()
    for cell in notebook.cells:
        cell.metadata.pop("execution", None)
    notebook.metadata["language_info"] = {"name": "python"}
    return notebook


def draw_picture(file):
    """The picture in the README: the seam's audit as the widget leaves it where no kernel runs."""
    import pathaudit as pa
    from pathaudit.report.scene import scene
    from pathaudit.report.still import png_picture

    audit = pa.audit(pa.read_path(DEMO / "seam.csv"), pa.read_cell(DEMO / "cell.toml"))
    file.parent.mkdir(exist_ok=True)
    file.write_bytes(png_picture(scene(audit)))


def main():
    import nbformat

    for name, make in MADE.items():
        (DEMO / name).write_bytes(make().encode())
    write_tables(DEMO)
    for name in NOTEBOOK_NAMES:
        nbformat.write(run_notebook(DEMO, name), DEMO / name)
    NOTEBOOKS.mkdir(exist_ok=True)
    for file in sorted(DEMO.iterdir()):
        if file.is_file() and not file.name.startswith((".", "__")):
            shutil.copyfile(file, NOTEBOOKS / file.name)
    draw_picture(NOTEBOOKS / "pictures" / "seam.png")


if __name__ == "__main__":
    main()
