"""The values from outside: rows of references/checks.json by their id (references/README.md says how they were verified)."""

import json
from pathlib import Path

import numpy as np

ROWS = {row["id"]: row for row in json.loads((Path(__file__).parent / "references" / "checks.json").read_text("utf-8"))["checks"]}


def inputs(row_id: str) -> dict:
    return ROWS[row_id]["inputs"]


def agrees(row_id: str, found) -> None:
    """Assert that `found` is the row's expected value, all numbers in the row's order, within the row's own tolerance."""
    row = ROWS[row_id]
    expected = np.asarray(row["expected"], dtype=float)
    rtol, atol = (row["tol"], 0.0) if row["tol_kind"] == "rel" else (0.0, row["tol"])
    message = f"{row_id}: {row['quantity']} ({row['source']})"
    np.testing.assert_allclose(np.reshape(found, expected.shape), expected, rtol=rtol, atol=atol, err_msg=message)
