"""A study's bands drawn by a real browser."""

import pytest
from tolerant_cells import near_a_limit

from pathaudit.report.page import one_page
from pathaudit.spread.study import study


@pytest.fixture(scope="module")
def wide():
    return study(near_a_limit(1, 0.85, every=3, part_xyz_mm=15.0, part_rpy_deg=2.0), draws=200)


def washed(page, share):
    """How many pixels of the rows hold the line's colour with about this opacity over the lane."""
    page.wait_for_selector(".pa[data-painted]", timeout=10000)
    return page.evaluate("""(share) => {
        const canvas = document.querySelector('.pa-rows canvas'), { data } = canvas.getContext('2d').getImageData(0, 0, canvas.width, canvas.height);
        let found = 0;
        for (let i = 0; i < data.length; i += 4) {
            const [r, g, b] = [0, 1, 2].map((k) => data[i + k]);
            if (data[i + 3] === 255 && Math.abs(r - 245 * (1 - share)) < 14 && Math.abs(b - (245 - share * 67)) < 14 && Math.abs(g - (245 - share * 131)) < 14) found += 1;
        }
        return found;
    }""", share)


def test_bands_are_filled_and_gone_without_a_study(watched, tmp_path, wide):
    found = {}
    for name, shown in (("with", wide), ("without", None)):
        file = tmp_path / f"{name}.html"
        file.write_text(one_page(wide.audit, study=shown), encoding="utf-8")
        page = watched().page
        page.goto(file.as_uri())
        found[name] = washed(page, 0.3)
        if shown:
            assert "200 draws of 6 toleranced dimensions" in page.locator(".pa").inner_text()
    assert found["with"] > found["without"] + 1000  # lines have such pixels at their edges, too
