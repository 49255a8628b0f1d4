"""A real Chromium, and one private Jupyter server for the whole run. Nothing outside 127.0.0.1 may be asked for, and the console must stay clean."""

import sys
from pathlib import Path

import hosts
import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "widgets"))      # fake_audit.py


@pytest.fixture(scope="session")
def chromium():
    """The browser, started once."""
    with hosts.browser() as running:
        yield running


@pytest.fixture(scope="session")
def spare(chromium):
    """Pages that tests have left, by their options: a new profile takes longer than many a test."""
    pages = {}
    yield pages
    for page in sum(pages.values(), []):
        page.close()


@pytest.fixture
def watched(chromium, spare):
    """Make a Watched page, empty as a new one; at the end of the test it must have no fault. fresh: nobody else has used it or will."""
    made = []

    def make(width=1200, height=1000, fresh=False, **options):
        free = [] if fresh else spare.setdefault(repr(options), [])
        one = free.pop() if free else hosts.Watched(chromium, width, height, **options)
        one.page.set_viewport_size({"width": width, "height": height})
        made.append((one, fresh, free))
        return one

    yield make
    faults = [fault for one, _, _ in made for fault in one.faults]
    for one, fresh, free in made:
        if fresh or one.faults:
            one.close()
        else:
            one.page.mouse.move(0, 0)
            one.page.goto("about:blank")
            free.append(one)
    assert not faults, faults


@pytest.fixture(scope="session")
def lab(tmp_path_factory):
    """One server for the whole run; the kernels are compiled before a notebook waits for them."""
    from pathaudit.kernels import clocks, linkage, rates, steps  # noqa: F401

    server = hosts.Lab(tmp_path_factory.mktemp("lab"))
    yield server
    server.close()


@pytest.fixture(scope="session")
def desk(chromium):
    """One page for all tests in the Lab: opening the Lab takes longest."""
    page = hosts.Watched(chromium)
    yield page
    page.close()


@pytest.fixture
def page(desk):
    """The shared page; nothing may have gone wrong on it in this test."""
    desk.faults.clear()
    desk.page.set_viewport_size({"width": 1200, "height": 1000})
    yield desk.page
    assert desk.faults == []
