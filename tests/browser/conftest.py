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


@pytest.fixture
def watched(chromium):
    """Make a Watched page; at the end of the test it must have no fault."""
    made = []

    def make(**options):
        made.append(hosts.Watched(chromium, **options))
        return made[-1]

    yield make
    faults = [fault for one in made for fault in one.faults]
    for one in made:
        one.close()
    assert not faults, faults


@pytest.fixture(scope="session")
def lab(tmp_path_factory):
    """One server for the whole run."""
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
