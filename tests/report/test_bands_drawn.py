"""A study's bands in what every picture is drawn from, and in the still picture; its tables in the page."""

from dataclasses import replace

import numpy as np
import pytest
from tolerant_cells import near_a_limit

from pathaudit.report.page import one_page
from pathaudit.report.scene import scene
from pathaudit.report.still import png_picture, svg_picture
from pathaudit.report.surfaces import WASH
from pathaudit.spread.study import study


@pytest.fixture(scope="module")
def wide():
    return study(near_a_limit(1, 0.85, every=3, part_xyz_mm=15.0, part_rpy_deg=2.0), draws=200)


def test_the_edges_are_the_bands_at_the_kept_samples(wide):
    shown = scene(wide.audit, study=wide)
    kept, n = shown.arrays["sample"].astype(int), wide.audit.cell.arm.n
    bands = wide.bands.at(kept)
    np.testing.assert_allclose(shown.arrays["band_share_percent"][:, :n], 100 * bands.speed_share[0], rtol=1e-6)
    np.testing.assert_allclose(shown.arrays["band_share_percent"][:, n:], 100 * bands.speed_share[2], rtol=1e-6)
    np.testing.assert_allclose(shown.arrays["band_sigma_min"].T, bands.sigma_min[[0, 2]], rtol=1e-6)
    assert "200 draws of 6 toleranced dimensions" in shown.facts["spread"]


def test_rows_hold_the_band_before_the_line_and_have_room_for_it(wide):
    shown, n = scene(wide.audit, study=wide), wide.audit.cell.arm.n
    for j in range(n):
        row = shown.facts["rows"][j]
        assert row["lines"][0] == ("band_share_percent", j, "band") or list(row["lines"][0]) == ["band_share_percent", j, "band"]
        assert list(row["lines"][-1]) == ["share_percent", j, "main"]
        assert row["high"] >= min(np.nanmax(shown.arrays["band_share_percent"][:, n + j]), 200.0)
    sigma = shown.facts["rows"][n]
    assert list(sigma["lines"][0]) == ["band_sigma_min", 0, "band"] and sigma["low"] <= np.nanmin(shown.arrays["band_sigma_min"]) or sigma["low"] > 0
    assert "band: 90 % of the draws" in shown.facts["groups"][0]["head"]


def test_without_a_study_or_without_tolerances_nothing_of_it_is_drawn(wide):
    bare = near_a_limit(1, 0.85, every=10)
    for shown in (scene(wide.audit), scene(bare, study=study(bare))):
        assert not any(name.startswith("band") for name in shown.arrays) and "spread" not in shown.facts
        assert all(style != "band" for row in shown.facts["rows"] for _, _, style in row["lines"])


def test_where_draws_do_not_reach_there_is_a_gap(wide):
    share, sigma = wide.bands.speed_share.copy(), wide.bands.sigma_min.copy()
    share[2, 20:30], sigma[0, 20:30] = np.inf, 0.0
    shown = scene(wide.audit, study=replace(wide, bands=replace(wide.bands, speed_share=share, sigma_min=sigma)))
    for name in ("band_share_percent", "band_sigma_min"):
        assert np.isnan(shown.arrays[name][21:29]).all() and np.isfinite(shown.arrays[name][35:]).all()
    assert WASH in svg_picture(shown)


def test_the_still_picture_shows_them(wide):
    plain, shown = scene(wide.audit), scene(wide.audit, study=wide)
    assert svg_picture(shown).count(WASH) >= wide.audit.cell.arm.n and WASH not in svg_picture(plain)
    assert png_picture(shown) != png_picture(plain)


def test_the_page_holds_the_tables_of_the_study(wide):
    page = one_page(wide.audit, study=wide)
    assert "Under tolerances" in page and "Measure better first" in page and "part rz" in page and "How far off one dimension alone may be" in page
    assert "Under tolerances" not in one_page(wide.audit)
