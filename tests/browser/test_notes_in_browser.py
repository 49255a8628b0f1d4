"""Notes in a real browser: what the panel asks for goes to a real Noting, and what that says comes back; in the one page they can only be read."""

import base64

import pytest
from fake_audit import fake_audit

from pathaudit.notes import Notes, merge, new_note, placed, write_notes
from pathaudit.report.page import one_page
from pathaudit.report.scene import scene
from pathaudit.report.script import joined_modules, style_sheet
from pathaudit.widgets.noting import Noting

MODEL = """
window.sent = [];
const held = { status: "", cursor: 0 }, heard = {};
window.model = { get: (name) => held[name], set: (name, value) => { held[name] = value; }, save_changes() {}, off() {},
  on: (name, act) => { heard[name] = act; }, send: (message) => { if (window.dead) throw new Error("gone"); window.sent.push(message); } };
window.put = (name, value) => {
  held[name] = name === "block" ? Uint8Array.from(atob(value), (c) => c.charCodeAt(0)) : value;
  heard[`change:${name}`]?.();
};
window.begin = () => render({ model: window.model, el: document.getElementById("here") });
"""
HOSTILE = '<script>document.title = "run"</script><img src=x onerror="document.title = 1"> "]]>\n  שלום \x1b[31m\nlast'


@pytest.fixture(scope="module")
def audit():
    return fake_audit(800)


@pytest.fixture(autouse=True)
def folder(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path / "settings"))
    return tmp_path


class Bench:
    """A page with the view and a Noting behind it; nothing passes between them until it is asked for."""

    def __init__(self, page, audit):
        self.page, self.noting, shown = page, Noting(audit, author="Ann"), scene(audit)
        block, layout = shown.packed()
        page.set_content(f"<body><style>{style_sheet()}</style><div id='here'></div></body>")
        page.add_script_tag(type="module", content=joined_modules() + MODEL)
        page.wait_for_function("() => Boolean(window.begin)")
        for name, value in (("facts", {**shown.facts, "layout": layout}), ("block", base64.b64encode(block).decode()), ("notes", self.noting.told())):
            page.evaluate("([name, value]) => put(name, value)", [name, value])
        page.evaluate("begin()")
        page.wait_for_selector(".pa[data-painted]")
        self.panel, self.rows = page.locator(".pa-notes"), page.locator(".pa-notes [role=listitem]")

    def answer(self):
        """Let the Noting do what the view has asked for, and the view show it."""
        self.page.wait_for_function("() => sent.length > 0")
        asked = self.page.evaluate("sent.splice(0)")
        for message in asked:
            self.noting.handle(message)
        self.page.evaluate("(value) => put('notes', value)", self.noting.told())
        return asked

    def write(self, words, *, key="Control+Enter"):
        self.page.keyboard.type(words)
        self.page.keyboard.press(key)

    def to(self, place):
        self.page.locator(".pa-rows").focus()
        self.page.keyboard.press(place)

    def focused(self):
        return self.page.evaluate("document.activeElement.textContent")


@pytest.fixture
def bench(watched, audit):
    return Bench(watched(width=1200, height=1500).page, audit)


def test_a_note_at_the_cursor_by_keyboard_alone(bench, audit):
    bench.to("Home")
    bench.page.keyboard.press("PageUp")
    bench.page.keyboard.press("w")
    bench.page.keyboard.type("first line")
    bench.page.keyboard.press("Enter")
    bench.write("second line")
    assert bench.answer() == [{"do": "note add", "id": "", "sample": 80, "finding": None, "text": "first line\nsecond line"}]
    row = bench.rows.nth(0)
    assert row.locator("[dir]").inner_text() == "first line\nsecond line" and "open · Ann · 20" in row.inner_text()
    assert bench.noting.placed[0].sample == 80 and bench.focused() == "write a note"
    assert "Saved: 1 note in seam.notes.toml." in bench.panel.inner_text() and not bench.page.locator(".pa-notes textarea").is_visible()
    bench.to("End")
    row.locator("button").first.click()
    assert bench.page.locator(".pa").get_attribute("data-cursor") != "" and bench.page.evaluate("model.get('cursor')") in (0, 80)
    bench.page.wait_for_function("() => model.get('cursor') === 80")


def test_a_note_on_the_selected_finding(bench, audit):
    bench.page.locator(".pa-findings tbody tr").nth(1).click()
    bench.panel.get_by_role("button", name="At the cursor or on the selected finding").click()
    assert bench.panel.locator("textarea + button").count() == 1 and "finding 2" in bench.panel.inner_text()
    bench.write("on it")
    assert bench.answer()[0]["finding"] == 1
    found = audit.finding_list[1]
    assert f"{found.severity}: {found.kind}" in bench.rows.nth(0).inner_text()


def test_edit_settle_reopen_and_delete_by_keyboard(bench):
    for place, words in (("Home", "one"), ("End", "two")):
        bench.to(place)
        bench.page.keyboard.press("w")
        bench.write(words)
        bench.answer()
    edit, settle, delete = (bench.rows.nth(0).locator("button").nth(k) for k in (1, 2, 3))
    edit.press("Enter")
    bench.page.keyboard.press("End")
    bench.write(" and more")
    bench.answer()
    assert "one and more" in bench.rows.nth(0).inner_text() and bench.focused() == "edit"
    settle.press("Space")
    bench.answer()
    assert "settled by Ann" in bench.rows.nth(0).inner_text() and bench.focused() == "reopen"
    bench.panel.locator("select").select_option("open")
    assert bench.rows.count() == 1 and bench.rows.nth(0).inner_text().startswith("2")
    bench.panel.locator("select").select_option("all")
    bench.rows.nth(0).locator("button").nth(2).press("Space")
    bench.answer()
    assert "reopened by Ann" in bench.rows.nth(0).inner_text()
    delete.press("Enter")
    assert bench.focused() == "sure?" and bench.page.evaluate("sent.length") == 0
    bench.page.keyboard.press("Tab")
    assert delete.inner_text() == "delete"      # not asked any more
    delete.press("Enter")
    delete.press("Enter")
    assert bench.answer()[0]["do"] == "note delete" and bench.rows.count() == 1 and bench.focused() == "write a note"


def test_nothing_typed_is_lost(bench):
    bench.to("Home")
    bench.page.keyboard.press("w")
    bench.write("a thought", key="Escape")
    assert not bench.page.locator("textarea").is_visible() and bench.focused() == "write a note"
    bench.page.keyboard.press("Enter")
    assert bench.page.locator("textarea").input_value() == "a thought"
    bench.page.evaluate("window.dead = true")
    bench.page.keyboard.press("Control+Enter")      # the kernel is gone
    assert bench.page.locator("textarea").input_value() == "a thought" and bench.page.locator("textarea").is_visible()
    bench.page.evaluate("put('notes', { ...model.get('notes'), fault: 'That did not work.' })")
    assert bench.page.locator("textarea").input_value() == "a thought" and "That did not work." in bench.panel.locator("[role=alert]").inner_text()


def test_a_save_that_fails_is_said_and_the_note_stays(bench, folder):
    (folder / "seam.notes.toml").write_text("by hand = and wrong")
    bench.to("Home")
    bench.page.keyboard.press("w")
    bench.write("kept")
    bench.answer()
    assert "Not saved, and the file is left as it is: seam.notes.toml: line 1" in bench.panel.locator("[role=alert]").inner_text()
    assert bench.rows.nth(0).locator("[dir]").inner_text() == "kept"
    file = bench.panel.get_by_role("textbox", name="File; another name saves them there")
    file.fill("other")
    file.press("Enter")
    bench.answer()
    assert file.input_value() == "other.notes.toml" and "Saved: 1 note in other.notes.toml." in bench.panel.inner_text()
    name = bench.panel.get_by_role("textbox", name="Your name")
    name.fill("Bob")
    name.press("Enter")
    bench.answer()
    assert bench.noting.told()["author"] == "Bob"


def test_what_others_wrote_and_what_is_stale(bench, audit):
    notes = Notes((new_note(audit, 100, "old", "Ann", date="2026-12-01T09:00:00Z"),))
    ours, theirs = (notes.put(notes.items[0].edit(text, by, f"2026-12-01T{hour}:00:00Z")) for text, by, hour in (("ours", "Ann", 10), ("theirs", "Bob", 11)))
    write_notes("seam.notes.toml", merge(ours, theirs))
    bench.panel.get_by_role("button", name="Read the file again").click()
    bench.answer()
    words = bench.rows.nth(0).inner_text()
    assert "theirs" in words and "or, by Ann, 2026-12-01 10:00 UTC: ours" in words and "To decide: Written by Bob" in words
    told = bench.noting.told()
    told["notes"][0]["stale"] = "The path has moved by 5.0 mm here."
    bench.page.evaluate("(value) => put('notes', value)", told)
    assert bench.rows.nth(0).inner_text().startswith("1?") and "Stale: The path has moved by 5.0 mm here." in bench.rows.nth(0).inner_text()


def test_hostile_text_is_text(bench, audit):
    bench.noting.handle({"do": "note add", "sample": 5, "finding": None, "author": "<b>x</b>", "text": HOSTILE})
    bench.page.evaluate("(value) => put('notes', value)", bench.noting.told())
    assert bench.rows.nth(0).locator("[dir]").evaluate("(node) => node.textContent") == HOSTILE and "<b>x</b>" in bench.rows.nth(0).inner_text()
    assert bench.page.title() == "" and bench.rows.locator("img, script, [dir] b:not(:empty)").count() == 0
    assert bench.rows.nth(0).locator("[dir]").evaluate("(node) => getComputedStyle(node).whiteSpace") == "pre-wrap"


def test_everything_that_takes_the_focus_keeps_shortcuts_away_and_has_a_name(bench):
    bench.noting.handle({"do": "note add", "sample": 5, "finding": None, "author": "", "text": "x"})
    bench.page.evaluate("(value) => put('notes', value)", bench.noting.told())
    parts = bench.panel.locator("button, input, select, textarea")
    assert parts.count() == 12
    for part in parts.all():
        assert part.get_attribute("data-lm-suppress-shortcuts") == "true" and part.get_attribute("aria-label")


def test_a_flag_leads_to_its_note(bench):
    bench.noting.handle({"do": "note add", "sample": 400, "finding": None, "author": "", "text": "x"})
    bench.page.evaluate("(value) => put('notes', value)", bench.noting.told())
    bench.page.wait_for_function("() => JSON.parse(document.querySelector('.pa').dataset.place).pins.length === 1")
    bench.panel.locator("select").select_option("open")
    box = bench.page.locator(".pa-rows").bounding_box()
    x = bench.page.evaluate("JSON.parse(document.querySelector('.pa').dataset.place).pins[0]")
    bench.page.mouse.click(box["x"] + x + 4, box["y"] + 8)
    bench.page.wait_for_function("() => document.activeElement.getAttribute('aria-label')?.startsWith('Note 1, ')")


def test_in_the_one_page_they_can_only_be_read(watched, audit, folder):
    notes = Notes()
    for sample, text in ((100, HOSTILE), (500, "second")):
        notes = notes.put(new_note(audit, sample, text, "Ann", taken=notes.by_id))
    (folder / "a.html").write_text(one_page(audit, placed(notes, audit)), encoding="utf-8")
    page = watched(width=1000, height=1600).page
    page.goto((folder / "a.html").as_uri())
    page.wait_for_selector(".pa[data-painted]")
    rows = page.locator(".pa-notes [role=listitem]")
    assert rows.count() == 2 and rows.nth(0).locator("[dir]").evaluate("(node) => node.textContent") == HOSTILE
    assert page.locator(".pa-notes :is(input, textarea)").count() == 0 and page.locator(".pa-notes button").count() == 2
    assert not page.locator(".pa-still h2", has_text="Notes").is_visible() and "run" not in page.title()
    still = watched(java_script_enabled=False).page
    still.goto((folder / "a.html").as_uri())
    assert still.locator("h2", has_text="Notes").is_visible() and "second" in still.locator("body").inner_text()


def test_without_notes_the_one_page_says_nothing_of_them(watched, audit, folder):
    (folder / "a.html").write_text(one_page(audit), encoding="utf-8")
    page = watched().page
    page.goto((folder / "a.html").as_uri())
    page.wait_for_selector(".pa[data-painted]")
    assert not page.locator(".pa-notes").is_visible()
