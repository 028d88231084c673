"""Draws the window's pictures in this folder; needs a screen, or a virtual one:

``xvfb-run -a -s "-screen 0 1600x1000x24" python screenshots/make_window_screenshots.py [NAME …]``

Each state is reached by the same keys that a user presses.
"""

from __future__ import annotations

import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from viewer.panels.window import Window
from viewer.session import actions

HERE = Path(__file__).parent
SIZE = 1440, 900
PATIENCE = 600.0  # s


class Shots:
    """One window on the sample boom, driven by keys."""

    def __init__(self, app: QApplication, folder: Path, path: Path) -> None:
        self._app = app
        self.window = Window(folder / "window.json")
        self.window.resize(*SIZE)
        self.window.show()
        self.window.activateWindow()
        self.window.open(path)
        self.wait(lambda: self.window.canvas.image is not None)
        self.settle()

    def wait(self, condition: Callable[[], bool]) -> None:
        end = time.monotonic() + PATIENCE
        while not condition():
            if time.monotonic() > end:
                raise SystemExit("the window does not get there")
            self._app.processEvents()
            time.sleep(0.005)

    def settle(self) -> None:
        """Until all is known and drawn; stands still at the first phase."""
        self.wait(lambda: not self.window.conductor.busy)
        self.window.session.do(actions.stand_at, 0.0)
        self.window.playback.stop(0.0)
        self.window.gallery.frame = 0

    def press(self, *keys: Qt.Key) -> None:
        for key in keys:
            QTest.keyClick(self.window, key)
            self.settle()

    def shoot(self, name: str) -> None:
        self.window.repaint()
        path = HERE / f"window_{name}.png"
        self.window.grab().save(str(path))
        print(path)


def main(only: tuple[str, ...] = ()) -> None:
    """Every state, or those named."""
    app = QApplication.instance() or QApplication(["hingelight"])
    app.setStyle("Fusion")
    key = Qt.Key
    with tempfile.TemporaryDirectory() as folder:
        shots = Shots(app, Path(folder), HERE.parent / "sample_meshes" / "boom")
        states: dict[str, tuple[Qt.Key, ...]] = {
            "light": (),
            "hinge": (key.Key_Right, key.Key_Right, key.Key_Right, key.Key_2),
            "error": (key.Key_T,),
            "true_scale": (key.Key_Escape, key.Key_Escape, key.Key_Home, key.Key_T),
            "picked": (key.Key_D, key.Key_3),
            "change": (key.Key_Escape, key.Key_7),
            "side": (key.Key_7, key.Key_6),
            "pairing": (key.Key_P,),
            "ladder": (key.Key_B,),
            "test": (key.Key_Escape, key.Key_Escape, key.Key_5),
            "dark": (key.Key_Escape, key.Key_Home, key.Key_Right, key.Key_Right, key.Key_Right, key.Key_2, key.Key_L),
        }
        for name, keys in states.items():
            shots.press(*keys)
            if not only or name in only:
                shots.shoot(name)
        shots.window.close()


if __name__ == "__main__":
    main(tuple(sys.argv[1:]))
