"""``hingelight animate``: one loop, still or phase strip of one mode, or of one mode in two designs."""

from __future__ import annotations

import math
import re
from pathlib import Path
from typing import Annotated, Any, Literal

import typer

from viewer.cli.shell import (
    DossierPath,
    Json,
    NoCache,
    Theme,
    answer,
    command,
    progress_bar,
    theme_checked,
    workspace,
)


@command
def animate(
    dossier: DossierPath,
    mode: Annotated[int, typer.Argument(min=1, help="Number of the mode, from 1.")],
    out: Annotated[Path | None, typer.Option(help="File to write: a loop (.gif, .mp4) or a still (.png).")] = None,
    design: Annotated[str, typer.Option(help="Design to draw; the dossier's first by default.")] = "",
    against: Annotated[str, typer.Option(help="Compare with this design: NAME, or NAME:MODE.")] = "",
    overlay: Annotated[bool, typer.Option(help="Draw compared designs over one another, not side by side.")] = False,
    difference: Annotated[
        bool, typer.Option("--difference", help="Colour the compared design by how far its motion departs.")
    ] = False,
    true_scale: Annotated[bool, typer.Option("--true-scale", help="Draw at ×1; needs a stated amplitude.")] = False,
    phase: Annotated[float, typer.Option(help="Phase of a still, degrees.")] = 0.0,
    strip: Annotated[bool, typer.Option("--strip", help="Draw a strip of five phases (.png).")] = False,
    peak: Annotated[float | None, typer.Option(min=0.01, max=50, help="Drawn peak in % of the diagonal.")] = None,
    no_energy: Annotated[bool, typer.Option("--no-energy", help="Leave out the energy colours.")] = False,
    no_hinges: Annotated[bool, typer.Option("--no-hinges", help="Leave out hinges and flaps.")] = False,
    energy: Annotated[
        Literal["own", "given"], typer.Option(help='Whose strain energies: our "own", or "given" with the modes.')
    ] = "own",
    no_ghost: Annotated[bool, typer.Option("--no-ghost", help="Leave out the undeformed outline.")] = False,
    mesh_edges: Annotated[bool, typer.Option("--mesh-edges", help="Draw the edges of elements.")] = False,
    node_lines: Annotated[bool, typer.Option("--node-lines", help="Draw the lines that do not move.")] = False,
    hide: Annotated[list[str] | None, typer.Option(help="Leave out this cell group; may be repeated.")] = None,
    only: Annotated[list[str] | None, typer.Option(help="Show this cell group alone; may be repeated.")] = None,
    cut: Annotated[
        str, typer.Option(help="Cut the body open and take away the nearer part: x=120mm, or NX,NY,NZ=120mm.")
    ] = "",
    theme: Theme = "light",
    width: Annotated[
        int | None,
        typer.Option(min=320, max=3840, help="Width in pixels; default: 960, of a strip 1600.", show_default=False),
    ] = None,
    as_json: Json = False,
    no_cache: NoCache = False,
) -> None:
    """Draw one mode as a loop, a still or a phase strip; or the same mode of two designs together."""
    from viewer.errors import InputError
    from viewer.export import save_gif, save_mp4, save_png, save_strip
    from viewer.scene.compose import pair_picture, single_picture
    from viewer.scene.difference_picture import difference_picture
    from viewer.scene.showing import Showing
    from viewer.workspace.comparison import partner

    theme_checked(theme)
    opened = workspace(no_cache).open(dossier)
    first = design or opened.names[0]
    target = out or Path(f"{first}_mode_{mode:02d}{'.png' if strip else '.gif'}")
    suffix = target.suffix.lower()
    if suffix not in (".gif", ".mp4", ".png") or (strip and suffix != ".png"):
        raise InputError(
            "cannot tell what to draw",
            file=target,
            found=f"the ending '{target.suffix}'",
            expected=".png for a strip" if strip else ".gif or .mp4 for a loop, .png for a still",
        )
    if difference and (not against or node_lines):
        raise InputError("a difference is of two designs, without node lines", do="say --against DESIGN --difference")
    if against and energy == "given":
        raise InputError("given energies are of one design's own unit", do="leave out --energy given, or --against")
    options: dict[str, Any] = {
        "theme": theme,
        "width": width or 960,
        "ghost": not no_ghost,
        "mesh_edges": mesh_edges,
        "node_lines": node_lines,
        "showing": Showing(tuple(hide or ()), tuple(only or ()), _plane(cut) if cut else None),
    }
    hinges = not (no_hinges or no_energy)
    with progress_bar() as progress:
        # compared modes are sized by energies even where those are not shown
        study = opened.study(first, None, progress, energy=bool(against) or not no_energy)
        if against:
            other, _, number = against.partition(":")
            second = opened.study(other, None, progress)
            theirs = _number(number) if number else partner(opened, study, mode, second, progress)
            if difference:
                del options["node_lines"]
                picture = difference_picture(study, mode, second, theirs, true_scale=true_scale, **options)
            else:
                picture = pair_picture(
                    study,
                    mode,
                    second,
                    theirs,
                    layout="overlay" if overlay else "side",
                    true_scale=true_scale,
                    energy=not no_energy,
                    findings=(_hinges(study, mode, hinges), _hinges(second, theirs, hinges)),
                    **options,
                )
        else:
            picture = single_picture(
                study,
                mode,
                true_scale=true_scale,
                peak_percent=peak,
                energy=not no_energy,
                given_energy=energy == "given" and not no_energy,
                finding=_hinges(study, mode, hinges),
                **options,
            )
        if strip:
            save_strip(picture, target, progress, **({"width": width} if width else {}))
        elif suffix == ".png":
            save_png(picture, target, math.radians(phase), progress)
        else:
            (save_mp4 if suffix == ".mp4" else save_gif)(picture, target, progress)
    if as_json:
        answer({"file": target, "note": picture.note.__dict__, "magnification": picture.magnification})
        return
    typer.echo(str(target))


def _hinges(study: Any, mode: int, wanted: bool) -> Any:
    return study.hinges_if_known(study.index_of(mode)) if wanted else None


def _number(text: str) -> int:
    if not text.isdecimal() or int(text) < 1:
        raise typer.BadParameter(f"'{text}' is not a mode number", param_hint="--against")
    return int(text)


def _plane(text: str) -> Any:
    """ "x=120mm" or "1,0,1=120mm": a normal, and how far along it the plane lies, in a stated unit."""
    from viewer.loaders.dossier_schema import LENGTHS
    from viewer.scene.section import Plane

    found = re.fullmatch(r"\s*([^=]+?)\s*=\s*([-+]?[0-9.]+(?:[eE][-+]?[0-9]+)?)\s*([a-z]+)\s*", text)
    axes = {"x": (1.0, 0.0, 0.0), "y": (0.0, 1.0, 0.0), "z": (0.0, 0.0, 1.0)}
    try:
        if found is None or found[3] not in LENGTHS:
            raise ValueError
        normal = axes.get(found[1]) or tuple(float(part) for part in found[1].split(","))
        return Plane(normal, float(found[2]) * LENGTHS[found[3]])
    except ValueError:
        raise typer.BadParameter(
            f"'{text}' is no plane: write x=120mm, or 1,0,1=120mm with a normal; units: {', '.join(LENGTHS)}",
            param_hint="--cut",
        ) from None
