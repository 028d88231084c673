"""What the window remembers from one day to the next: theme, size, recent files. One small JSON file."""

from __future__ import annotations

import json
from contextlib import suppress
from dataclasses import asdict, dataclass, replace
from pathlib import Path

from platformdirs import user_config_path

from viewer.errors import ExportError
from viewer.jobs import write_text

RECENT = 10


@dataclass(frozen=True)
class Settings:
    """``recent``: paths of dossiers and meshes, the last one first; ``size``: of the window in logical pixels."""

    theme: str = "light"
    size: tuple[int, int] = (1440, 900)
    recent: tuple[str, ...] = ()

    def with_recent(self, path: Path) -> Settings:
        """The settings with ``path`` as the last file opened."""
        text = str(path)
        return replace(self, recent=(text, *(p for p in self.recent if p != text))[:RECENT])


def settings_file() -> Path:
    """Where they are kept: in the user's own configuration folder."""
    return user_config_path("hingelight") / "window.json"


def read_settings(path: Path | None = None) -> Settings:
    """The remembered settings; the usual ones where nothing usable is remembered."""
    found = Settings()
    with suppress(OSError, ValueError, TypeError, KeyError):
        data = json.loads((path or settings_file()).read_text(encoding="utf-8"))
        width, height = (int(n) for n in data["size"])
        theme = "dark" if data["theme"] == "dark" else "light"
        recent = tuple(str(p) for p in data["recent"])[:RECENT]
        found = Settings(theme, (min(max(width, 800), 8000), min(max(height, 560), 8000)), recent)
    return found


def write_settings(settings: Settings, path: Path | None = None) -> None:
    """Remember; a folder that cannot be written is no reason to stop anybody."""
    with suppress(ExportError):
        write_text(path or settings_file(), json.dumps(asdict(settings), indent=1) + "\n")
