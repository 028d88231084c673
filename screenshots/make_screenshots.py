"""Draws every picture in this folder from the sample dossiers: ``python screenshots/make_screenshots.py``."""

from __future__ import annotations

from pathlib import Path

from viewer.export import save_gif, save_png, save_strip
from viewer.export.charts import save_pairing_charts
from viewer.insight.strut import strut_trial
from viewer.scene.compose import pair_picture, single_picture
from viewer.scene.gain_picture import gain_picture
from viewer.scene.section import Plane
from viewer.scene.showing import Showing
from viewer.scene.strut_picture import strut_picture
from viewer.workspace import OpenDossier, Study, Workspace
from viewer.workspace.comparison import compare, partner

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


def only(opened: OpenDossier) -> Study:
    return opened.study(opened.names[0])


def write(save, picture, name: str) -> None:
    print(save(picture, HERE / name))


if __name__ == "__main__":
    main()
