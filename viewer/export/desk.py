"""Where a review writes, and what it has written so far."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

from viewer.export.index_page import PageTable
from viewer.export.rows import Row, short
from viewer.export.tables import write_table
from viewer.insight.strut_finding import StrutTrial
from viewer.jobs import Give, Progress
from viewer.workspace.comparison import Comparison
from viewer.workspace.explanation import Explanation

if TYPE_CHECKING:
    from viewer.workspace.testing import TestExplanation, TestStudy


@dataclass
class Steps:
    """Counts drawn modes, so that the bar of a review moves evenly."""

    progress: Progress
    total: int
    done: int = 0

    def next(self, words: str) -> Progress:
        self.progress.tick(words, self.done, self.total)
        self.done += 1
        return Progress(lambda *_: self.progress.tick(words, self.done - 1, self.total))


@dataclass
class Desk:
    """Where a review writes, who draws for it (``give``), and what it has written so far."""

    folder: Path
    theme: str
    width: int
    steps: Steps
    slugs: dict[str, str]
    give: Give
    printed: list[tuple[str, list[Row]]] = field(default_factory=list)
    tables: dict[str, list[Row]] = field(default_factory=dict)
    findings: dict[str, list[Explanation]] = field(default_factory=dict)
    struts: dict[str, StrutTrial] = field(default_factory=dict)
    comparisons: list[Comparison] = field(default_factory=list)
    tests: dict[str, tuple[TestStudy, TestExplanation]] = field(default_factory=dict)

    @property
    def look(self) -> dict[str, Any]:
        return {"theme": self.theme, "width": self.width}

    def table(self, stem: str, title: str, rows: list[Row], *, show: bool = False) -> tuple[PageTable, ...]:
        """Write rows as CSV and JSON; nothing when there are none."""
        if not rows:
            return ()
        for suffix in (".csv", ".json"):
            write_table(self.folder / f"{stem}{suffix}", rows)
        self.tables[stem] = rows
        if show:
            self.printed.append((title, short(rows)))
        return (PageTable(title, short(rows), f"{stem}.csv", f"{stem}.json"),)
