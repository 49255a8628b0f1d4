"""The timeline live in JupyterLab: keys, cursor, themes, what is tried by hand, a cell that is run again."""

import hosts
from hosts import SHOWN, painted


def live(lab, page, name):
    lab.write(name, hosts.SHOW)
    lab.open(page, name)
    lab.run(page)
    painted(page)


def cells(page):
    return page.evaluate("jupyterapp.shell.currentWidget.content.model.cells.length")


def test_live_it_stands_in_place_of_the_still_form(lab, page):
    live(lab, page, "live.ipynb")
    assert page.locator(".pa-rows canvas").first.is_visible()
    page.wait_for_selector(".pathaudit-tables", state="attached")
    assert page.locator(".pathaudit-tables").is_hidden()
    pictures = page.locator(".jp-RenderedSVG, .jp-RenderedImage")
    assert pictures.count() == 1 and pictures.first.is_hidden()


def test_scrubbing_asks_nothing_of_the_kernel_and_the_place_arrives_later(lab, page):
    live(lab, page, "scrub.ipynb")
    go = lab.root / "scrub.go"
    wait = f"import os, time\nwhile not os.path.exists({str(go)!r}): time.sleep(0.01)"
    page.evaluate("(code) => { window.busy = jupyterapp.shell.currentWidget.sessionContext.session.kernel.requestExecute({ code }).done; }", wait)
    page.locator(".pa-rows").focus()
    for key in ("Home", "ArrowRight", "ArrowRight", "ArrowRight"):
        before = int(page.locator(".pa").get_attribute("data-painted"))
        page.keyboard.press(key)
        painted(page, before)
    assert page.locator(".pa").get_attribute("data-cursor") == "3"
    assert page.evaluate("Promise.race([window.busy.then(() => 'done'), Promise.resolve('busy')])") == "busy"
    go.touch()
    page.evaluate("window.busy.then(() => null)")
    before = int(page.locator(".pa").get_attribute("data-painted"))
    page.locator(".pa-findings tbody tr").nth(1).click()
    painted(page, before)  # the mark of the cursor is written with the next frame, not with the click
    worst = page.locator(".pa").get_attribute("data-cursor")
    lab.wait_for_answer(page, "audit.finding_list[1].worst", worst)
    lab.wait_for_answer(page, SHOWN.format("scrub") + "[0].cursor", worst)
    assert page.locator(".pa-findings tr[aria-selected=true] td").first.inner_text() == "2"
    page.locator(".pa-rows").focus()
    for key in ("Home", "ArrowRight", "ArrowRight", "ArrowRight"):
        page.keyboard.press(key)
    shown = SHOWN.format("scrub")
    lab.wait_for_answer(page, f"{shown}[0].cursor", "3")
    assert lab.ask(page, f"setattr({shown}[0], 'cursor', 700)") == "None"
    page.wait_for_function("() => document.querySelector('.pa').dataset.cursor === '700'")


def test_the_labs_shortcuts_do_not_take_our_keys(lab, page):
    live(lab, page, "keys.ipynb")
    for selector in (".pa-rows", ".pa-arm", ".pa-findings tbody tr", ".pa button"):
        page.locator(selector).first.focus()
        for key in ("b", "a", "x", "d", "d", "m"):
            page.keyboard.press(key)
    assert cells(page) == 1
    assert page.evaluate("jupyterapp.shell.currentWidget.content.model.cells.get(0).type") == "code"


def test_the_suggestion_is_accepted_and_taken_back(lab, page):
    live(lab, page, "retimed.ipynb")
    shown = SHOWN.format("retimed")
    before = painted(page)
    page.get_by_role("button", name="Accept the suggested").click()
    painted(page, before)
    lab.wait_for_answer(page, f"{shown}[0].facts['retiming']['applied']", "True")
    page.get_by_role("button", name="Undo the last change").click()
    lab.wait_for_answer(page, f"{shown}[0].facts['retiming']['applied']", "False")
    assert page.locator(".pa-status").inner_text() == ""


def test_a_failure_behind_a_button_is_told(lab, page):
    lab.write("broken.ipynb", hosts.SHOW + "\nfrom pathaudit.widgets import session\nkept = session.by_hand\nsession.by_hand = lambda *_: 1 / 0\naudit")
    lab.open(page, "broken.ipynb")
    lab.run(page)
    painted(page)
    page.get_by_role("button", name="Accept the suggested").click()
    page.wait_for_selector("text=That did not work. ZeroDivisionError")
    assert lab.ask(page, "setattr(session, 'by_hand', kept)") == "None"


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
    lab.wait_for_answer(page, f"len({SHOWN.format('again')})", "1")
    assert lab.ask(page, count) == before


def test_two_timelines_in_one_cell(lab, page):
    lab.write("two.ipynb", hosts.SHOW.removesuffix("audit") + "timeline.show(audit)\naudit")
    lab.open(page, "two.ipynb")
    lab.run(page)
    page.wait_for_function("() => document.querySelectorAll('.pa[data-painted]').length === 2")
    page.wait_for_function("() => document.querySelectorAll('.pathaudit-tables').length === 2")
    assert not any(table.is_visible() for table in page.locator(".pathaudit-tables").all())
