"""``dossier.toml``. See :mod:`harness`."""

from pathlib import Path

from harness import fuzz, instrumented

_FULL = b"""title = "T"
[units]
length = "mm"
modulus = "GPa"
density = "g/cm3"
mass = "g"
stiffness = "N/mm"
[materials.steel]
youngs_modulus = 210.0
poisson = 0.3
density = 7.85
[[designs]]
name = "a"
mesh = "a.vtu"
length_unit = 0.0254
solve = 8
assign = [{target = "*", material = "steel", thickness = 2, formulation = "x"}]
supports = [{name = "root", group = "root", held = ["uz", "ux"]}, {box = [[0, 0, 0], [1, 2, 3]]}]
springs = [{name = "s", nodes = [3, 4], stiffness = [1, 2]}, {nodes = [3], to = {near = [0, 0, 5]}, axis = "x"}]
masses = [{name = "m", group = "pad", mass = 1200, position = [0, 0, 500], inertia = [1e-3, 2e-3, 3e-3]}]
mode_names = {1 = "nods"}
[[designs]]
name = "b"
mesh = "a.vtu"
modes = "a.vtu"
points = [{name = "p", nodes = [7], direction = [0, 3, 4]}]
[[points]]
name = "q"
group = "pad"
direction = "-y"
effect = "blur"
[[amplitudes]]
design = "a"
mode = 1
value = 12
point = "q"
[[pairs]]
first = {design = "a", mode = 1}
second = {design = "b", mode = 2}
[[tests]]
name = "hammer"
file = ["a.vtu"]
length_unit = "in"
landmarks = [{point = "1", near = [1, 2, 3]}, {point = "9", node = 7}]
placement = {rotation = [[0, -1, 0], [1, 0, 0], [0, 0, 1]], shift = [1000, 0, 5], scale = 1}
corrections = [
    {kind = "flip", point = "12", axis = "x"},
    {kind = "swap axes", point = "3", axis = "x", other_axis = "z"},
    {kind = "move", point = "7", other = "9"},
    {kind = "move", point = "8", position = [1, 2, 3]},
]
"""


def write(place: Path, data: bytes) -> Path:
    (place / "a.vtu").write_bytes(b"x")  # a dossier only asks whether its files are there
    (place / "dossier.toml").write_bytes(data)
    return place / "dossier.toml"


def read(path: Path) -> None:
    from viewer.loaders import read_dossier

    read_dossier(path)


if __name__ == "__main__":
    instrumented()
    fuzz(read, write, [_FULL])
