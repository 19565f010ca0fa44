"""Starts JupyterLab on the loopback interface and drives it with headless Chromium."""

import ast
import contextlib
import json
import os
import secrets
import shutil
import signal
import socket
import subprocess
import sys
import time
import urllib.request
from dataclasses import dataclass
from pathlib import Path

import nbformat

CHROMIUM_NAMES = ("chromium", "chromium-browser", "google-chrome", "google-chrome-stable")
CHROMIUM_FLAGS = (
    "--headless=new",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--no-first-run",
    "--force-device-scale-factor=1",
    "--font-render-hinting=none",
)
START_TIMEOUT = 60.0  # s

KERNEL_IS_IDLE = """() => {
    const session = window.jupyterapp?.shell.currentWidget?.context?.sessionContext;
    return session?.isReady && session.session?.kernel?.status === 'idle';
}"""

# Every message to a widget flips the kernel to busy and back, so idle has to hold for a while.
KERNEL_STAYS_IDLE = """([quiet, limit]) => new Promise((done, fail) => {
    const kernel = jupyterapp.shell.currentWidget.context.sessionContext.session.kernel;
    const start = performance.now();
    let since = start;
    (function look() {
        const now = performance.now();
        if (kernel.status !== 'idle') since = now;
        if (now - since > quiet) done();
        else if (now - start > limit) fail(new Error('the kernel is still ' + kernel.status));
        else setTimeout(look, 20);
    })();
})"""

CELL_ERRORS = """() => [...jupyterapp.shell.currentWidget.content.model.cells]
    .filter(cell => cell.type === 'code')
    .flatMap(cell => cell.toJSON().outputs)
    .filter(output => output.output_type === 'error')
    .map(output => output.ename + ': ' + output.evalue)"""


def find_chromium() -> str | None:
    """Path of a Chromium, from the environment variable CHROMIUM or the search path."""
    given = os.environ.get("CHROMIUM")
    return given or next(filter(None, map(shutil.which, CHROMIUM_NAMES)), None)


@dataclass(frozen=True)
class Lab:
    """A running JupyterLab that serves `folder`."""

    address: str
    token: str
    folder: Path

    def write(self, name: str, cells: list[str]) -> str:
        """Write a notebook of code cells and return its name."""
        notebook = nbformat.v4.new_notebook(cells=[nbformat.v4.new_code_cell(cell) for cell in cells])
        # Without a language the page stops at a dialogue that asks for a kernel.
        notebook.metadata = {"kernelspec": {"name": "python3", "display_name": "Python 3", "language": "python"}}
        (self.folder / name).write_text(nbformat.writes(notebook), encoding="utf-8")
        return name

    def open(self, context, name: str, *, timeout: float = 60_000):
        """Open a notebook in a new page and wait for its kernel."""
        page = context.new_page()
        page.goto(f"{self.address}/doc/tree/{name}?token={self.token}&reset")
        page.wait_for_selector(".jp-Notebook .jp-Cell", timeout=timeout)
        page.wait_for_function(KERNEL_IS_IDLE, timeout=timeout)
        return page


@contextlib.contextmanager
def running_lab(folder: Path, private: Path):
    """Yield a JupyterLab of our own, whose settings, workspaces and run files live in `private`."""
    token = secrets.token_hex(16)
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        port = probe.getsockname()[1]
    _write_setting(private, "@jupyterlab/apputils-extension", "notification", {"fetchNews": "false"})
    command = [
        *(sys.executable, "-m", "jupyterlab", "--no-browser", "--allow-root", "--ip=127.0.0.1", f"--port={port}"),
        "--ServerApp.port_retries=0",  # a port lost to someone else fails at once
        f"--ServerApp.root_dir={folder}",
        "--expose-app-in-browser",
        "--LabApp.extension_manager=readonly",
        "--LabApp.check_for_updates_class=jupyterlab.NeverCheckForUpdate",
    ]
    log_path = private / "lab.log"
    with log_path.open("wb") as log:
        # A session of its own, so that the end takes the server with its kernels and nobody else.
        server = subprocess.Popen(
            command, env=_environment(private, token), stdout=log, stderr=subprocess.STDOUT, start_new_session=True
        )
        try:
            address = f"http://127.0.0.1:{port}"
            _wait_for(f"{address}/api/status?token={token}", server, log_path)
            yield Lab(address, token, folder)
        finally:
            _end(server)


def _environment(private: Path, token: str) -> dict[str, str]:
    foreign = ("JUPYTER_PATH", "JUPYTER_CONFIG_PATH")
    folders = {
        "JUPYTER_CONFIG_DIR": "config",
        "JUPYTER_DATA_DIR": "data",
        "JUPYTER_RUNTIME_DIR": "run",
        "IPYTHONDIR": "ipython",
        "JUPYTERLAB_SETTINGS_DIR": "settings",
        "JUPYTERLAB_WORKSPACES_DIR": "workspaces",
    }
    kept = {name: value for name, value in os.environ.items() if name not in foreign}
    own = {name: str(private / folder) for name, folder in folders.items()}
    return kept | own | {"JUPYTER_TOKEN": token, "JUPYTER_PLATFORM_DIRS": "1"}


def _write_setting(private: Path, extension: str, plugin: str, value: dict) -> None:
    path = private / "settings" / extension / f"{plugin}.jupyterlab-settings"
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(json.dumps(value), encoding="utf-8")


def _wait_for(address: str, server: subprocess.Popen, log_path: Path) -> None:
    start = time.monotonic()
    while True:
        try:
            with urllib.request.urlopen(address, timeout=2) as answer:
                answer.read()
                return
        except OSError as problem:
            if server.poll() is not None or time.monotonic() - start > START_TIMEOUT:
                tail = log_path.read_text(encoding="utf-8", errors="replace")[-4000:]
                raise RuntimeError(f"JupyterLab did not start: {tail}") from problem
            time.sleep(0.1)


def _end(server: subprocess.Popen) -> None:
    with contextlib.suppress(ProcessLookupError):
        os.killpg(server.pid, signal.SIGTERM)
    try:
        server.wait(10)
    except subprocess.TimeoutExpired:
        os.killpg(server.pid, signal.SIGKILL)
        server.wait(10)


@contextlib.contextmanager
def running_chromium(executable: str, profile: Path, *, width: int = 1300, height: int = 1700):
    """Yield a browser context of headless Chromium."""
    from playwright.sync_api import sync_playwright

    with sync_playwright() as playwright:
        context = playwright.chromium.launch_persistent_context(
            profile,
            executable_path=executable,
            headless=False,  # the flag below is the newer headless mode, which paints as the window does
            args=list(CHROMIUM_FLAGS),
            viewport={"width": width, "height": height},
        )
        context.set_default_timeout(15_000)
        try:
            yield context
        finally:
            context.close()


def run_all(page) -> list[str]:
    """Run every cell and return the errors, empty when all went well."""
    finished = page.evaluate("() => jupyterapp.commands.execute('notebook:run-all-cells')")
    errors = page.evaluate(CELL_ERRORS)
    return errors if errors or finished else ["the run stopped without an error message"]


def settle(page, *, quiet: float = 300, timeout: float = 30_000) -> None:
    """Wait until the kernel has been idle for `quiet` milliseconds on end."""
    page.evaluate(KERNEL_STAYS_IDLE, [quiet, timeout])


def use_theme(page, name: str) -> None:
    """Switch JupyterLab to the theme "JupyterLab Light" or "JupyterLab Dark"."""
    page.evaluate("name => jupyterapp.commands.execute('apputils:change-theme', { theme: name })", name)
    light = "true" if name.endswith("Light") else "false"
    page.wait_for_selector(f"body[data-jp-theme-light='{light}']", state="attached")


def ask_kernel(page, expression: str):
    """Evaluate an expression in the notebook's kernel and return it, by way of JSON."""
    answer = page.evaluate(
        """async code => {
            const kernel = jupyterapp.shell.currentWidget.context.sessionContext.session.kernel;
            const request = { code: '', silent: true, user_expressions: { answer: code } };
            const reply = await kernel.requestExecute(request).done;
            return reply.content.user_expressions.answer;
        }""",
        f"__import__('json').dumps({expression})",
    )
    assert answer["status"] == "ok", answer
    return json.loads(ast.literal_eval(answer["data"]["text/plain"]))
