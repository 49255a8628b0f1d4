"""A real Chromium, and one private JupyterLab for the whole run. Nothing outside 127.0.0.1 may be asked for, and the console must stay clean."""

import json
import os
import secrets
import socket
import subprocess
import sys
import time
import urllib.error
import urllib.request
from pathlib import Path

import pytest

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE.parent / "widgets"))      # fake_audit.py

CHROMIUM = "/usr/bin/chromium"
FLAGS = ["--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
         "--disable-component-update", "--disable-sync", "--host-resolver-rules=MAP * ~NOTFOUND, EXCLUDE 127.0.0.1"]


@pytest.fixture(scope="session")
def chromium():
    """The browser, started once."""
    if not Path(CHROMIUM).exists():
        pytest.fail(f"{CHROMIUM} is missing: install Debian's package chromium")
    from playwright.sync_api import sync_playwright

    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=CHROMIUM, args=FLAGS)
        yield browser
        browser.close()


class Watched:
    """A page of a fresh profile; `faults` gathers what no page of ours may do."""

    def __init__(self, chromium, width=1200, height=1000, **options):
        self.context = chromium.new_context(viewport={"width": width, "height": height}, **options)
        self.context.set_default_timeout(20000)
        self.faults = []
        self.context.on("request", self._note)
        self.page = self.context.new_page()
        self.page.on("pageerror", lambda error: self.faults.append(f"page error: {error.stack}"))
        self.page.on("console", lambda message: message.type == "error" and self.faults.append(f"console: {message.text}"))

    def _note(self, request):
        if not request.url.startswith(("http://127.0.0.1:", "file:", "data:", "blob:")):
            self.faults.append(f"off-host request: {request.url}")

    def close(self):
        self.context.close()


@pytest.fixture
def watched(chromium):
    """Make a Watched page; at the end of the test it must have no fault."""
    made = []

    def make(**options):
        made.append(Watched(chromium, **options))
        return made[-1]

    yield make
    faults = [fault for one in made for fault in one.faults]
    for one in made:
        one.close()
    assert not faults, faults


class Lab:
    """A JupyterLab server with private folders, and what the tests do in it."""

    def __init__(self, folder):
        self.root = folder / "notebooks"
        self.token = secrets.token_hex(8)
        self.port = _free_port()
        environment = dict(os.environ)
        for name, place in {"JUPYTER_CONFIG_DIR": "config", "JUPYTER_DATA_DIR": "data", "JUPYTER_RUNTIME_DIR": "runtime", "IPYTHONDIR": "ipython",
                            "JUPYTERLAB_SETTINGS_DIR": "settings", "JUPYTERLAB_WORKSPACES_DIR": "workspaces"}.items():
            environment[name] = str(folder / place)
            (folder / place).mkdir()
        environment["PYTHONPATH"] = os.pathsep.join([str(HERE.parent / "widgets"), str(HERE.parents[1])])
        self.root.mkdir()
        settings = folder / "settings" / "@jupyterlab" / "apputils-extension"
        settings.mkdir(parents=True)
        (settings / "notification.jupyterlab-settings").write_text(
            json.dumps({"fetchNews": "false", "checkForUpdates": False, "doNotDisturbMode": True}))
        (folder / "config" / "labconfig").mkdir()      # the debugger complains in the console whenever a notebook closes early
        (folder / "config" / "labconfig" / "page_config.json").write_text(json.dumps({"disabledExtensions": {"@jupyterlab/debugger-extension": True}}))
        self.log = open(folder / "server.log", "w")
        self.process = subprocess.Popen(
            [sys.executable, "-m", "jupyter", "lab", "--no-browser", "--allow-root", "--ip=127.0.0.1", f"--port={self.port}",
             "--ServerApp.port_retries=0", f"--IdentityProvider.token={self.token}", f"--ServerApp.root_dir={self.root}",
             "--expose-app-in-browser"], stdout=self.log, stderr=subprocess.STDOUT, env=environment, cwd=folder)
        self._wait_until_up()

    def _wait_until_up(self):
        deadline = time.monotonic() + 30
        while time.monotonic() < deadline:
            try:
                urllib.request.urlopen(f"http://127.0.0.1:{self.port}/api?token={self.token}", timeout=2)
                return
            except (urllib.error.URLError, OSError):
                if self.process.poll() is not None:
                    break
                time.sleep(0.1)
        pytest.fail(f"JupyterLab did not start; its log is {self.log.name}")

    def close(self):
        self.process.terminate()
        try:
            self.process.wait(10)
        except subprocess.TimeoutExpired:
            self.process.kill()
        self.log.close()

    def write(self, name, *sources):
        """A notebook of code cells."""
        cells = [{"cell_type": "code", "id": f"{Path(name).stem}-{k}", "metadata": {}, "execution_count": None, "outputs": [], "source": source}
                 for k, source in enumerate(sources)]
        kernel = {"kernelspec": {"name": "python3", "display_name": "Python 3", "language": "python"}}
        (self.root / name).write_text(json.dumps({"cells": cells, "metadata": kernel, "nbformat": 4, "nbformat_minor": 5}))

    def read(self, name):
        return json.loads((self.root / name).read_text())

    def open(self, page, name, kernel=True):
        """Open a notebook; in a page that shows the Lab already, in place of the notebook there and with its kernel (quicker by far)."""
        if page.url.startswith("http"):
            page.evaluate("""async (path) => {
                const before = jupyterapp.shell.currentWidget;
                const kernel = before.sessionContext.session.kernel.model;
                await before.context.save();
                const opened = await jupyterapp.commands.execute('docmanager:open', { path, kernel });
                await opened.context.ready;
                before.dispose();
            }""", name)
        else:
            page.goto(f"http://127.0.0.1:{self.port}/lab/tree/{name}?token={self.token}&reset")
        page.wait_for_selector(".jp-NotebookPanel .jp-Notebook .jp-Cell", timeout=30000)
        if kernel:
            self.wait_for_kernel(page)

    def wait_for_kernel(self, page):
        page.evaluate("jupyterapp.shell.currentWidget.sessionContext.ready")
        page.wait_for_function("() => { const k = jupyterapp.shell.currentWidget.sessionContext.session?.kernel;"
                               " return k && k.connectionStatus === 'connected' && k.status === 'idle'; }", timeout=30000)

    def run(self, page):
        page.evaluate("jupyterapp.commands.execute('notebook:run-all-cells')")

    def save(self, page):
        page.evaluate("jupyterapp.commands.execute('docmanager:save')")

    def ask(self, page, code):
        """What the kernel answers to a line of Python."""
        return page.evaluate("""async (code) => {
            const kernel = jupyterapp.shell.currentWidget.sessionContext.session.kernel;
            const future = kernel.requestExecute({ code: '', user_expressions: { answer: code }, store_history: false });
            const reply = await future.done;
            const answer = reply.content.user_expressions.answer;
            return answer.status === 'ok' ? answer.data['text/plain'] : answer.ename + ': ' + answer.evalue;
        }""", code)


def _free_port():
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return probe.getsockname()[1]


@pytest.fixture(scope="session")
def desk(chromium):
    """One page for all tests in the Lab: opening the Lab takes longest."""
    page = Watched(chromium)
    yield page
    page.close()


@pytest.fixture(scope="session")
def lab(tmp_path_factory):
    """One server for the whole run."""
    server = Lab(tmp_path_factory.mktemp("lab"))
    yield server
    server.close()
