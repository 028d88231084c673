"""Pictures of a test beside a design: charts, what single channels say, loops and stills of the pairs."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np

from viewer.export.charts import save_chart
from viewer.export.findings import Pictures
from viewer.export.gif_loop import save_gif
from viewer.export.index_page import PageLoop
from viewer.export.stills import save_png
from viewer.insight.correlate import mac
from viewer.insight.hammer_pairing import TestPair
from viewer.insight.hammer_words import numbers
from viewer.insight.hinges import HingeFinding
from viewer.insight.phase import turned_real
from viewer.jobs import Give, at_once
from viewer.model.written import digits
from viewer.scene.channel_picture import channel_picture, faults_picture
from viewer.scene.correlation_charts import correlation_field, correlation_ladder, own_field
from viewer.scene.hammer_picture import beside_picture, expanded_picture, over_picture
from viewer.scene.phase_chart import phase_chart
from viewer.scene.placed_test import PlacedTest, place
from viewer.workspace.mixed import mixed
from viewer.workspace.testing import TestExplanation, TestStudy

LOOP_WIDTH = 640  # at most: there is a loop for each measured mode, and lines need fewer pixels than colours


def placed_of(study: TestStudy) -> PlacedTest:
    """The test in the mesh's axes, for pictures."""
    found = study.registration
    return place(study.test, found.placement, found.used, places=found.places)


def write_test_charts(
    folder: Path,
    stem: str,
    study: TestStudy,
    told: TestExplanation,
    *,
    give: Give = at_once,
    theme: str = "light",
    width: int = 960,
) -> Pictures:
    """The ladder of frequencies, the fields of agreement, and what the channels say; those that can be had."""
    look: dict[str, Any] = {"theme": theme, "width": width}
    placed, written = placed_of(study), []

    def chart(words: str, end: str, sheet: Any) -> None:
        give(save_chart, sheet, folder / f"{stem}_{end}.png", width=width)
        written.append((words, f"{stem}_{end}.png"))

    def still(words: str, end: str, picture: Any) -> None:
        give(save_png, picture, folder / f"{stem}_{end}.png")
        written.append((words, f"{stem}_{end}.png"))

    names = study.study.names
    if told.correlation is not None:
        chart("which mode is which", "ladder", correlation_ladder(told.correlation, names, theme))
        chart("how alike the shapes are", "agreement", correlation_field(told.correlation, names, theme))
        chart(
            "whether the points tell the modes apart",
            "points_apart",
            own_field(told.correlation, "analysis", names, theme),
        )
        if np.isfinite(told.correlation.ecomac).any():
            values = told.correlation.ecomac
            still(
                "where test and analysis disagree",
                "channels",
                channel_picture(study.study, placed, values, "ecomac", **look),
            )
    if told.faults is not None and told.faults.proposals:
        proposals = [(p.correction, _effect(p.to_dict())) for p in told.faults.proposals]
        still("channels that may be wrong", "faults", faults_picture(study.study, placed, proposals, **look))
    if told.expansion is not None:
        values = told.expansion.residual_by_channel
        still(
            "what the expansion cannot explain",
            "left_out",
            channel_picture(study.study, placed, values, "residual", **look),
        )
    return tuple(written)


def pair_loop(
    folder: Path,
    stem: str,
    study: TestStudy,
    pair: TestPair,
    *,
    give: Give = at_once,
    theme: str = "light",
    width: int = 960,
) -> PageLoop:
    """The loop of a measured mode beside its counterpart, with a still of both in one place and its phases."""
    assert pair.test is not None and pair.analysis is not None
    placed = placed_of(study)
    beside, analysis = mixed(study.study, pair.analysis, pair.mixture, study.analysis)
    alike = pair.mac
    if beside is not study.study:
        measured = study.test.shapes[pair.test - 1, placed.used]
        alike = float(mac(measured, analysis[placed.used])[0, 0])
    look: dict[str, Any] = {"theme": theme, "width": min(width, LOOP_WIDTH)}
    arguments = (beside, pair.analysis, placed, pair.test, analysis)
    name = f"{stem}_mode_{pair.test:02d}"
    side = beside_picture(*arguments, mac=alike, **look)
    give(save_gif, side, folder / f"{name}_beside.gif", still=folder / f"{name}_beside.png")
    over = over_picture(*arguments, mac=alike, theme=theme, width=width)
    give(save_png, over, folder / f"{name}_over.png")
    findings: Pictures = ()
    if study.test.is_complex:
        give(save_chart, _phases(study, pair, theme), folder / f"{name}_phases.png", width=width)
        findings = (("phases of its channels", f"{name}_phases.png"),)
    return PageLoop(
        title=side.note.title,
        gif=f"{name}_beside.gif",
        still=f"{name}_beside.png",
        overlay=f"{name}_over.png",
        findings=findings,
        alt=f"test {study.name} beside {study.design}, {side.note.title}: {', '.join(side.note.drawing)}",
    )


def expanded_still(
    folder: Path,
    stem: str,
    study: TestStudy,
    test_mode: int,
    finding: HingeFinding | None,
    *,
    give: Give = at_once,
    theme: str = "light",
    width: int = 960,
) -> tuple[str, str]:
    """A still of a measured mode expanded onto the mesh; returns words and file."""
    spread = study.expansion()
    said = f"expanded from {spread.n_channels} channels on analysis {numbers(spread.basis_of(test_mode - 1))}"
    picture = expanded_picture(
        study.expanded(), test_mode, placed_of(study), said, finding=finding, theme=theme, width=width
    )
    give(save_png, picture, folder / f"{stem}_mode_{test_mode:02d}_expanded.png")
    return "spread over the mesh", f"{stem}_mode_{test_mode:02d}_expanded.png"


def _phases(study: TestStudy, pair: TestPair, theme: str) -> Any:
    assert pair.test is not None
    used = study.registration.used
    values = np.where(used, study.test.shapes[pair.test - 1], np.nan)
    values[used] = turned_real(study.test.shapes[pair.test - 1 : pair.test, used])[0]
    channels = [study.test.channel_words(c) for c in range(study.test.n_channels)]
    title = f"Test mode {pair.test} · phases"
    return phase_chart(
        values, channels, pair.collinearity or 0.0, pair.phase_deviation_deg or 0.0, title=title, theme=theme
    )


def _effect(facts: dict[str, Any]) -> tuple[str, ...]:
    before, after = facts["mean_mac_before"], facts["mean_mac_after"]
    if before is None:
        return ()
    lines = [f"mean MAC {digits(before, 2)} → {digits(after, 2)}"]
    if facts["alternatives"]:
        lines.append(f"as likely: {facts['alternatives'][0]['words']}")
    return tuple(lines)
