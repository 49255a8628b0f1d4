"""Makes the demo's paths without times from the same two parts: points with a speed, machine code, cutter-location text.

`python tests/make_samples.py` writes them to the demo and to notebooks/.
"""

import math
import shutil

import make_demo as demo
from make_demo import BEAD_AVERAGED, BEAD_SPEED, CORNER_RADIUS, DEMO, HOUSING, LEAD, NOTEBOOKS, NOZZLE_CLOSE, NOZZLE_OPEN, OVERLAP, SEAM, TRAIL_ANGLE

ROUND = 8.0  # mm around the ends of the seam's corner within which the torch's turning is evened out


def seam_points():
    """The seam of seam.csv as points: each leg and the corner are an arc through a middle point."""
    rows = ["# The foot of the bent wall as points with a speed: two legs and the corner between them, each an arc through a middle point."]
    rows += ["# blend_mm evens out how the torch turns where an arc ends. All moves with process 0 are air moves.",
             "x_mm,y_mm,z_mm,qw,qx,qy,qz,speed_mm_s,move,blend_mm,dwell_s,process,label"]  # fmt: skip
    total = demo.seam_length()
    rows += [point(0.0, LEAD, 200, "", "", "", 0, "lead-in"), point(0.0, 0.0, 200, "line", "", demo.ARC_ON, 0, "lead-in")]
    at = 0.0
    for (length, _), label, blend in zip(SEAM, ("first leg", "corner", "second leg"), (ROUND, ROUND, ""), strict=True):
        rows += [point(at + length / 2.0, 0.0, demo.WELD_SPEED, "arc", "", "", 1, label, bare=label != "corner")]
        at += length
        rows += [point(at, 0.0, demo.WELD_SPEED, "arc", blend, demo.CRATER_FILL if label == "second leg" else "", 1, label)]
    rows += [point(total, LEAD, 200, "line", "", "", 0, "lead-out")]
    return "\n".join(rows) + "\n"


def point(s, height, speed, move, blend, dwell, process, label, bare=False):
    """One row: the torch at s along the seam, lifted by `height`; bare leaves its orientation out."""
    x, y, z, away = demo.torch(s)
    place = demo.mix((1.0, (*demo.walk(SEAM, demo.SEAM_START, demo.SEAM_HEADING, s)[:2], 0.0)), (height, away))
    turned = [""] * 4 if bare else [f"{value:z.8f}" for value in demo.quaternion(x, y, z)]
    return ",".join([*(f"{value:z.4f}" for value in place), *turned, f"{speed:g}", move, *(f"{v:g}" if v != "" else "" for v in (blend, dwell)), str(process), label])


def bead_program():
    """The gasket bead of bead.csv as machine code, the nozzle upright."""
    long, short, r = HOUSING[0], HOUSING[1], CORNER_RADIUS
    blocks = [
        "%", "(gasket bead around a housing, nozzle upright)", "N10 G71 G90 G17 G94", f"N20 G00 X{long / 2:.1f} Y0.0 Z{LEAD:.1f}", "N30 Z0.0",
        f"N40 G04 F{NOZZLE_OPEN:g} (nozzle opens)", f"N50 G01 X{long - r:.1f} F{60 * BEAD_SPEED:.1f}", f"N60 G03 X{long:.1f} Y{r:.1f} I0.0 J{r:.1f}",
        f"N70 G01 Y{short - r:.1f}", f"N80 G03 X{long - r:.1f} Y{short:.1f} I{-r:.1f} J0.0", f"N90 G01 X{r:.1f}", f"N100 G03 X0.0 Y{short - r:.1f} I0.0 J{-r:.1f}",
        f"N110 G01 Y{r:.1f}", f"N120 G03 X{r:.1f} Y0.0 I{r:.1f} J0.0", f"N130 G01 X{long / 2 + OVERLAP:.1f} (overlap)", f"N140 G04 F{NOZZLE_CLOSE:g} (nozzle closes)",
        f"N150 G00 Z{LEAD:.1f}", "N160 M30", "%",
    ]  # fmt: skip
    return "\n".join(blocks) + "\n"


def bead_corner():
    """One side and one corner of that bead as cutter-location text, the nozzle leaning back."""
    arcs, end = demo.bead_arcs(), HOUSING[0] / 2.0 - CORNER_RADIUS + CORNER_RADIUS * math.pi / 2.0 + 60.0
    straight = HOUSING[0] / 2.0 - CORNER_RADIUS
    stops = [0.0, straight - BEAD_AVERAGED, straight - BEAD_AVERAGED / 2.0, *(straight + k / 15.0 * CORNER_RADIUS * math.pi / 2.0 for k in range(16)),
             end - 60.0 + BEAD_AVERAGED / 2.0, end - 60.0 + BEAD_AVERAGED, end]  # fmt: skip
    lines = ["PARTNO HOUSING, ONE CORNER OF THE GASKET", "$$ i,j,k points from the nozzle's tip to its holder", "UNITS/MM", "MULTAX/ON", f"FROM/{location(arcs, 0.0, LEAD)}",
             "RAPID", f"GOTO/{location(arcs, 0.0, 0.0)}", f"FEDRAT/{60 * BEAD_SPEED:g},MMPM"]  # fmt: skip
    lines += [f"GOTO/{location(arcs, s, 0.0)}" for s in stops[1:]]
    lines += ["RAPID", f"GOTO/{location(arcs, end, LEAD, split=True)}", "FINI"]
    return "\n".join(lines) + "\n"


def location(arcs, s, height, split=False):
    x, y, _ = demo.walk(arcs, (HOUSING[0] / 2.0, 0.0), 0.0, s)
    heading = demo.averaged_heading(arcs, 0.0, s, BEAD_AVERAGED)
    lean = math.sin(TRAIL_ANGLE)
    place = ",".join(f"{value:z.4f}" for value in (x, y, height))
    return place + (",$\n     " if split else ",") + ",".join(f"{value:z.8f}" for value in (lean * math.cos(heading), lean * math.sin(heading), math.cos(TRAIL_ANGLE)))


MADE = {"seam-points.csv": seam_points, "bead.nc": bead_program, "bead-corner.cl": bead_corner}


def main():
    for name, make in MADE.items():
        (DEMO / name).write_bytes(make().encode())
        shutil.copyfile(DEMO / name, NOTEBOOKS / name)


if __name__ == "__main__":
    main()
