"""A drawing order that can cross to a child process: the window's exports run there."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from viewer.errors import ExportError
from viewer.jobs import SILENT, Progress, in_child
from viewer.scene.picture import Picture

KINDS = ("gif", "mp4", "png", "strip")


@dataclass(frozen=True, eq=False)
class RenderRequest:
    """What to write where. ``kind`` is one of ``KINDS``; ``phase`` (rad) is the still's."""

    picture: Picture
    kind: str
    path: Path
    phase: float = 0.0

    def __post_init__(self) -> None:
        object.__setattr__(self, "path", Path(self.path))
        if self.kind not in KINDS:
            raise ExportError(
                "unknown kind of output", file=self.path, found=self.kind, expected=f"one of: {', '.join(KINDS)}"
            )

    def write(self, progress: Progress = SILENT) -> Path:
        """Draw and write here and now; returns the path."""
        import viewer.export as export

        if self.kind == "png":
            return export.save_png(self.picture, self.path, self.phase, progress)
        save = {"gif": export.save_gif, "mp4": export.save_mp4, "strip": export.save_strip}[self.kind]
        return save(self.picture, self.path, progress)

    def write_in_child(self, progress: Progress = SILENT) -> Path:
        """Draw and write in a child process, killed at once when cancelled; returns the path."""
        return in_child(_write, self, progress=progress, stage=f"writing {self.path.name}")


def _write(request: RenderRequest) -> Path:
    return request.write()
