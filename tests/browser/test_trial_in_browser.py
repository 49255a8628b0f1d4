"""Trying other speeds in a real browser: the panel's messages go to a real Timeline, and what it makes comes back to the panel."""

import base64

import pytest
from example_arms import swaying_audit

from pathaudit.report.script import joined_modules, style_sheet
from pathaudit.report.tables import retimed_csv
from pathaudit.widgets.timeline import Timeline

MODEL = """
window.sent = [];
const held = {}, heard = {};
window.model = { get: (name) => held[name], set: (name, value) => { held[name] = value; }, save_changes() {}, off() {},
  on: (name, act) => { heard[name] = act; }, send: (message) => { window.sent.push(message); } };
window.put = (state) => {
  for (const [name, value] of Object.entries(state)) held[name] = name === "block" ? Uint8Array.from(atob(value), (c) => c.charCodeAt(0)) : value;
  for (const name of Object.keys(state)) heard[`change:${name}`]?.();
};
window.hand = (content, text) => heard["msg:custom"](content, [new TextEncoder().encode(text)]);
window.begin = () => render({ model: window.model, el: document.getElementById("here") });
"""


@pytest.fixture(scope="module")
def audit():
    return swaying_audit(2)


class Instrument:
    """A page with the view, and the Timeline behind it; nothing passes between them until it is asked for."""

    def __init__(self, page, audit):
        self.page, self.timeline, self.files = page, Timeline(audit), []
        self.timeline.send = lambda content, buffers=None: self.files.append((content, bytes(buffers[0])))
        page.set_content(f"<style>{style_sheet()}</style><div id='here'></div>")
        page.add_script_tag(type="module", content=joined_modules() + MODEL)
        page.wait_for_function("() => Boolean(window.begin)")
        self.put()
        page.evaluate("begin()")
        page.wait_for_selector(".pa[data-painted]")

    def put(self):
        state = {name: getattr(self.timeline, name) for name in ("facts", "block", "trial", "status")}
        state["block"] = base64.b64encode(state["block"]).decode()
        self.page.evaluate("(state) => put(state)", state)

    def messages(self, count=1):
        """The messages that the view has sent since the last call, at least `count`."""
        self.page.wait_for_function("(count) => sent.length >= count", arg=count)
        return self.page.evaluate("sent.splice(0)")

    def answer(self, last="true"):
        """Let Python do what the view has asked for, and the view show it. last: JavaScript that the newest message must fulfil before."""
        self.page.wait_for_function(f"() => {{ const m = sent.at(-1); return m && ({last}); }}")
        asked = self.messages()
        for content in asked:
            self.timeline._on_message(self.timeline, content, [])
        if self.timeline.session._worker._pool:
            self.timeline.session._worker._pool.submit(lambda: None).result(20)
        before = self.page.locator(".pa").get_attribute("data-painted")
        self.put()
        if self.timeline.trial["edits"] or "show" in str(asked):
            self.page.wait_for_function("(n) => document.querySelector('.pa').dataset.painted > n", arg=int(before))
        return asked

    def mark(self, first, last):
        """Mark a stretch by keys."""
        self.page.locator(".pa-rows").focus()
        self.page.keyboard.press("Home")
        for key, count in (("[", first), ("]", last - first)):
            for _ in range(count):
                self.page.keyboard.press("ArrowRight")
            self.page.keyboard.press(key)

    def press(self, name):
        self.page.get_by_role("button", name=name, exact=True).click()

    def said(self):
        return self.page.locator(".pa-told").inner_text()


@pytest.fixture
def instrument(watched, audit):
    made = Instrument(watched(width=1300, height=1400).page, audit)
    yield made
    made.timeline.close()


def test_a_marked_stretch_is_slowed_by_the_slider_and_undone(instrument, audit):
    instrument.mark(20, 30)
    slider = instrument.page.locator(".pa-trial input[type=range]")
    slider.focus()
    for _ in range(3):
        instrument.page.keyboard.press("ArrowLeft")
    asked = instrument.answer("m.factor < 0.975")
    assert asked[-1] | {"gesture": 0} == {"do": "slow", "first": 20, "last": 30, "factor": 0.97, "gesture": 0}
    assert len({message["gesture"] for message in asked}) == 1
    assert "down to 97 %" in instrument.said()
    assert instrument.timeline.session.shown.retiming.factor[25] == pytest.approx(0.97)
    instrument.press("Undo the last change")
    instrument.answer()
    assert instrument.timeline.session.shown.audit is audit and instrument.said() == ""
    assert instrument.page.get_by_role("button", name="Undo the last change").is_disabled()


def test_a_typed_factor(instrument):
    instrument.mark(5, 40)
    number = instrument.page.locator(".pa-trial input[type=number]")
    number.fill("62.5")
    number.press("Enter")
    assert instrument.answer()[-1]["factor"] == 0.625
    assert number.input_value() == "62.5"


def test_dragging_the_factor_in_its_row(instrument):
    instrument.mark(60, 120)
    page = instrument.page
    row = page.evaluate("""() => { const box = document.querySelector('.pa-rows').getBoundingClientRect(); return [box.x, box.y, box.width, box.height]; }""")
    before = page.evaluate("sent.length")
    # the row of the factor is the last one; its line starts at 100 percent
    x, low = row[0] + 84 + (row[2] - 146) * 90 / 300, row[1] + row[3] - 30
    found = None
    for y in range(int(low), int(low) - 60, -1):
        page.mouse.move(x, y)
        if page.locator(".pa-rows").evaluate("(rows) => getComputedStyle(rows).cursor") == "ns-resize":
            found = y
            break
    assert found is not None
    page.mouse.down()
    page.mouse.move(x, found + 12, steps=4)
    page.mouse.up()
    page.wait_for_function("(before) => sent.length > before", arg=before)
    asked = instrument.answer()
    assert asked[-1]["do"] == "slow" and (asked[-1]["first"], asked[-1]["last"]) == (60, 120) and 0.3 < asked[-1]["factor"] < 0.95


def test_without_a_stretch_nothing_can_be_set(instrument):
    for selector in ("input[type=range]", "input[type=number]", "button[aria-label^=Lock]", "button[aria-label^='Take back']"):
        assert instrument.page.locator(f".pa-trial {selector}").is_disabled()
    assert "mark a stretch" in instrument.page.locator(".pa-stretch").inner_text()
    instrument.mark(3, 9)
    assert instrument.page.locator(".pa-trial input[type=range]").is_enabled()


def test_the_suggestion_is_accepted_rejected_locked_and_taken_back(instrument, audit):
    instrument.page.get_by_role("button", name="Accept the suggested retiming").click()
    assert instrument.answer() == [{"do": "accept"}]
    assert "accepted" in instrument.page.locator(".pa-offers").inner_text()
    assert instrument.said().startswith("Slows") and "\n" in instrument.said()
    instrument.page.get_by_role("button", name="Reject the suggested retiming").click()
    instrument.answer()
    assert "rejected" in instrument.page.locator(".pa-offers").inner_text()
    instrument.mark(10, 20)
    instrument.press("Lock the stretch: nothing may slow it")
    instrument.answer()
    assert [e["kind"] for e in instrument.timeline.trial["edits"]] == ["decline", "lock"]
    instrument.press("Take back what was tried on the stretch")
    instrument.answer()
    assert "lock" not in [e["kind"] for e in instrument.timeline.trial["edits"]]


def test_variants_are_kept_compared_written_and_forgotten(instrument):
    page = instrument.page
    page.get_by_role("button", name="Accept the suggested retiming").click()
    instrument.answer()
    page.locator(".pa-trial input[type=text]").fill("as suggested")
    page.keyboard.press("Enter")
    instrument.answer()
    rows = page.locator(".pa-variants tbody tr")
    assert [row.split("\t")[0] for row in rows.all_inner_texts()] == ["as programmed", "as suggested"]
    page.get_by_role("button", name="Save the times of as suggested as CSV").click()
    instrument.answer()
    (content, text), = instrument.files
    assert text.decode() == retimed_csv(instrument.timeline.session.shown.retiming)
    with page.expect_download() as download:
        page.evaluate("([content, text]) => hand(content, text)", [content, text.decode()])
    assert download.value.suggested_filename == "arrays-as-suggested.csv"
    assert open(download.value.path()).read() == text.decode()
    page.get_by_role("button", name="Show as programmed").last.click()
    instrument.answer()
    page.get_by_role("button", name="Forget as suggested").click()
    instrument.answer()
    assert page.locator(".pa-variants").is_hidden()


def test_work_that_takes_long_is_told_and_given_up(instrument):
    page = instrument.page
    page.get_by_role("button", name="Accept the suggested retiming").click()
    instrument.messages()
    page.locator(".pa-busy").wait_for()
    page.get_by_role("button", name="Give up the change under way").click()
    assert instrument.answer() == [{"do": "cancel"}]
    page.locator(".pa-busy").wait_for(state="hidden")


def test_keys_typed_in_the_panel_stay_there(instrument):
    page = instrument.page
    before = page.locator(".pa").get_attribute("data-cursor")
    name = page.locator(".pa-trial input[type=text]")
    name.focus()
    page.keyboard.type("n p [ ] + - f 0 ?")
    assert name.input_value() == "n p [ ] + - f 0 ?"
    assert page.locator(".pa").get_attribute("data-cursor") == before


def test_every_control_has_a_name_and_keeps_the_labs_keys_away(instrument):
    instrument.page.get_by_role("button", name="Accept the suggested retiming").click()
    instrument.answer()
    controls = instrument.page.locator(".pa-trial :is(button, input)")
    for control in controls.all():
        assert control.get_attribute("aria-label") and control.get_attribute("data-lm-suppress-shortcuts") == "true"
