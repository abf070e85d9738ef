"""One JupyterLab on loopback and one headless chromium for all browser walks."""

import json
import os
import re
import secrets
import shutil
import subprocess
import sys
import time
import urllib.request
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
PICTURES = ROOT / "artifacts"
FLAGS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-sync",
    "--disable-background-networking",
    "--disable-component-update",
]
# A quiet Lab: no news, no autosave, every cell in the page.
QUIET = {
    "apputils-extension/notification": {
        "fetchNews": "false",
        "checkForUpdates": False,
        "doNotDisturbMode": True,
    },
    "docmanager-extension/plugin": {"autosave": False},
    "notebook-extension/tracker": {"windowingMode": "none"},
}
READY = """() => {
  const context = window.jupyterapp?.shell?.currentWidget?.context;
  const kernel = context?.sessionContext?.session?.kernel;
  return !!(context?.isReady && kernel?.status === 'idle' && kernel?.connectionStatus === 'connected');
}"""
# Errors in widget callbacks reach no cell: listen to the kernel itself.
LISTEN = """() => {
  window.kernelErrors = [];
  window.jupyterapp.shell.currentWidget.context.sessionContext.session.kernel.iopubMessage.connect((_, m) => {
    if (m.header.msg_type === 'error') window.kernelErrors.push(m.content.ename + ': ' + m.content.evalue);
  });
}"""
ELSEWHERE = re.compile(r"^https?://(?!127\.0\.0\.1[:/])")


@pytest.fixture(scope="session")
def chromium():
    """Path of the browser; without it the walk is skipped, except where CI must not skip."""
    found = shutil.which("chromium") or shutil.which("chromium-browser")
    if found is None:
        if os.environ.get("CI"):
            pytest.fail("chromium is not installed")
        pytest.skip("chromium is not installed (Debian package chromium)")
    return found


@pytest.fixture(scope="session")
def lab(chromium, tmp_path_factory):
    """A running JupyterLab: (url, token, folder it serves)."""
    home = tmp_path_factory.mktemp("lab")
    served = home / "served"
    served.mkdir()
    for name, value in QUIET.items():
        path = home / "settings/@jupyterlab" / f"{name}.jupyterlab-settings"
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(json.dumps(value))
    kept = {
        k: v for k, v in os.environ.items() if not k.startswith(("JUPYTER", "JPY_", "MPLBACKEND", "PYTEST"))
    }
    own = {
        "HOME": "", "JUPYTER_CONFIG_DIR": "config", "JUPYTER_DATA_DIR": "data", "JUPYTER_RUNTIME_DIR": "run",
        "IPYTHONDIR": "ipython", "MPLCONFIGDIR": "mpl", "JUPYTERLAB_SETTINGS_DIR": "settings",
        "JUPYTERLAB_WORKSPACES_DIR": "workspaces",
    }  # fmt: skip
    token = secrets.token_hex(16)
    command = [
        sys.executable, "-m", "jupyterlab", "--no-browser", "--allow-root", "--ServerApp.ip=127.0.0.1",
        "--ServerApp.port=0", f"--ServerApp.root_dir={served}", f"--IdentityProvider.token={token}",
        "--LabApp.expose_app_in_browser=True", "--LabApp.extension_manager=readonly",
        "--LanguageServerManager.autodetect=False",
    ]  # fmt: skip
    log = home / "server.log"
    with log.open("wb") as sink:
        server = subprocess.Popen(
            command,
            cwd=served,
            env=kept | {k: str(home / v) for k, v in own.items()},
            stdin=subprocess.DEVNULL,
            stdout=sink,
            stderr=subprocess.STDOUT,
            start_new_session=True,
        )
    try:
        yield _url(server, home / "run", token, log), token, served
    finally:
        server.terminate()
        try:
            server.wait(15)
        except subprocess.TimeoutExpired:
            server.kill()
        PICTURES.mkdir(exist_ok=True)
        shutil.copy(log, PICTURES / "server.log")


def _url(server, run, token, log):
    info = run / f"jpserver-{server.pid}.json"
    for _ in range(1200):
        if server.poll() is not None:
            break
        try:
            url = json.loads(info.read_text())["url"]
            urllib.request.urlopen(f"{url}api/status?token={token}", timeout=5).read()
            return url
        except (OSError, ValueError):
            time.sleep(0.05)
    pytest.fail(f"the server did not come up:\n{log.read_text()}")


@pytest.fixture(scope="session")
def browser(chromium):
    """One headless browser."""
    from playwright.sync_api import sync_playwright

    with sync_playwright() as playwright:
        running = playwright.chromium.launch(executable_path=chromium, args=FLAGS)
        yield running
        running.close()


@pytest.fixture
def page(browser, request):
    """A page that fails its test on any page, console or kernel error; its last look is kept as a picture."""
    context = browser.new_context(viewport={"width": 1280, "height": 1000}, reduced_motion="reduce")
    context.route(ELSEWHERE, lambda route: route.abort())
    shown = context.new_page()
    shown.set_default_timeout(60_000)
    problems = []
    shown.on("pageerror", lambda error: problems.append(f"page: {error}"))
    shown.on("console", lambda m: problems.append(f"console: {m.text}") if m.type == "error" else None)
    yield shown
    look(shown, request.node.name)
    problems += [f"kernel: {e}" for e in shown.evaluate("() => window.kernelErrors ?? []")]
    context.close()
    assert problems == []


def look(page, name):
    """Keep what the page shows now."""
    PICTURES.mkdir(exist_ok=True)
    page.screenshot(path=PICTURES / f"{re.sub(r'[^A-Za-z0-9]+', '-', name).strip('-')}.png")


def use_theme(page, name):
    """Light or Dark; Lab keeps the choice for every page that follows."""
    page.evaluate(
        f"() => window.jupyterapp.commands.execute('apputils:change-theme', {{theme: 'JupyterLab {name}'}})"
    )
    page.wait_for_function(f"() => document.body.dataset.jpThemeLight === '{str(name == 'Light').lower()}'")


def write_notebook(path, *cells):
    """A notebook of code cells, as plain JSON."""
    made = [
        {
            "cell_type": "code",
            "metadata": {},
            "execution_count": None,
            "outputs": [],
            "source": c,
            "id": f"c{i}",
        }
        for i, c in enumerate(cells)
    ]
    kernel = {"name": "python3", "display_name": "Python 3", "language": "python"}
    path.write_text(
        json.dumps({"cells": made, "metadata": {"kernelspec": kernel}, "nbformat": 4, "nbformat_minor": 5})
    )


def open_and_run(page, lab, name):
    """Open a notebook alone in Lab and run all of it."""
    url, token, _ = lab
    page.goto(f"{url}doc/tree/{name}?token={token}")
    page.wait_for_function(READY, timeout=90_000)
    page.evaluate(LISTEN)
    done = page.evaluate("() => window.jupyterapp.commands.execute('notebook:run-all-cells')")
    assert done, page.locator(".jp-OutputArea-output").all_inner_texts()
    page.wait_for_function(READY, timeout=90_000)
    assert page.locator('.jp-OutputArea-output[data-mime-type$="stderr"]').all_inner_texts() == []
