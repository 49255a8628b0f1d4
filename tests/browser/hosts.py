"""The hosts that a timeline is read in: a real Chromium whose pages are watched, and one private server for JupyterLab and Notebook."""

import json
import os
import re
import secrets
import socket
import subprocess
import sys
import time
import urllib.error
import urllib.request
from contextlib import contextmanager
from pathlib import Path

HERE = Path(__file__).parent
CHROMIUM = "/usr/bin/chromium"
FLAGS = ["--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
         "--disable-component-update", "--disable-sync", "--host-resolver-rules=MAP * ~NOTFOUND, EXCLUDE 127.0.0.1"]
DEMO = HERE.parents[1] / "pathaudit" / "demo"
SHOW = f"""import pathaudit as pa
from pathaudit.widgets import timeline
audit = pa.audit(pa.read_path({str(DEMO / "seam.csv")!r}), pa.read_cell({str(DEMO / "cell.toml")!r}))
audit"""
"""The cell that most tests run: 2,121 samples, four findings."""
SHOWN = "timeline._ON_SHOW['{}-0'][1]"
"""In the kernel, the timelines of a notebook of that name."""
SAVE_STATE = "@jupyter-widgets/jupyterlab-manager:saveWidgetState"
"""The Lab's command that turns saving the widgets' state on and off."""


@contextmanager
def browser(*more_flags):
    """A Chromium; where there is none, what to install."""
    if not Path(CHROMIUM).exists():
        raise FileNotFoundError(f"{CHROMIUM} is missing: install Debian's package chromium")
    from playwright.sync_api import sync_playwright

    with sync_playwright() as playwright:
        running = playwright.chromium.launch(executable_path=CHROMIUM, args=[*FLAGS, *more_flags])
        try:
            yield running
        finally:
            running.close()


class Watched:
    """A page of a fresh profile; `faults` gathers what no page of ours may do: errors, and requests that leave the machine.

    host_says: parts of complaints that the host writes itself, whatever a notebook holds; host_code: part of the addresses of its own
    scripts. An error that passed through no other script is the host's.
    """

    def __init__(self, chromium, width=1200, height=1000, host_says=(), host_code=None, **options):
        self.context = chromium.new_context(viewport={"width": width, "height": height}, **options)
        self.context.set_default_timeout(20000)
        self.faults, self.off_host = [], []
        self._host_says, self._host_code = host_says, host_code
        self.context.on("request", self._note)
        self.page = self.context.new_page()
        self.page.on("pageerror", lambda error: self._fault(f"page error: {error.name} {error.message} {error.stack}"))
        self.page.on("console", lambda message: message.type == "error" and self._fault(f"console: {message.text}"))

    def _fault(self, words):
        scripts = re.findall(r"(?:https?|blob|file):\S+", words)
        own = self._host_code and scripts and all(self._host_code in script for script in scripts)
        if not own and not any(part in words for part in self._host_says):
            self.faults.append(words)

    def _note(self, request):
        if not request.url.startswith(("http://127.0.0.1:", "file:", "data:", "blob:")):
            self.off_host.append(request.url)
            self.faults.append(f"off-host request: {request.url}")

    def close(self):
        self.context.close()


class Lab:
    """A Jupyter server with private folders that serves JupyterLab and Notebook, and what is done in them."""

    def __init__(self, folder):
        self.folder, self.root = folder, folder / "notebooks"
        self.token = secrets.token_hex(8)
        self.port = _free_port()
        self.address = f"http://127.0.0.1:{self.port}"
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
             "--expose-app-in-browser", "--JupyterNotebookApp.expose_app_in_browser=True"],
            stdout=self.log, stderr=subprocess.STDOUT, env=environment, cwd=folder)
        self._wait_until_up()

    def _wait_until_up(self):
        deadline = time.monotonic() + 30
        while time.monotonic() < deadline:
            try:
                urllib.request.urlopen(f"{self.address}/api?token={self.token}", timeout=2)
                return
            except (urllib.error.URLError, OSError):
                if self.process.poll() is not None:
                    break
                time.sleep(0.1)
        raise RuntimeError(f"JupyterLab did not start; its log is {self.log.name}")

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
        self.store(name, {"cells": cells, "metadata": kernel, "nbformat": 4, "nbformat_minor": 5})

    def store(self, name, notebook):
        (self.root / name).write_text(json.dumps(notebook))

    def read(self, name):
        return json.loads((self.root / name).read_text())

    def open(self, page, name, kernel=True):
        """Open a notebook; in a page that shows the Lab already, in place of the notebook there and with its kernel (quicker by far).

        The kernel's widgets of the tests before are closed: each notebook that is opened would fetch them all.
        """
        swapped = page.url.startswith(self.address) and page.evaluate("""async (path) => {
            const before = globalThis.jupyterapp?.shell.currentWidget, running = before?.sessionContext?.session?.kernel;
            if (!running) return false;
            const kernel = running.model, code = "import sys; 'ipywidgets' in sys.modules and sys.modules['ipywidgets'].Widget.close_all()";
            await running.requestExecute({ code, silent: true }).done;
            await before.context.save();
            const opened = await jupyterapp.commands.execute('docmanager:open', { path, kernel });
            await opened.context.ready;
            before.dispose();
            return true;
        }""", name)
        if not swapped:
            page.goto(f"{self.address}/lab/tree/{name}?token={self.token}&reset")
        self._wait_for_cells(page, kernel)

    def open_in_notebook(self, page, name, kernel=True):
        """Open a notebook in Notebook 7."""
        page.goto(f"{self.address}/notebooks/{name}?token={self.token}")
        self._wait_for_cells(page, kernel)

    def _wait_for_cells(self, page, kernel):
        page.wait_for_selector(".jp-NotebookPanel .jp-Notebook .jp-Cell", timeout=30000)
        page.wait_for_function("() => globalThis.jupyterapp?.shell.currentWidget?.sessionContext")
        if kernel:
            self.wait_for_kernel(page)

    def wait_for_kernel(self, page):
        page.evaluate("jupyterapp.shell.currentWidget.sessionContext.ready")
        page.wait_for_function("() => { const k = jupyterapp.shell.currentWidget.sessionContext.session?.kernel;"
                               " return k && k.connectionStatus === 'connected' && k.status === 'idle'; }", timeout=30000)

    def run(self, page):
        page.evaluate("() => { jupyterapp.commands.execute('notebook:run-all-cells'); }")      # a cell may wait for what the test does next

    def save(self, page):
        page.evaluate("jupyterapp.shell.currentWidget.context.save()")

    @contextmanager
    def saving_state(self, page):
        """The widgets' state is saved with the notebook while this lasts."""
        page.evaluate("(command) => jupyterapp.commands.execute(command)", SAVE_STATE)
        page.wait_for_function("(command) => jupyterapp.commands.isToggled(command)", arg=SAVE_STATE)
        try:
            yield
        finally:
            page.evaluate("(command) => jupyterapp.commands.execute(command)", SAVE_STATE)
            page.wait_for_function("(command) => !jupyterapp.commands.isToggled(command)", arg=SAVE_STATE)

    def ask(self, page, code):
        """What the kernel answers to a line of Python."""
        return page.evaluate("""async (code) => {
            const kernel = jupyterapp.shell.currentWidget.sessionContext.session.kernel;
            const future = kernel.requestExecute({ code: '', user_expressions: { answer: code }, store_history: false });
            const reply = await future.done;
            const answer = reply.content.user_expressions.answer;
            return answer.status === 'ok' ? answer.data['text/plain'] : answer.ename + ': ' + answer.evalue;
        }""", code)

    def wait_for_answer(self, page, code, wanted):
        """Ask the kernel until it gives this answer."""
        deadline = time.monotonic() + 20
        while (got := self.ask(page, code)) != wanted:
            if time.monotonic() > deadline:
                raise AssertionError(f"{code} is {got}, not {wanted}")



def _free_port():
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return probe.getsockname()[1]


def painted(page, more_than=-1):
    """Wait until a timeline has painted more often than that; gives how often. An error in the notebook ends the wait."""
    found = page.wait_for_function("""(n) => {
        const error = document.querySelector("[data-mime-type='application/vnd.jupyter.error'], [data-mime-type='application/vnd.jupyter.stderr']");
        if (error) return error.textContent;
        return [...document.querySelectorAll('.pa[data-painted]')].map((e) => Number(e.dataset.painted)).find((count) => count > n);
    }""", arg=more_than, timeout=60000).json_value()      # kernels may have to be compiled first
    assert not isinstance(found, str) or "kernels" in found, found
    return found
