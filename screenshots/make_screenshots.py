"""Draws every picture in this folder from the sample dossiers: ``python screenshots/make_screenshots.py``."""

from __future__ import annotations

import os
from dataclasses import replace
from pathlib import Path

import numpy as np

from viewer.export import save_gif, save_png, save_strip
from viewer.export.charts import save_chart, save_pairing_charts
from viewer.insight.phase import collinearity, phase_deviation_deg, turned_real
from viewer.insight.strut import strut_trial
from viewer.scene.channel_picture import channel_picture, faults_picture
from viewer.scene.compose import pair_picture, single_picture
from viewer.scene.gain_picture import gain_picture
from viewer.scene.hammer_picture import alone_picture, beside_picture, expanded_picture, over_picture
from viewer.scene.phase_chart import phase_chart
from viewer.scene.placed_test import PlacedTest, place
from viewer.scene.section import Plane
from viewer.scene.showing import Showing
from viewer.scene.strut_picture import strut_picture
from viewer.workspace import OpenDossier, Study, Workspace
from viewer.workspace.comparison import compare, partner
from viewer.workspace.testing import TestStudy, lay_beside, with_accepted

HERE = Path(__file__).parent
SAMPLES = HERE.parent / "sample_meshes"


def main() -> None:
    workspace = Workspace()
    boom = workspace.open(SAMPLES / "boom")
    baseline, modified = boom.study("baseline"), boom.study("modified")
    for theme in ("light", "dark"):
        energy = single_picture(baseline, 1, theme=theme)
        write(save_png, energy, f"energy_{theme}.png")
        write(save_strip, energy, f"phase_strip_{theme}.png")
        write(save_png, single_picture(baseline, 1, theme=theme, true_scale=True), f"true_scale_{theme}.png")
        for layout in ("side", "overlay"):
            pair = pair_picture(baseline, 1, modified, 1, layout=layout, theme=theme, paired_by="paired by shape")
            write(save_png, pair, f"{layout}_{theme}.png")
        write(save_png, single_picture(baseline, 2, theme=theme, energy=False), f"ghost_{theme}.png")
    write(save_gif, single_picture(baseline, 1, width=640), "boom_mode_1.gif")
    folding = next(number for number in range(1, baseline.count + 1) if baseline.hinges(number - 1).hinges)
    hinges = baseline.hinges(folding - 1)
    for theme in ("light", "dark"):
        write(
            save_png, single_picture(baseline, folding, finding=hinges, chosen=1, theme=theme), f"hinge_{theme}.png"
        )
        write(save_png, gain_picture(baseline, 1, baseline.gain(0), theme=theme), f"gain_{theme}.png")
    flap = single_picture(baseline, 4, finding=baseline.hinges(3), width=640)
    write(save_png, flap.with_(width=960, height=720), "flap_light.png")
    write(save_gif, flap, "boom_mode_4.gif")
    comparison = compare(baseline, modified)
    for theme in ("light", "dark"):
        for path in save_pairing_charts(comparison, HERE, "boom", theme):
            print(path.replace(path.with_name(f"{path.stem.removeprefix('boom_')}_{theme}.png")))
    hammer_test(boom)
    fork = workspace.open(SAMPLES / "fork")
    write(save_png, single_picture(only(fork), 3), "fork_light.png")
    spread = strut_trial(only(fork).design, only(fork).modes, 3, stiffness=2e4)
    write(save_png, strut_picture(only(fork), 3, spread), "strut_light.png")
    write(save_png, single_picture(only(fork), 6, node_lines=True, energy=False), "node_lines_light.png")
    cut = Showing(plane=Plane((0.0, 0.0, 1.0), 0.0))
    write(save_png, single_picture(only(fork), 3, showing=cut), "cut_light.png")
    trough = workspace.open(SAMPLES / "trough")
    first, second = (trough.study(name) for name in trough.names)
    twist = partner(trough, first, 1, second)
    write(save_png, pair_picture(first, 1, second, twist), "trough_side_light.png")
    write(save_png, pair_picture(first, 1, second, twist, layout="overlay"), "trough_overlay_light.png")


def hammer_test(boom: OpenDossier) -> None:
    """The boom's hammer test: what is wrong in it, then, put right, against the baseline."""
    raw = boom.test("hammer")
    proposals = raw.faults().proposals
    plan = replace(raw.plan, corrections=with_accepted(raw, [p.number for p in proposals]))
    test = lay_beside(raw.study, plan, raw.recorded, raw.length_unit)
    found, readings = test.correlation(), test.test.shapes
    first, third = (next(p for p in found.paired if p.test == number) for number in (1, 3))
    scattered = int(np.argmin(collinearity(readings)))
    asked = [(p.correction, (f"mean MAC {p.before.mean():.2f} → {p.after.mean():.2f}",)) for p in proposals]
    study, placed, before = test.study, laid(test), laid(raw)
    for theme in ("light", "dark"):
        for draw, pair, name in ((over_picture, first, "over"), (beside_picture, third, "beside")):
            own = test.analysis[pair.analysis - 1]
            picture = draw(study, pair.analysis, placed, pair.test, own, mac=pair.mac, theme=theme)
            write(save_png, picture, f"test_{name}_{theme}.png")
        comac = channel_picture(study, before, raw.correlation().comac, "comac", theme=theme)
        write(save_png, comac, f"test_comac_{theme}.png")
        write(save_png, faults_picture(study, before, asked, theme=theme), f"test_faults_{theme}.png")
        expanded = expanded_picture(test.expanded(), 1, placed, name=first.name, theme=theme)
        write(save_png, expanded, f"test_expanded_{theme}.png")
        phases = phase_chart(
            turned_real(readings)[scattered],
            [test.test.channel_words(channel) for channel in range(test.test.n_channels)],
            float(collinearity(readings)[scattered]),
            float(phase_deviation_deg(readings)[scattered]),
            title=f"Test mode {scattered + 1} · phases",
            theme=theme,
        )
        write(save_chart, phases, f"test_phases_{theme}.png")
    write(save_gif, alone_picture(placed, scattered + 1, width=640), "test_mode_travelling.gif")


def laid(test: TestStudy) -> PlacedTest:
    found = test.registration
    return place(test.test, found.placement, found.used, found.places)


def only(opened: OpenDossier) -> Study:
    return opened.study(opened.names[0])


def write(save, picture, name: str) -> None:
    print(save(picture, HERE / name))


if __name__ == "__main__":
    main()
    if os.environ.get("DISPLAY"):  # the window's own: see there for a virtual screen
        import make_window_screenshots

        make_window_screenshots.main()
