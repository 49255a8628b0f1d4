"""The one-page report as text; how it behaves in a browser is tested in tests/browser."""

import json
import re
from html.parser import HTMLParser

import pytest
from fake_audit import fake_audit

from pathaudit.report.page import one_page
from pathaudit.report.script import MODULES, joined_modules


@pytest.fixture(scope="module")
def audit():
    return fake_audit(1000)


@pytest.fixture(scope="module")
def page(audit):
    return one_page(audit)


class Text(HTMLParser):
    """The words outside script and style."""

    def __init__(self):
        super().__init__()
        self.words, self.inside = [], None

    def handle_starttag(self, tag, attributes):
        self.inside = tag if tag in ("script", "style") else self.inside

    def handle_endtag(self, tag):
        self.inside = None if tag == self.inside else self.inside

    def handle_data(self, data):
        if not self.inside:
            self.words.append(data)


def text_of(html):
    reader = Text()
    reader.feed(html)
    return re.sub(r"\s+", " ", " ".join(reader.words))


def test_everything_can_be_read_without_scripts(audit, page):
    text = text_of(page)
    for finding in audit.finding_list:
        assert finding.why in text and finding.kind in text
    for words in ("FAIL", "Bracket cell <7>", "14.000 s", "65", audit.path.sha256, audit.cell.sha256, "cell.toml", "140 deg/s", "not given",
                  "sigma_min of the scaled Jacobian, warn below 0.06", "950 mm", "no limit is given", "This is not a risk assessment."):
        assert words in text, words


def test_the_page_asks_for_nothing(page):
    policy = re.search(r'http-equiv="Content-Security-Policy" content="([^"]*)"', page).group(1)
    assert policy.startswith("default-src 'none'") and "unsafe-eval" not in policy and "http" not in policy
    assert set(re.findall(r'https?://[^"\s\'<]*', page)) <= {"http://www.w3.org/2000/svg"}
    assert not re.search(r"<(link|img|iframe|object|embed|base)\b", page) and not re.search(r"\b(import\(|fetch\(|XMLHttpRequest|WebSocket)", page)


def test_names_cannot_break_out_of_their_place():
    audit = fake_audit(50)
    audit.cell.name = "</script><script>alert(1)</script>&amp;"
    audit.finding_list[0].why = "<img src=x onerror=alert(1)>"
    page = one_page(audit)
    assert "<script>alert" not in page and "<img src=x" not in page
    assert page.count("<script") == 4
    assert audit.cell.name in text_of(page)
    facts = re.search(r'id="facts">(.*?)</script>', page, re.DOTALL).group(1)
    assert json.loads(facts)["name"] == audit.cell.name


def test_the_page_stays_small():
    assert len(one_page(fake_audit(5000)).encode()) <= 700_000


def test_an_audit_without_findings_says_so():
    audit = fake_audit(50)
    audit.finding_list, audit.verdict, audit.not_judged = (), "pass", ()
    text = text_of(one_page(audit))
    assert "No findings." in text and "Everything that has a rule was judged." in text


def test_a_retiming_that_cannot_help_gives_its_reason():
    audit = fake_audit(50)
    audit.suggestion.feasible, audit.suggestion.why = False, "No retiming can help: 12 samples cannot be reached at any speed."
    text = text_of(one_page(audit))
    assert "No retiming can help" in text and "duration retimed" not in text


def test_the_modules_join_to_one(page):
    script = joined_modules()
    assert not re.search(r"^import ", script, re.MULTILINE) and script.count("export ") == 1
    names = re.findall(r"^(?:async )?(?:function|const|let|class) (\w+)", script, re.MULTILINE)
    assert len(names) == len(set(names)), "two modules use one name"
    assert len(MODULES) == len(set(MODULES))
