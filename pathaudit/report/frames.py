"""An audit as pandas DataFrames."""

from dataclasses import asdict

import numpy as np

from ..arm import unit_of


def findings_frame(audit):
    """One row a finding, with the fields of the JSON report and the samples and distances behind them."""
    import pandas as pd

    from ..findings import Finding

    rename = {"t_start": "t_start_s", "t_end": "t_end_s", "worst_t": "worst_t_s"}
    columns = [rename.get(name, name) for name in Finding.__dataclass_fields__]
    rows = [{rename.get(k, k): v for k, v in asdict(f).items()} for f in audit.finding_list]
    return pd.DataFrame(rows, columns=columns)


def measures_frame(audit):
    """One row a sample: time, distance, joints, their speeds, accelerations and shares, singular values, reserve, tool, travel left."""
    import pandas as pd

    rates, arm = audit.rates, audit.cell.arm
    columns = {"t_s": audit.time, "distance_mm": audit.path.distance * 1000.0, "reached": audit.motion.reached}
    for j, name in enumerate(arm.joint_names):
        scale, unit = unit_of(arm, j)
        columns[f"{name}_{unit}"] = audit.joints[:, j] * scale
        columns[f"{name}_{unit}_s"] = rates.joint_speed[:, j] * scale
        columns[f"{name}_{unit}_s2"] = rates.joint_acceleration[:, j] * scale
        columns[f"{name}_speed_share"] = rates.speed_share[:, j]
        columns[f"{name}_acceleration_share"] = rates.acceleration_share[:, j]
        columns[f"{name}_travel_left_{unit}"] = rates.travel_left[:, j] * scale
    columns["least_travel_joint"] = _least_travel(rates.travel_left / (arm.upper - arm.lower), arm.joint_names)
    columns |= {
        "sigma_min": rates.sigma_min, "sigma_max": rates.sigma_max, "condition": rates.condition, "manipulability": rates.manipulability,
        "speed_use": rates.speed_share.max(axis=1), "reserve": rates.reserve,
        "tool_speed_mm_s": rates.tool_speed * 1000.0, "tool_speed_limit_mm_s": rates.tool_speed_limit * 1000.0,
        "deviation_mm": audit.motion.deviation_m * 1000.0, "deviation_deg": np.degrees(audit.motion.deviation_rad),
    }  # fmt: skip
    for i, name in enumerate(("x", "y", "z", "rx", "ry", "rz")):
        columns[f"lost_{name}"] = rates.lost_direction[:, i]
    return pd.DataFrame(columns)


def _least_travel(share, names):
    """The joint with the least of its travel left, '' where there is none: not reached, or all joints turn without end."""
    known = np.where(np.isfinite(share), share, np.inf)
    return np.where(np.isfinite(known).any(axis=1), np.array(names)[known.argmin(axis=1)], "")
