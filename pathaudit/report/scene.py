"""An audit as what a timeline draws: the kept samples as float32 columns, and everything said once as plain JSON values.

The live timeline, the one-page HTML and the still pictures are all drawn from this one value.
"""

import zlib
from dataclasses import dataclass
from pathlib import PurePath

import numpy as np

from ..causes import lost_words_along
from . import origin
from .rows import groups_of, row_index, rows_of
from .skeleton import arm_facts
from .thinning import kept_of_path, spans

MOST_SAMPLES = 5000
_FINEST = 2000           # stretches nearer to each other than duration / this are drawn as one
_LATEST_START = 1e5      # s; a start beyond is a clock's date, and times are written from the first sample on
_EXACT = ("sample", "time_s", "programmed_s", "line")
_PEAKS = ("share_percent", "acceleration_percent", "sigma_min", "speed_mm_s", "speed_limit_mm_s", "factor_percent",
          "before_share_percent", "before_acceleration_percent", "before_speed_mm_s")
_PLACES = 100            # at most so many near-singular places are asked what is lost there
_ROUNDING = 10           # trailing mantissa bits dropped from everything else: 6e-5 of the value, far below a pixel


@dataclass(frozen=True, eq=False)
class Scene:
    """arrays: name -> (M, ...) float32, M kept samples; facts: JSON values, times in s after the first sample."""

    facts: dict
    arrays: dict

    def packed(self):
        """(bytes, layout): all columns in one compressed block. data.js holds the reverse; layout lists (name, columns)."""
        columns = [(name, values.reshape(len(values), -1).T) for name, values in self.arrays.items()]
        words = [_rounded(block, 0 if name in _EXACT else _ROUNDING) for name, block in columns]
        steps = np.diff(np.concatenate([w.ravel() for w in words]), prepend=np.uint32(0))
        planes = np.ascontiguousarray(steps.astype("<u4").view(np.uint8).reshape(-1, 4).T)
        return zlib.compress(planes.tobytes(), 4), [[name, len(block)] for name, block in columns]


def _rounded(block, bits):
    words = np.ascontiguousarray(block, dtype=np.float32).view(np.uint32)
    if not bits:
        return words
    mask = np.uint32((0xFFFFFFFF >> bits) << bits)
    return np.where(np.isfinite(block), (words + np.uint32(1 << (bits - 1))) & mask, words)


def scene(audit, most=MOST_SAMPLES, *, applied=None, before=None, study=None):
    """The Scene of an audit: at most `most` samples, with every peak and every finding's worst sample among them.

    applied: the Retiming that made this audit, where it is one of retimed times; its factor is shown instead of a suggestion's.
    before: the Audit of the same poses as programmed, to be drawn with it; sample for sample the same pose.
    study: of this audit under the tolerances of its cell (spread/study.py), to be drawn as bands.
    """
    again = applied or audit.suggestion
    full = _full_arrays(audit, again, applied is not None)
    if before is not None:
        full |= _before_arrays(before)
    kept = _kept(audit, full, most)
    arrays = {"sample": kept.astype(float), **{name: values[kept] for name, values in full.items()}}
    cell = audit.cell
    if study is not None and study.dimensions:
        arrays |= _band_arrays(study, kept)
    if audit.path.source_line is not None:
        arrays["line"] = audit.path.source_line[kept]
    arrays["joints"] = audit.joints[kept]
    arrays["path_m"] = audit.path.position[kept] @ cell.part[:3, :3].T + cell.part[:3, 3]
    arrays = {name: np.ascontiguousarray(values, dtype=np.float32) for name, values in arrays.items()}
    facts = _facts(audit, arrays, again, applied is not None)
    if "band_sigma_min" in arrays:
        facts["spread"] = spread_words(study)
    return Scene(plain(facts), arrays)


def spread_words(study):
    """What the bands are, in a sentence."""
    fail, many = study.chance("fail"), f"{study.draws:,} draws of {len(study.dimensions)} toleranced dimension{'s' * (len(study.dimensions) > 1)}"
    return f"Bands: 90 % of {many}, at each place by itself. Of the draws {100 * fail.share:.3g} % fail (95 % interval {100 * fail.low:.3g} to {100 * fail.high:.3g} %)."


def _full_arrays(audit, again, is_applied):
    path, rates, arm = audit.path, audit.rates, audit.cell.arm
    severity = np.zeros(path.samples)
    for finding in audit.finding_list:
        stretch = slice(finding.first, finding.last + 1)
        severity[stretch] = np.maximum(severity[stretch], 2 if finding.severity == "fail" else 1)
    factor, tool_speed = np.asarray(again.factor, dtype=float), 1e3 * rates.tool_speed
    suggested = {} if is_applied or not again.feasible or factor.min() > 0.9995 else {"suggested_speed_mm_s": factor * tool_speed}
    room = np.where(np.isfinite(arm.upper - arm.lower), arm.upper - arm.lower, np.nan)
    return {
        "time_s": audit.time - audit.time[0],
        "distance_mm": 1e3 * path.distance,
        "share_percent": 100 * rates.speed_share,
        "sigma_min": rates.sigma_min,
        "acceleration_percent": 100 * rates.acceleration_share,
        "travel_percent": 100 * (audit.joints - arm.lower) / np.where(room > 0, room, np.nan),
        "speed_mm_s": tool_speed,
        **suggested,
        "speed_limit_mm_s": 1e3 * rates.tool_speed_limit,
        "reserve": rates.reserve,
        "factor_percent": 100 * factor,
        "severity": severity,
        "process": path.process.astype(float),
    }


def _before_arrays(before):
    rates = before.rates
    return {
        "programmed_s": before.time - before.time[0],
        "before_share_percent": 100 * rates.speed_share,
        "before_acceleration_percent": 100 * rates.acceleration_share,
        "before_speed_mm_s": 1e3 * rates.tool_speed,
    }


def _band_arrays(study, kept):
    """The edges of the bands at the kept samples: lower ones in the first half of the columns, upper ones in the second; NaN where poses are not reached."""
    bands = study.bands.at(kept)
    share, sigma = 100 * bands.speed_share[[0, 2]], bands.sigma_min[[0, 2]]
    return {"band_share_percent": np.where(np.isfinite(share).all(axis=0), share, np.nan).transpose(1, 0, 2).reshape(len(kept), -1),
            "band_sigma_min": np.where(sigma[0] > 0, sigma, np.nan).T}


def _kept(audit, full, most):
    drawn = [name for name in _PEAKS if name in full]
    series = np.column_stack([full[name] for name in drawn])
    findings = audit.finding_list
    always = [f.worst for f in findings] + [f.first for f in findings] + [f.last for f in findings]
    return kept_of_path(audit.motion.reached, series, most, always)


def _facts(audit, arrays, again, is_applied):
    path, cell = audit.path, audit.cell
    names = tuple(cell.arm.joint_names)
    time, gap = audit.time - audit.time[0], path.duration / _FINEST
    return {
        "name": cell.name, "file": PurePath(path.file).name, "verdict": audit.verdict,
        "samples": int(path.samples), "shown": len(arrays["sample"]), "offset_s": clock_offset(audit),
        "duration_s": float(path.duration), "length_mm": 1e3 * float(path.length), "joints": list(names),
        "rows": [row.as_dict() for row in rows_of(cell.arm, cell.thresholds, arrays)],
        "groups": [group.as_dict() for group in groups_of(cell.arm, cell.thresholds, arrays, audit.finding_list, is_applied)],
        "findings": [_finding(k, f, audit, arrays, names) for k, f in enumerate(audit.finding_list, 1)],
        "air": spans(~path.process, time, gap).tolist(), "gaps": spans(~audit.motion.reached, time, gap).tolist(),
        "lost": _lost(audit, arrays), "retiming": _retiming(again, is_applied), "base": cell.placement.tolist(), "part": cell.part.tolist(), **arm_facts(cell),
    }


def _finding(number, finding, audit, arrays, names):
    start = audit.time[0]
    return {
        "number": number, "kind": finding.kind, "severity": finding.severity, "joint": finding.joint or "",
        "from_s": float(finding.t_start - start), "to_s": float(finding.t_end - start), "worst_s": float(finding.worst_t - start),
        "from_mm": float(finding.from_mm), "to_mm": float(finding.to_mm), "worst": worst_text(finding), "why": finding.why,
        "line": origin.sentence(audit, finding), "first": finding.first, "last": finding.last,
        "at": int(np.abs(arrays["sample"] - finding.worst).argmin()), "row": row_index(finding, names),
    }


def _lost(audit, arrays):
    """[first sample, last sample, words] of near-singular pieces: what the tool can hardly do there. Pieces very near to each other are one."""
    sample = arrays["sample"].astype(int)
    near = np.flatnonzero(arrays["sigma_min"] < audit.cell.thresholds.sigma_min_warn)
    if not len(near):
        return []
    asked = np.arange(0, len(near), -(-len(near) // _PLACES))
    words, gap = lost_words_along(audit.rates, sample[near[asked]]), len(sample) // 500 + 1
    found = []
    for k, place in enumerate(near.tolist()):
        said = words[int(np.searchsorted(asked, k, side="right")) - 1]
        if found and found[-1][2] == said and place - found[-1][1] <= gap:
            found[-1][1] = place
        else:
            found.append([place, place, said])
    return [[int(sample[first]), int(sample[last]), said] for first, last, said in found]


def clock_offset(audit):
    """What is added to times after the first sample before they are written: the path's own start, but not a clock's date."""
    start = float(audit.time[0])
    return start if abs(start) < _LATEST_START else 0.0


def worst_text(finding):
    """The worst value beside its limit, in the finding's unit: "213 deg/s (limit 180)"."""
    value, limit, unit = significant(finding.value), significant(finding.limit), finding.unit.strip()
    if not value:
        return ""
    return f"{value} {unit}".strip() + (f" (limit {limit})" if limit else "")


def significant(number, digits=4):
    """A number as people write it: so many significant digits, no exponent, nothing for NaN and infinity."""
    if number is None or not np.isfinite(number):
        return ""
    if number == 0 or abs(number) < 1e-9:
        return "0"
    places = max(0, digits - 1 - int(np.floor(np.log10(abs(number)))))
    text = f"{number:.{min(places, 9)}f}"
    return text.rstrip("0").rstrip(".") if "." in text else text


def plain(value):
    """Nested lists and dicts without NaN and infinity, which JSON does not have: None stands for them."""
    if isinstance(value, dict):
        return {key: plain(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [plain(item) for item in value]
    return None if isinstance(value, float) and not np.isfinite(value) else value


def _retiming(again, is_applied):
    return {"style": again.style, "feasible": bool(again.feasible), "why": again.why, "duration_s": float(again.duration),
            "slowest_percent": 100 * float(again.slowest), "applied": is_applied}
