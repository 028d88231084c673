"""The part of a review that compares two designs: charts of the pairing, loops and overlays of every pair."""

from __future__ import annotations

from collections.abc import Sequence

from viewer.errors import RefusedError
from viewer.export.charts import save_pairing_charts
from viewer.export.desk import Desk
from viewer.export.finding_rows import outcome_rows
from viewer.export.gif_loop import save_gif
from viewer.export.index_page import PageLoop, PageSection
from viewer.export.stills import save_png
from viewer.insight.outcome import Outcome
from viewer.jobs import SILENT, Progress
from viewer.scene.compose import pair_picture
from viewer.scene.difference_picture import difference_picture
from viewer.workspace import OpenDossier, Study
from viewer.workspace.comparison import Comparison, compare


def compared(
    opened: OpenDossier, studies: Sequence[Study], progress: Progress = SILENT
) -> tuple[list[Comparison], list[str]]:
    """The first design against each other one, and why where that cannot be."""
    found, apart = [], []
    for other in studies[1:]:
        first = studies[0]
        stated = opened.stated_pairs(first.design.name, other.design.name)
        try:
            found.append(compare(first, other, stated, progress))
        except RefusedError as error:
            apart.append(f"{first.design.name} and {other.design.name} are not compared: {error.problem}")
    return found, apart


def comparison_section(desk: Desk, comparison: Comparison) -> PageSection:
    """Write what shows a comparison; returns its part of the page."""
    one, two = comparison.first.design.name, comparison.second.design.name
    stem = f"{desk.slugs[one]}_{desk.slugs[two]}"
    facts = comparison.to_dict()
    desk.comparisons.append(comparison)
    tables = desk.table(
        f"{stem}_comparison", f"What became of each mode of {one} in {two}", outcome_rows(facts), show=True
    )
    loops = [_charts(desk, comparison, stem)]
    for item in comparison.outcomes:
        desk.steps.next(f"comparing {one} with {two}")
        if item.pair.kind == "paired":
            loops.append(_pair_loop(desk, comparison, item))
    lost = [item.sentence for item in comparison.outcomes if item.pair.kind != "paired"]
    text = (
        comparison.sentence,
        facts["support_sentence"],
        *lost,
        "Compared designs share camera, phase and magnification; energy colours share one scale.",
    )
    return PageSection(f"{one} and {two} compared", text, tuple(loops), tables, comparison=True)


def _charts(desk: Desk, comparison: Comparison, stem: str) -> PageLoop:
    ladder, agreement = save_pairing_charts(comparison, desk.folder, stem, desk.theme, desk.width, desk.give)
    return PageLoop(
        "Which mode became which",
        still=ladder.name,
        caption=comparison.sentence,
        alt=comparison.sentence,
        findings=(("how alike the shapes are", agreement.name),),
    )


def _pair_loop(desk: Desk, comparison: Comparison, item: Outcome) -> PageLoop:
    first, second = comparison.first, comparison.second
    one, two = item.pair.first or 1, item.pair.second or 1
    stem = f"{desk.slugs[first.design.name]}_{one:02d}_{desk.slugs[second.design.name]}_{two:02d}"
    paired_by = comparison.paired_by(item)
    arguments = (first, one, second, two)
    findings = (first.hinges_if_known(one - 1), second.hinges_if_known(two - 1))
    side = pair_picture(*arguments, layout="side", paired_by=paired_by, findings=findings, **desk.look)
    desk.give(save_gif, side, desk.folder / f"{stem}_side.gif", still=desk.folder / f"{stem}_side.png")
    overlay = pair_picture(*arguments, layout="overlay", paired_by=paired_by, **desk.look)
    desk.give(save_png, overlay, desk.folder / f"{stem}_overlay.png")
    difference = difference_picture(*arguments, paired_by=paired_by, **desk.look)
    desk.give(save_png, difference, desk.folder / f"{stem}_difference.png")
    return PageLoop(
        title=side.note.title,
        gif=f"{stem}_side.gif",
        still=f"{stem}_side.png",
        overlay=f"{stem}_overlay.png",
        caption=item.sentence,
        findings=(("where the motions differ", f"{stem}_difference.png"),),
        alt=f"{first.design.name} beside {second.design.name}, {side.note.title}: {', '.join(side.note.drawing)}",
    )
