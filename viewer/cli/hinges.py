"""``hingelight hinges``: where each mode folds and what flaps."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any

import typer

from viewer.cli.shell import (
    DossierPath,
    Json,
    NoCache,
    Theme,
    Width,
    answer,
    command,
    progress_bar,
    theme_checked,
    workspace,
)


@command
def hinges(
    dossier: DossierPath,
    mode: Annotated[list[int] | None, typer.Option(min=1, help="Only this mode; may be repeated.")] = None,
    design: Annotated[list[str] | None, typer.Option(help="Only this design; may be repeated.")] = None,
    count: Annotated[int | None, typer.Option(min=1, help="How many modes to solve.")] = None,
    out: Annotated[Path | None, typer.Option(help="Also write the table to this .csv or .json file.")] = None,
    pictures: Annotated[Path | None, typer.Option(help="Also write a still of every hinge to this folder.")] = None,
    theme: Theme = "light",
    width: Width = 960,
    as_json: Json = False,
    no_cache: NoCache = False,
) -> None:
    """Find where each mode folds: hinge lines, joints and flaps, or that bending is spread."""
    from viewer.export.file_names import slugs
    from viewer.export.finding_rows import flap_rows, hinge_rows
    from viewer.export.findings import write_hinge_stills
    from viewer.export.rows import short
    from viewer.export.tables import readable, write_table

    look: dict[str, Any] = {"theme": theme_checked(theme), "width": width}
    opened = workspace(no_cache).open(dossier)
    stems = slugs(opened.names)
    found, rows, flaps, cautions = [], [], [], list(opened.warnings)
    with progress_bar() as progress:
        for name in design or opened.names:
            study = opened.study(name, count, progress)
            cautions += [*opened.doubts(name), *study.cautions]
            for number in mode or range(1, study.count + 1):
                finding = study.hinges(study.index_of(number), progress)
                facts = finding.to_dict()
                found.append({"design": name, **facts, "sentence": finding.sentence})
                rows += hinge_rows(name, facts)
                flaps += flap_rows(name, facts)
                if pictures is not None:
                    stem = f"{stems[name]}_mode_{number:02d}"
                    write_hinge_stills(pictures, stem, study, number, finding, **look)
    if out is not None:
        write_table(out, rows)
    cautions = list(dict.fromkeys([*cautions, *(words for facts in found for words in facts["cautions"])]))
    if as_json:
        answer({"title": opened.dossier.title, "findings": found, "cautions": cautions})
        return
    several = len({facts["design"] for facts in found}) > 1
    for facts in found:
        typer.echo(f"{facts['design']}: {facts['sentence']}" if several else facts["sentence"])
    typer.echo("\n" + readable(short(rows)))
    if flaps:
        typer.echo("\n" + readable(flaps))
    for caution in cautions:
        typer.echo(f"caution: {caution}")
