"""The timeline in JupyterLab: live, run again, without a kernel, trusted and not."""

import json
from pathlib import Path

import pytest

import pathaudit

DEMO = Path(pathaudit.__file__).parent / "demo"
SHOW = f"""import pathaudit as pa
from pathaudit.widgets import timeline
audit = pa.audit(pa.read_path({str(DEMO / "seam.csv")!r}), pa.read_cell({str(DEMO / "cell.toml")!r}))
audit"""
SHOWN = "timeline._ON_SHOW['{}-0'][1]"


@pytest.fixture
def page(desk):
    """The shared page; nothing may have gone wrong on it in this test."""
    desk.faults.clear()
    desk.page.set_viewport_size({"width": 1200, "height": 1000})
    yield desk.page
    assert desk.faults == []


def painted(page, more_than=-1):
    page.wait_for_function("(n) => [...document.querySelectorAll('.pa[data-painted]')].some((e) => Number(e.dataset.painted) > n)",
                           arg=more_than, timeout=120000)      # kernels may have to be compiled first
    return int(page.locator(".pa").get_attribute("data-painted"))


def live(lab, page, name):
    lab.write(name, SHOW)
    lab.open(page, name)
    lab.run(page)
    painted(page)


def cells(page):
    return page.evaluate("jupyterapp.shell.currentWidget.content.model.cells.length")


def wait_for_answer(lab, page, code, wanted):
    for _ in range(100):
        got = lab.ask(page, code)
        if got == wanted:
            return
        page.wait_for_timeout(50)
    pytest.fail(f"{code} is {got}, not {wanted}")


def test_live_it_stands_in_place_of_the_still_form(lab, page):
    live(lab, page, "live.ipynb")
    assert page.locator(".pa-rows canvas").first.is_visible()
    page.wait_for_selector(".pathaudit-tables", state="attached")
    assert page.locator(".pathaudit-tables").is_hidden()
    pictures = page.locator(".jp-RenderedSVG, .jp-RenderedImage")
    assert pictures.count() == 1 and pictures.first.is_hidden()


def test_scrubbing_asks_nothing_of_the_kernel_and_the_place_arrives_later(lab, page):
    live(lab, page, "scrub.ipynb")
    page.evaluate("() => { window.busy = jupyterapp.shell.currentWidget.sessionContext.session.kernel"
                  ".requestExecute({ code: 'import time; time.sleep(1.5)' }).done; }")
    page.locator(".pa-rows").focus()
    for key in ("Home", "ArrowRight", "ArrowRight", "ArrowRight"):
        before = int(page.locator(".pa").get_attribute("data-painted"))
        page.keyboard.press(key)
        painted(page, before)
    assert page.locator(".pa").get_attribute("data-cursor") == "3"
    assert page.evaluate("Promise.race([window.busy.then(() => 'done'), Promise.resolve('busy')])") == "busy"
    page.evaluate("window.busy.then(() => null)")
    before = int(page.locator(".pa").get_attribute("data-painted"))
    page.locator(".pa-findings tbody tr").nth(1).click()
    painted(page, before)  # the mark of the cursor is written with the next frame, not with the click
    worst = page.locator(".pa").get_attribute("data-cursor")
    wait_for_answer(lab, page, "audit.finding_list[1].worst", worst)
    wait_for_answer(lab, page, SHOWN.format("scrub") + "[0].cursor", worst)
    assert page.locator(".pa-findings tr[aria-selected=true] td").first.inner_text() == "2"
    page.locator(".pa-rows").focus()
    for key in ("Home", "ArrowRight", "ArrowRight", "ArrowRight"):
        page.keyboard.press(key)
    shown = SHOWN.format("scrub")
    wait_for_answer(lab, page, f"{shown}[0].cursor", "3")
    assert lab.ask(page, f"setattr({shown}[0], 'cursor', 700)") == "None"
    page.wait_for_function("() => document.querySelector('.pa').dataset.cursor === '700'")


def test_the_labs_shortcuts_do_not_take_our_keys(lab, page):
    live(lab, page, "keys.ipynb")
    for selector in (".pa-rows", ".pa-arm", ".pa-findings tbody tr", ".pa-head button"):
        page.locator(selector).first.focus()
        for key in ("b", "a", "x", "d", "d", "m"):
            page.keyboard.press(key)
    assert cells(page) == 1
    assert page.evaluate("jupyterapp.shell.currentWidget.content.model.cells.get(0).type") == "code"


def test_the_retimed_audit_can_be_looked_at(lab, page):
    live(lab, page, "retimed.ipynb")
    page.get_by_role("button", name="Show as retimed").click()
    page.wait_for_selector("text=Shown with the suggested retiming")
    page.get_by_role("button", name="Show as programmed").click()
    page.get_by_role("button", name="Show as retimed").wait_for()
    assert page.locator(".pa-status").inner_text() == ""


def test_a_failure_behind_the_button_is_told(lab, page):
    lab.write("broken.ipynb", "from fake_audit import fake_audit\nfrom pathaudit.widgets import timeline\naudit = fake_audit(200)\n"
                              "audit.suggestion.audit = lambda: 1 / 0\ntimeline.show(audit)")
    lab.open(page, "broken.ipynb")
    lab.run(page)
    painted(page)
    page.get_by_role("button", name="Show as retimed").click()
    page.wait_for_selector("text=That did not work. ZeroDivisionError")


def change_theme(page, name):
    page.evaluate("(theme) => jupyterapp.commands.execute('apputils:change-theme', { theme })", name)
    page.wait_for_function("(theme) => document.body.dataset.jpThemeName === theme", arg=name)
    page.wait_for_selector("#jupyterlab-splash", state="detached")      # the Lab trips over its own splash where two overlap


def test_light_and_dark(lab, page):
    live(lab, page, "theme.ipynb")
    ground = "getComputedStyle(document.querySelector('.pa')).backgroundColor"
    corner = ("() => { const c = document.querySelector('.pa-rows canvas'); const d = c.getContext('2d').getImageData(0, 0, c.width, c.height).data;"
              " let sum = 0, n = 0; for (let k = 0; k < d.length; k += 4) if (d[k + 3] > 200) { sum += d[k] + d[k + 1] + d[k + 2]; n++; } return sum / n / 3; }")
    light = page.evaluate(corner)
    change_theme(page, "JupyterLab Dark")
    page.wait_for_function(f"() => {ground} !== 'rgb(255, 255, 255)'")
    page.wait_for_function(f"(light) => ({corner})() < 0.5 * light", arg=light)
    change_theme(page, "JupyterLab Light")
    page.wait_for_function(f"(light) => ({corner})() > 0.9 * light", arg=light)


def test_a_cell_run_again_leaves_one_timeline(lab, page):
    live(lab, page, "again.ipynb")
    count = "len(__import__('ipywidgets').widgets.widget._instances)"
    before = lab.ask(page, count)
    for _ in range(3):
        page.evaluate("document.querySelector('.pa').dataset.old = 'yes'")
        lab.run(page)
        page.wait_for_function("() => document.querySelector('.pa[data-painted]') && !document.querySelector('.pa[data-old]')")
    assert page.locator(".pa").count() == 1
    wait_for_answer(lab, page, f"len({SHOWN.format('again')})", "1")
    assert lab.ask(page, count) == before


def test_two_timelines_in_one_cell(lab, page):
    lab.write("two.ipynb", SHOW.removesuffix("audit") + "timeline.show(audit)\naudit")
    lab.open(page, "two.ipynb")
    lab.run(page)
    page.wait_for_function("() => document.querySelectorAll('.pa[data-painted]').length === 2")
    page.wait_for_function("() => document.querySelectorAll('.pathaudit-tables').length === 2")
    assert not any(table.is_visible() for table in page.locator(".pathaudit-tables").all())


def saved(lab, page, name):
    """A notebook that was run and saved; gives its JSON."""
    live(lab, page, name)
    page.wait_for_selector(".pathaudit-tables", state="attached")
    page.evaluate("jupyterapp.shell.currentWidget.context.save()")
    return lab.read(name)


def test_without_its_kernel_picture_and_tables_are_read(lab, page, watched):
    (lab.root / "handed-on.ipynb").write_text(json.dumps(saved(lab, page, "signed.ipynb")))      # the Lab trusts what it has signed
    other = watched()
    lab.open(other.page, "handed-on.ipynb", kernel=False)
    other.page.wait_for_selector(".jp-RenderedSVG svg, .jp-RenderedSVG img", timeout=20000)
    assert other.page.locator(".pathaudit-tables").is_visible()
    assert "must turn at" in other.page.locator(".pathaudit-tables").inner_text()
    picture = other.page.locator(".jp-RenderedSVG svg, .jp-RenderedSVG img").bounding_box()
    assert picture["width"] <= other.page.locator(".jp-OutputArea").first.bounding_box()["width"]
    other.page.wait_for_selector("text=model not found", state="hidden")
    # the Lab itself writes this one line for every widget whose kernel has ended
    other.faults[:] = [fault for fault in other.faults if "widget model not found" not in fault]


def test_an_untrusted_notebook_shows_picture_and_tables(lab, page):
    notebook = saved(lab, page, "mine.ipynb")
    notebook["cells"][0]["source"] += "\n# from somebody else"
    notebook["metadata"].pop("signature", None)
    (lab.root / "theirs.ipynb").write_text(json.dumps(notebook))
    lab.open(page, "theirs.ipynb")
    assert page.evaluate("!jupyterapp.shell.currentWidget.content.model.cells.get(0).trusted")
    page.wait_for_selector(".jp-RenderedImage img")
    assert page.locator(".jp-RenderedImage img").evaluate("(image) => image.naturalWidth") == 1500
    table = page.locator(".pathaudit-tables, .jp-RenderedHTML table").first
    assert table.is_visible() and page.locator("text=must turn at").first.is_visible()
    assert page.locator("text=Path audit of").first.is_visible()


def test_the_saved_notebook_is_small(lab, page):
    notebook = saved(lab, page, "small.ipynb")
    assert len(json.dumps(notebook)) <= 200_000
    kinds = [set(output["data"]) for output in notebook["cells"][0]["outputs"]]
    assert kinds == [{"application/vnd.jupyter.widget-view+json", "text/plain"}, {"image/svg+xml", "image/png", "text/plain"}, {"text/html", "text/plain"}]
