"""What can be taken out of the window: the picture on the stage as a loop or a still, the figures as tables."""

from __future__ import annotations

from pathlib import Path

from viewer.errors import ExportError
from viewer.export import RenderRequest
from viewer.export.file_names import slugs
from viewer.export.finding_rows import flap_rows, hinge_rows, outcome_rows
from viewer.export.rows import group_rows, mode_rows, point_rows
from viewer.export.tables import Rows, write_table
from viewer.jobs import SILENT, Progress
from viewer.session.pictures import picture_of
from viewer.session.project import Project
from viewer.session.state import State

SUFFIXES = {"gif": (".gif", ".mp4"), "png": (".png",), "tables": (".csv",)}
KIND_OF_SUFFIX = {".gif": "gif", ".mp4": "mp4", ".png": "png"}


def suggested_name(project: Project, state: State, kind: str) -> str:
    """A file name for what is on the stage: "baseline_mode_01.gif"."""
    stems = slugs(project.designs)
    stem = stems[state.design]
    if kind == "tables":
        return f"{stem}_modes.csv"
    other = project.other_of(state.design, state.other) if state.compared else ""
    if other:
        stem += f"_{stems[other]}"
    shown = "_true_scale" if state.true_scale else "" if state.layout == "single" else f"_{state.layout}"
    return f"{stem}_mode_{state.mode:02d}{shown}{SUFFIXES[kind][0]}"


def with_suffix(path: Path, kind: str) -> Path:
    """``path`` with a suffix that the kind of export knows: the usual one where it has none.

    ``ExportError`` when it has another.
    """
    if not path.suffix:
        return path.with_suffix(SUFFIXES[kind][0])
    if path.suffix.lower() not in SUFFIXES[kind]:
        raise ExportError("unknown kind of file", file=path, found=path.suffix, expected=" or ".join(SUFFIXES[kind]))
    return path


def request_of(project: Project, state: State, path: Path) -> RenderRequest:
    """The order to draw what is on the stage into ``path``, with the pixels that the command line would give."""
    kind = KIND_OF_SUFFIX[path.suffix.lower()]
    return RenderRequest(picture_of(project, state), kind, path, phase=0.0 if state.playing else state.phase)


def tables_of(project: Project, state: State) -> dict[str, Rows]:
    """By what they are about: rows on the chosen design, as far as they are known by now."""
    design, study = state.design, project.study(state.design)
    if study is None:
        return {}
    told = [t for (name, _), t in sorted(project.told.items()) if name == design and t.hinges is not None]
    folds = [t.hinges.to_dict() for t in told if t.hinges is not None]
    found: dict[str, Rows] = {
        "modes": mode_rows(study),
        "points": point_rows(study),
        "groups": group_rows(study),
        "hinges": [row for facts in folds for row in hinge_rows(design, facts)],
        "flaps": [row for facts in folds for row in flap_rows(design, facts)],
    }
    other = project.other_of(design, state.other)
    comparison = project.comparison(design, other) if other else None
    if comparison is not None:
        found["comparison"] = outcome_rows(comparison.to_dict())
    return {about: rows for about, rows in found.items() if rows}


def write_tables(project: Project, state: State, path: Path, progress: Progress = SILENT) -> tuple[Path, ...]:
    """Write every table beside ``path``: for "boom_modes.csv" also "boom_points.csv", …; returns the paths.

    Raises ``ExportError`` when a file cannot be written, ``Cancelled`` when asked to stop.
    """
    stem = path.stem.removesuffix("_modes")
    written = []
    tables = tables_of(project, state)
    for done, (about, rows) in enumerate(tables.items()):
        progress.tick("writing tables", done, len(tables))
        written.append(write_table(path.with_name(f"{stem}_{about}{path.suffix}"), rows))
    return tuple(written)
