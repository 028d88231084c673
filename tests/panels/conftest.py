"""Window tests run on a virtual screen of their own; what moves is moved by real key and mouse events."""

from __future__ import annotations

import os
import shutil
import subprocess
import time
from pathlib import Path

import pytest

SAMPLES = Path(__file__).resolve().parents[2] / "sample_meshes"
PATIENCE = 1200.0  # s, to give up on what never happens: nothing is timed


@pytest.fixture(scope="session")
def screen():
    """A virtual screen, as large as a desk's; without one the test is skipped, unless CI demands it."""
    missing = []
    if shutil.which("Xvfb") is None:
        missing.append("Xvfb is not installed (Debian: xvfb)")
    try:
        import PySide6.QtWidgets  # noqa: F401
    except ImportError as error:
        missing.append(f"the window extra is not installed, or lacks a library of the system: {error}")
    if missing:
        if os.environ.get("HINGELIGHT_REQUIRE_WINDOW"):
            pytest.fail("; ".join(missing))
        pytest.skip("; ".join(missing))
    read, write = os.pipe()
    server = subprocess.Popen(
        ["Xvfb", "-displayfd", str(write), "-screen", "0", "1600x1000x24", "-nolisten", "tcp", "-noreset"],
        pass_fds=(write,),
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )
    os.close(write)
    with os.fdopen(read) as told:
        number = told.readline().strip()
    assert number, "Xvfb did not start"
    before = {name: os.environ.get(name) for name in ("DISPLAY", "QT_QPA_PLATFORM", "XDG_SESSION_TYPE")}
    os.environ.update(DISPLAY=f":{number}", QT_QPA_PLATFORM="xcb", XDG_SESSION_TYPE="x11")
    yield os.environ["DISPLAY"]
    from PySide6.QtWidgets import QApplication

    application = QApplication.instance()
    if application is not None:
        application.shutdown()
    server.terminate()
    server.wait()
    for name, value in before.items():
        os.environ.pop(name, None)
        if value is not None:
            os.environ[name] = value


@pytest.fixture(scope="session")
def app(screen):
    from PySide6.QtWidgets import QApplication

    application = QApplication.instance() or QApplication(["hingelight"])
    application.setStyle("Fusion")
    return application


@pytest.fixture
def until(app):
    """``until(condition, words)``: let the window live until the condition holds."""

    def wait(condition, words: str = "") -> None:
        end = time.monotonic() + PATIENCE
        while not condition():
            assert time.monotonic() < end, f"never happened: {words or condition}"
            app.processEvents()
            time.sleep(0.002)

    return wait


@pytest.fixture
def make_window(app, until, tmp_path):
    """Makes windows, active and with settings of their own; closes those that are left open."""
    from PySide6.QtTest import QTest

    from viewer.panels.window import Window

    made = []

    def make(path=None, modes=None, size=(1440, 900)):
        window = Window(tmp_path / "window.json")
        made.append(window)
        window.resize(*size)
        window.show()
        window.activateWindow()
        assert QTest.qWaitForWindowActive(window)
        if path is not None:
            window.open(Path(path), modes)
            until(lambda: window.canvas.image is not None or window.notice.kind == "error", f"opening {path}")
        return window

    make.made = made
    yield make
    while made:
        window = made.pop()
        window.close()
        window.deleteLater()
        del window
    app.processEvents()


@pytest.fixture
def settled(until):
    """``settled(window)``: let it live until nothing is under way."""

    def wait(window) -> None:
        until(lambda: not window.conductor.busy, "nothing under way")
        window.repaint()

    return wait
