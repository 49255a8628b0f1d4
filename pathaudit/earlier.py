"""An earlier report: the JSON that `check` wrote, read back, signed, and tested for being what was signed."""

import hashlib
import json
from dataclasses import dataclass, replace
from datetime import UTC, datetime

from .errors import ReadError, quoted
from .findings import Finding
from .reading.json_text import read_json

FORMAT = "pathaudit.check/1"
_FIELDS = {"t_start": "t_start_s", "t_end": "t_end_s", "worst_t": "worst_t_s"}
_NUMBERS = ("t_start", "t_end", "worst_t", "value", "limit", "from_mm", "to_mm")
_KINDS = {"path": dict, "cell": dict, "findings": list, "verdict": str}


@dataclass(frozen=True)
class Signature:
    """Who stands for a report: name, date (UTC), a remark, and the hash of the report that was signed."""

    by: str
    on: str
    remark: str
    covers: str


@dataclass(frozen=True, eq=False)
class Earlier:
    """A report of an earlier check: file, values (the JSON as it is), findings (Finding with no sample numbers), signature or None."""

    file: str
    values: dict
    findings: tuple
    signature: Signature | None

    @property
    def intact(self) -> bool:
        """Whether a signed report still says what was signed."""
        return self.signature is not None and self.signature.covers == digest(self.values)


def read_earlier(file) -> Earlier:
    """Read a report that `pathaudit check --json` or `pathaudit sign` wrote. Raises ReadError."""
    return earlier_from(read_json(file, "a report that pathaudit check --json has written"), file)


def earlier_from(values, file="values") -> Earlier:
    """The same from the JSON's values."""
    if not isinstance(values, dict) or values.get("format") != FORMAT:
        found = quoted(str(values.get("format"))) if isinstance(values, dict) else type(values).__name__
        raise ReadError(file, "key format", found, f'"{FORMAT}"')
    for key, kind in _KINDS.items():
        if not isinstance(values.get(key), kind):
            raise ReadError(file, f"key {key}", type(values.get(key)).__name__, f"a JSON {'object' if kind is dict else 'list' if kind is list else 'text'}")
    findings = tuple(_finding(file, k, finding) for k, finding in enumerate(values["findings"], 1))
    return Earlier(str(file), values, findings, _signature(file, values.get("signed")))


def digest(values) -> str:
    """The hash of a report without its signature."""
    covered = {key: value for key, value in values.items() if key != "signed"}
    return hashlib.sha256(json.dumps(covered, sort_keys=True, ensure_ascii=True, separators=(",", ":")).encode()).hexdigest()


def signed(earlier: Earlier, by: str, remark: str = "", now=None) -> Earlier:
    """The report with a signature in place of any it had. by: a name. now: a datetime, the present one by default."""
    by = " ".join(by.split())
    if not by:
        raise ValueError("the name is empty, expected the name of the person who signs")
    on = (now or datetime.now(UTC)).astimezone(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    signature = Signature(by, on, remark.strip(), digest(earlier.values))
    values = {**earlier.values, "signed": {"by": by, "on": on, "remark": signature.remark, "covers": signature.covers}}
    return replace(earlier, values=values, signature=signature)


def _finding(file, number, values):
    place = f"finding {number}"
    if not isinstance(values, dict):
        raise ReadError(file, place, type(values).__name__, "a JSON object")
    found = {name: values.get(_FIELDS.get(name, name)) for name in Finding.__dataclass_fields__}
    for name in _NUMBERS:
        if found[name] is None:
            found[name] = float("nan")
        elif isinstance(found[name], bool) or not isinstance(found[name], (int, float)):
            raise ReadError(file, f"{place}, key {_FIELDS.get(name, name)}", quoted(str(found[name])), "a number")
    if not isinstance(found["kind"], str) or found["severity"] not in ("warn", "fail"):
        raise ReadError(file, place, f"kind {quoted(str(found['kind']))}, severity {quoted(str(found['severity']))}", "a kind, and the severity warn or fail")
    found |= {"joint": found["joint"] if isinstance(found["joint"], str) else None, "unit": str(found["unit"] or ""), "why": str(found["why"] or "")}
    return Finding(**found | {"first": -1, "last": -1, "worst": -1})


def _signature(file, values):
    if values is None:
        return None
    names = tuple(Signature.__dataclass_fields__)
    if not isinstance(values, dict) or not all(isinstance(values.get(name), str) for name in names):
        raise ReadError(file, "key signed", "a signature that is not complete", f"the texts {', '.join(names)}")
    return Signature(*(values[name] for name in names))
