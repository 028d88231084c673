"""``review``: every loop, still, strip, table and comparison of a dossier in one folder, with a page that shows them.

The folder is filled aside and moved into place at the end, so that a review that is stopped leaves nothing.
"""

from __future__ import annotations

import json
import os
import shutil
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from viewer import __version__
from viewer.errors import ExportError, ModelError, RefusedError
from viewer.export.checkup import mesh_words
from viewer.export.compare_page import compared, comparison_section
from viewer.export.desk import Desk, Steps
from viewer.export.file_names import slugs
from viewer.export.finding_rows import flap_rows, hinge_rows
from viewer.export.findings import Pictures, write_gain_still, write_hinge_stills
from viewer.export.gif_loop import save_gif
from viewer.export.hammer_page import beside_designs, slug_key, summary_of, test_section
from viewer.export.index_page import PageLoop, PageSection, write_index
from viewer.export.rows import Row, group_rows, mode_caption, mode_rows, point_rows
from viewer.export.stills import save_png
from viewer.export.strip import save_strip
from viewer.export.strut_rows import strut_rows
from viewer.insight.strut_finding import StrutTrial
from viewer.jobs import SILENT, Crew, Progress, write_text
from viewer.model.plain import plain
from viewer.scene.compose import single_picture
from viewer.scene.strut_picture import strut_picture
from viewer.workspace import OpenDossier, Study
from viewer.workspace.comparison import Comparison
from viewer.workspace.explanation import Explanation
from viewer.workspace.testing import TestStudy
from viewer.workspace.trials import try_struts

SUMMARY = "summary.json"
DRAWN_ALONE_ABOVE = 500_000  # nodes: pictures of larger designs take gigabytes, one at a time is enough


@dataclass(frozen=True)
class Review:
    """What a review wrote: the page, the figures, and the tables to print."""

    index: Path
    summary: dict[str, Any]
    tables: tuple[tuple[str, list[Row]], ...]
    cautions: tuple[str, ...]


def write_review(
    opened: OpenDossier,
    folder: str | os.PathLike[str],
    *,
    count: int | None = None,
    theme: str = "light",
    width: int = 960,
    progress: Progress = SILENT,
) -> Review:
    """Write everything for a dossier into ``folder``; files of an earlier review there are replaced.

    count  modes a design; None: as the dossier says. Raises what reading, solving and drawing raise.
    """
    _check_place(Path(folder))
    studies = [opened.study(name, count, progress) for name in opened.names]
    comparisons, apart = compared(opened, studies, progress)
    tests, unplaced = beside_designs(opened, count, progress)
    steps = Steps(progress, _drawn(studies, comparisons, tests))
    large = sum(study.design.mesh.n_nodes for study in studies) > DRAWN_ALONE_ABOVE
    with _aside(Path(folder)) as part, Crew(0 if large else None, progress) as crew:
        desk = Desk(part, theme, width, steps, slugs((*opened.names, *(slug_key(t.name) for t in tests))), crew.give)
        sections = [comparison_section(desk, comparison) for comparison in comparisons]
        sections += [test_section(desk, test) for test in tests]
        sections += [_explain(desk, opened, study) for study in studies]
        doubts = [words for s in studies for words in (*opened.doubts(s.design.name), *s.cautions)]
        doubts += [f"{name}: {words}" for name, told in desk.findings.items() for t in told for words in t.cautions]
        doubts += [words for test in tests for words in test.cautions]
        cautions = tuple(dict.fromkeys((*opened.warnings, *doubts, *apart, *unplaced)))
        crew.finish("drawing")
        write_index(part, opened.dossier.title, sections, condition=opened.dossier.condition, cautions=cautions)
        summary = _summary(opened, studies, desk, cautions)
        write_text(part / SUMMARY, json.dumps(plain(summary), indent=1, ensure_ascii=False, allow_nan=False) + "\n")
    return Review(Path(folder) / "index.html", summary, tuple(desk.printed), cautions)


def _drawn(studies: list[Study], comparisons: list[Comparison], tests: list[TestStudy]) -> int:
    """How many steps the bar will show."""
    paired = sum(len(c.outcomes) for c in comparisons) + sum(1 + t.test.count for t in tests)
    return 1 + sum(s.count for s in studies) + paired


def _explain(desk: Desk, opened: OpenDossier, study: Study) -> PageSection:
    """Loops, stills, strips and tables of one design."""
    name = study.design.name
    slug = desk.slugs[name]
    rows = mode_rows(study)
    loops, told = [], []
    for index, row in enumerate(rows):
        progress = desk.steps.next(f"{name} mode {index + 1}")
        told.append(study.explain(index, progress))
        loops.append(_explain_mode(desk, study, index, row, told[-1]))
    desk.findings[name] = told
    trial, pictured = _try_struts(desk, opened, study, told)
    folds = [explained.hinges.to_dict() for explained in told if explained.hinges is not None]
    tables = (
        *desk.table(f"{slug}_modes", f"Modes of {name}", rows, show=True),
        *desk.table(
            f"{slug}_hinges", f"Where {name} folds", [r for f in folds for r in hinge_rows(name, f)], show=True
        ),
        *desk.table(
            f"{slug}_flaps", f"What flaps in {name}", [r for f in folds for r in flap_rows(name, f)], show=True
        ),
        *desk.table(f"{slug}_points", f"Motion of the functional points of {name}", point_rows(study), show=True),
        *desk.table(f"{slug}_groups", f"Energy by group of {name}", group_rows(study)),
    )
    if trial is not None:
        desk.struts[name] = trial
        rows = strut_rows(name, trial.to_dict())
        tables += desk.table(
            f"{slug}_struts", f"Struts that would raise mode {trial.mode} of {name}", rows, show=True
        )
    text = [mesh_words(study.design.mesh)]
    if study.design.note:
        text.append(study.design.note)
    return PageSection(name, tuple(text), (*loops, *pictured), tables)


def _try_struts(
    desk: Desk, opened: OpenDossier, study: Study, told: list[Explanation]
) -> tuple[StrutTrial | None, tuple[PageLoop, ...]]:
    """A strut trial on the lowest mode in which facing surfaces move apart, else on the lowest elastic one, with a
    picture of the best strut; nothing where struts cannot be told. Of the dossier's first design alone: it is the one
    to be changed, and each new solution takes long."""
    name = study.design.name
    if name != opened.names[0]:
        return None, ()
    spreading = [t.number for t in told if t.character is not None and t.character.spreads]
    progress = desk.steps.next(f"trying struts on {name}")
    try:
        mode = spreading[0] if spreading else None
        trial = try_struts(opened, name, mode, top=5, resolve=1, progress=progress)
        picture = strut_picture(study, trial.mode, trial, **desk.look)
    except (RefusedError, ModelError):
        return None, ()
    still = f"{desk.slugs[name]}_mode_{trial.mode:02d}_strut.png"
    desk.give(save_png, picture, desk.folder / still)
    title = f"A strut that would raise mode {trial.mode}"
    loop = PageLoop(title, still=still, sentences=(trial.sentence,), alt=f"{name}, {title}: {trial.sentence}")
    return trial, (loop,)


def _explain_mode(desk: Desk, study: Study, index: int, row: Row, told: Explanation) -> PageLoop:
    number, slug = index + 1, desk.slugs[study.design.name]
    stem = f"{slug}_mode_{number:02d}"
    picture = single_picture(study, number, finding=told.hinges, **desk.look)
    desk.give(save_gif, picture, desk.folder / f"{stem}.gif", still=desk.folder / f"{stem}.png")
    desk.give(save_strip, picture, desk.folder / f"{stem}_phases.png")
    true_scale = f"{stem}_true_scale.png" if number in study.amplitudes else ""
    if true_scale:
        true = single_picture(study, number, true_scale=True, **desk.look)
        desk.give(save_png, true, desk.folder / true_scale)
    pictures: Pictures = ()
    if told.hinges is not None:
        pictures += write_hinge_stills(desk.folder, stem, study, number, told.hinges, give=desk.give, **desk.look)
    if told.gain is not None:
        pictures += write_gain_still(desk.folder, stem, study, number, told.gain, give=desk.give, **desk.look)
    return PageLoop(
        title=picture.note.title,
        gif=f"{stem}.gif",
        still=f"{stem}.png",
        strip=f"{stem}_phases.png",
        true_scale=true_scale,
        caption=mode_caption(row),
        sentences=(*told.sentences, *told.refused),
        findings=pictures,
        alt=f"{study.design.name}, {picture.note.title}, {picture.note.frequency}: {', '.join(picture.note.drawing)}",
    )


def _summary(opened: OpenDossier, studies: list[Study], desk: Desk, cautions: tuple[str, ...]) -> dict[str, Any]:
    return {
        "made_by": f"hingelight {__version__}",
        "title": opened.dossier.title,
        "condition": opened.dossier.condition,
        "designs": {
            s.design.name: {
                "mesh": mesh_words(s.design.mesh),
                "formulations": list(s.energies.formulations) if s.energies is not None else [],
                "modes": desk.tables.get(f"{desk.slugs[s.design.name]}_modes", []),
                "points": desk.tables.get(f"{desk.slugs[s.design.name]}_points", []),
                "groups": desk.tables.get(f"{desk.slugs[s.design.name]}_groups", []),
                "findings": [explained.to_dict() for explained in desk.findings[s.design.name]],
                "struts": _told(desk.struts.get(s.design.name)),
                "drawing": [s.scale(i).to_dict() for i in range(s.count)],
            }
            for s in studies
        },
        "comparisons": [c.to_dict() for c in desk.comparisons],
        "tests": {name: summary_of(*found) for name, found in desk.tests.items()},
        "cautions": list(cautions),
        "files": sorted({SUMMARY, *(path.name for path in desk.folder.iterdir())}),
    }


def _told(trial: StrutTrial | None) -> dict[str, Any] | None:
    return None if trial is None else {**trial.to_dict(), "sentence": trial.sentence}


def _check_place(folder: Path) -> None:
    """Refuse a folder that cannot be filled before the work, not after it. Raises ``ExportError``."""
    there = next(path for path in (folder, *folder.absolute().parents) if path.exists())
    if not there.is_dir() or not os.access(there, os.W_OK | os.X_OK):
        why = "may not be written to" if there.is_dir() else "is not a folder"
        raise ExportError(
            "the review cannot be written there", file=folder, found=f"'{there}' {why}", do="choose a writable folder"
        )


@contextmanager
def _aside(folder: Path) -> Iterator[Path]:
    """A folder to fill beside ``folder``; on success its files move there, on failure it vanishes.

    Files that an earlier review listed in its summary and this one did not write again are removed; nobody
    else's files are touched.
    """
    try:
        folder.parent.mkdir(parents=True, exist_ok=True)
        part = Path(tempfile.mkdtemp(prefix=".part-", dir=folder.parent))
    except OSError as error:
        raise ExportError(
            "the review cannot be written there", file=folder, found=str(error), do="choose a writable folder"
        ) from error
    try:
        yield part
        folder.mkdir(exist_ok=True)
        earlier = _earlier_files(folder)
        for path in sorted(part.iterdir()):
            path.replace(folder / path.name)
            earlier.discard(path.name)
        for name in earlier:
            (folder / name).unlink(missing_ok=True)
    except OSError as error:
        raise ExportError("the review cannot be written there", file=folder, found=str(error)) from error
    finally:
        shutil.rmtree(part, ignore_errors=True)


def _earlier_files(folder: Path) -> set[str]:
    with suppress(OSError, ValueError, TypeError):
        found = json.loads((folder / SUMMARY).read_text(encoding="utf-8"))
        if isinstance(found, dict) and str(found.get("made_by", "")).startswith("hingelight"):
            names = {name for name in found.get("files", []) if isinstance(name, str)}
            return {name for name in names if Path(name).name == name and not name.startswith(".")}
    return set()
