"""The dossier: what it says in SI, and one clear message for everything that can be wrong in it."""

import numpy as np
import pytest

from viewer.errors import DossierError
from viewer.loaders import bare_dossier, read_dossier, read_dossier_report, save_mode_name, write_interchange

FULL = """
# a comment that stays
title = "Camera boom"
condition = "clamped root, camera 1.2 kg"

[units]
length = "mm"
amplitude = "um"
modulus = "GPa"
density = "g/cm3"
mass = "g"
stiffness = "N/mm"

[materials.aluminium]
youngs_modulus = 70
poisson = 0.33
density = 2.7

[materials.steel]
youngs_modulus = 210.0
poisson = 0.3
density = 7.85

[[designs]]
name = "baseline"
mesh = "boom.vtu"
length_unit = "mm"
solve = 8
note = "as built"
assign = [
    {target = "*", material = "aluminium", thickness = 2},
    {target = "bracket", material = "steel", thickness = 3.5, formulation = "named"},
]
supports = [{name = "root", group = "root", held = ["uz", "ux"]}, {box = [[0, 0, 0], [1, 2, 3]]}]
springs = [
    {name = "strap", nodes = [3, 4], stiffness = [1, 2, 3]},
    {name = "link", nodes = [3], to = {near = [0, 0, 5]}, axis = [0, 0, 2], axial = 4},
]
masses = [{name = "camera", group = "pad", mass = 1200, position = [0, 0, 500], inertia = [1e-3, 2e-3, 3e-3]}]
mode_names = {1 = "boom nods"}   # given by hand

[[designs]]
name = "modified"
mesh = "boom.vtu"
length_unit = 0.0254
modes = "modes.npz"
points = [{name = "camera lens", nodes = [7], direction = [0, 3, 4]}]

[[points]]
name = "camera lens"
group = "pad"
direction = "-y"
effect = "image blur"
direction_word = "sideways"

[[amplitudes]]
design = "baseline"
mode = 2
point = "camera lens"
value = 180
statistic = "rms"
relative = true
condition = "belt drive at 12 Hz"

[[amplitudes]]
design = "modified"
mode = 30
near = [1, 2, 3]
direction = "+z"
value = 5
place = "tip"

[[pairs]]
first = {design = "baseline", mode = 1}
second = {design = "modified", mode = 9}
"""


@pytest.fixture
def write(tmp_path):
    (tmp_path / "boom.vtu").write_text("mesh")
    (tmp_path / "modes.npz").write_text("modes")

    def put(text, *changes):
        for old, new in changes:
            assert old in text, old
            text = text.replace(old, new, 1)
        path = tmp_path / "dossier.toml"
        path.write_text(text, encoding="utf-8")
        return path

    return put


def test_everything_comes_out_in_si(write, tmp_path):
    path = write(FULL)
    dossier, warnings = read_dossier_report(path)
    assert warnings == ()
    assert (dossier.title, dossier.path, dossier.condition) == ("Camera boom", path, "clamped root, camera 1.2 kg")
    base, modified = dossier.plans
    assert (base.name, base.mesh_file, base.length_unit) == ("baseline", tmp_path / "boom.vtu", 1e-3)
    assert (base.modes_file, base.mode_count, base.note, dict(base.mode_names)) == (
        None,
        8,
        "as built",
        {1: "boom nods"},
    )
    physics = base.physics
    aluminium = physics.materials["aluminium"]
    assert (aluminium.youngs_modulus, aluminium.poisson, aluminium.density) == (70e9, 0.33, 2700.0)
    assert [(a.target, a.material, a.thickness, a.formulation) for a in physics.assignments] == [
        ("*", "aluminium", 0.002, ""),
        ("bracket", "steel", 0.0035, "named"),
    ]
    root, corner = physics.supports
    assert (root.name, root.where.group, root.held) == ("root", "root", ("ux", "uz"))
    assert corner.name == "support 2"
    assert len(corner.held) == 6
    assert np.allclose(corner.where.box, [[0, 0, 0], [1e-3, 2e-3, 3e-3]])
    strap, link = physics.springs
    assert strap.stiffness.tolist() == [1e3, 2e3, 3e3, 0, 0, 0]
    assert strap.where.nodes.tolist() == [3, 4]
    assert (link.axis.tolist(), link.axial, link.other.near.tolist()) == ([0, 0, 1], 4000, [0, 0, 0.005])
    (camera,) = physics.masses
    assert camera.mass == pytest.approx(1.2)
    assert camera.position.tolist() == [0, 0, 0.5]
    assert np.allclose(camera.inertia, np.diag([1e-3, 2e-3, 3e-3]))  # kg·m², whatever the units
    (lens,) = base.points
    assert (lens.direction.tolist(), lens.effect, lens.direction_word) == ([0, -1, 0], "image blur", "sideways")
    assert modified.modes_file == tmp_path / "modes.npz"
    assert modified.length_unit == 0.0254
    assert len(modified.points) == 1
    assert np.allclose(modified.points[0].direction, [0, 0.6, 0.8])
    first, second = dossier.amplitudes
    assert (first.design, first.mode, first.point, first.statistic, first.relative) == (
        "baseline",
        2,
        "camera lens",
        "rms",
        True,
    )
    assert first.value == pytest.approx(180e-6)
    assert first.direction.tolist() == [0, -1, 0]  # from the functional point
    assert (second.point, second.place, second.direction.tolist()) == ("", "tip", [0, 0, 1])
    assert second.where.near.tolist() == [0.001, 0.002, 0.003]
    (pair,) = dossier.pairs
    assert (pair.first_design, pair.first_mode, pair.second_design, pair.second_mode) == (
        "baseline",
        1,
        "modified",
        9,
    )


def test_units_default_to_si(write):
    text = FULL.replace(
        'length = "mm"\namplitude = "um"\nmodulus = "GPa"\ndensity = "g/cm3"\nmass = "g"\nstiffness = "N/mm"\n', ""
    ).replace('length_unit = "mm"\n', "")
    plan = read_dossier(write(text)).plans[0]
    assert plan.length_unit == 1.0
    assert plan.physics.materials["steel"].youngs_modulus == 210.0
    assert plan.physics.springs[0].stiffness[2] == 3.0
    assert plan.physics.assignments[0].thickness == 2.0


# (change, what the message must say)
WRONG = {
    "misspelt key": (
        ("thickness = 3.5", "thicknes = 3.5"),
        r'designs 1 \("baseline"\), assign 2: unknown key \'thicknes\'.*did you mean \'thickness\'',
    ),
    "unknown table": (("[units]", "[unit]"), r"unknown key 'unit'.*expected: one of: title.*did you mean 'units'"),
    "missing key": (('mesh = "boom.vtu"\n', ""), r'designs 1 \("baseline"\): \'mesh\' is missing'),
    "missing title": (('title = "Camera boom"', ""), r"'title' is missing"),
    "text for a number": (
        ("youngs_modulus = 70", 'youngs_modulus = "70"'),
        r"materials, aluminium, youngs_modulus: .*found: '70'; expected: a number",
    ),
    "truth for a number": (
        ("poisson = 0.33", "poisson = true"),
        r"aluminium, poisson: .*found: True; expected: a number",
    ),
    "not a number": (("density = 2.7", "density = nan"), r"density: .*found: nan; expected: .*finite"),
    "negative modulus": (
        ("youngs_modulus = 70", "youngs_modulus = -70"),
        r"youngs_modulus: .*found: -70.*greater than 0",
    ),
    "poisson of a half": (("poisson = 0.33", "poisson = 0.5"), r"poisson: .*found: 0.5; expected: less than 0.5"),
    "no density": (("density = 2.7", "density = 0"), r"density: .*found: 0; expected: greater than 0"),
    "no thickness": (("thickness = 2}", "thickness = 0.0}"), r"assign 1, thickness: .*greater than 0"),
    "unknown unit": (
        ('length = "mm"', 'length = "yard"'),
        r"units, length: .*found: 'yard'; expected: .*'m', 'cm', 'mm'",
    ),
    "unknown mesh unit": (('length_unit = "mm"', 'length_unit = "yard"'), r"length_unit: .*found: 'yard'"),
    "unknown material": (
        ('material = "steel"', 'material = "stel"'),
        r"assign 2, material: no material named 'stel'.*one of: aluminium, steel.*did you mean 'steel'",
    ),
    "file not there": (
        ('mesh = "boom.vtu"', 'mesh = "bom.vtu"'),
        r"designs 1.*mesh: there is no such file; found: .*bom\.vtu",
    ),
    "modes not there": (('"modes.npz"', '"mods.npz"'), r"designs 2.*modes: there is no such file"),
    "folder as mesh": (('mesh = "boom.vtu"', 'mesh = "."'), r"mesh: is a folder"),
    "both origins": (
        ('modes = "modes.npz"', 'modes = "modes.npz"\nsolve = 3'),
        r"designs 2.*says both modes and solve",
    ),
    "neither origin": (('modes = "modes.npz"', ""), r"designs 2.*says neither modes nor assign; expected: modes ="),
    "no modes wanted": (("solve = 8", "solve = 0"), r"solve: .*found: 0; expected: greater than or equal to 1"),
    "design twice": (('name = "modified"', 'name = "baseline"'), r"designs: 'baseline' is given twice"),
    "point twice": (
        ("[[amplitudes]]", '[[points]]\nname = "camera lens"\nnodes = [1]\ndirection = "x"\n[[amplitudes]]'),
        r"points: 'camera lens' is given twice",
    ),
    "spring twice": (('name = "link"', 'name = "strap"'), r"springs: 'strap' is given twice"),
    "amplitude twice": (
        ('design = "modified"\nmode = 30', 'design = "baseline"\nmode = 2'),
        r"amplitudes: 'baseline, mode 2' is given twice",
    ),
    "unknown design": (
        ('design = "baseline"\nmode = 2', 'design = "base"\nmode = 2'),
        r"amplitudes 1, design: no design named 'base'",
    ),
    "unknown point": (
        ('point = "camera lens"', 'point = "lens"'),
        r"amplitudes 1, point: no functional point named 'lens'",
    ),
    "unknown design of a pair": (
        ('second = {design = "modified"', 'second = {design = "mod"'),
        r"pairs 1, second, design: no design named 'mod'",
    ),
    "mode not solved": (
        ('first = {design = "baseline", mode = 1}', 'first = {design = "baseline", mode = 9}'),
        r"pairs 1, first, mode: design 'baseline' has no mode 9; expected: 1 to 8.*raise solve",
    ),
    "mode zero": (
        ('first = {design = "baseline", mode = 1}', 'first = {design = "baseline", mode = 0}'),
        r"pairs 1, first, mode: .*found: 0",
    ),
    "mode named by a word": (
        ('{1 = "boom nods"}', '{first = "boom nods"}'),
        r"mode_names: a mode is named by its number",
    ),
    "no place": (
        ('group = "pad"\ndirection', "direction"),
        r"points 1.*says no place; expected: one of group, nodes, box, near",
    ),
    "two places": (
        ('group = "pad"\ndirection', 'group = "pad"\nnodes = [1]\ndirection'),
        r"points 1.*says group and nodes",
    ),
    "no nodes": (("nodes = [7]", "nodes = []"), r"nodes: .*at least 1 item"),
    "short vector": (("near = [1, 2, 3]", "near = [1, 2]"), r"amplitudes 2, near: .*at least 3 items"),
    "box upside down": (("[[0, 0, 0], [1, 2, 3]]", "[[0, 5, 0], [1, 2, 3]]"), r"supports 2, box: the lower corner"),
    "no direction": (("direction = [0, 3, 4]", "direction = [0, 0, 0]"), r"direction: a direction has no length"),
    "unknown direction": (('direction = "-y"', 'direction = "up"'), r"direction: is no direction; found: 'up'"),
    "unknown held": (('held = ["uz", "ux"]', 'held = ["z"]'), r"supports 1 \(\"root\"\), held 1: .*found: 'z'"),
    "no stiffness": ((", stiffness = [1, 2, 3]", ""), r"springs 1 \(\"strap\"\): .*expected: either stiffness"),
    "four stiffnesses": (
        ("stiffness = [1, 2, 3]", "stiffness = [1, 2, 3, 4]"),
        r"springs 1.*stiffness has 4 or 5 numbers",
    ),
    "negative stiffness": (("stiffness = [1, 2, 3]", "stiffness = [1, -2, 3]"), r"stiffness 2: .*found: -2"),
    "axis alone": ((", axial = 4", ""), r"springs 2.*says only one of axis and axial"),
    "inertia of two": (("inertia = [1e-3, 2e-3, 3e-3]", "inertia = [1e6, 2e6]"), r"inertia: wrong number of values"),
    "impossible inertia": (
        ("inertia = [1e-3, 2e-3, 3e-3]", "inertia = [[1, 2, 0], [2, 1, 0], [0, 0, 1]]"),
        r"inertia: is no inertia of a real body",
    ),
    "no mass": (("mass = 1200", "mass = 0"), r"masses 1 \(\"camera\"\), mass: .*greater than 0"),
    "amplitude without place": (("near = [1, 2, 3]\n", ""), r'amplitudes 2.*expected: either point = "NAME"'),
    "amplitude without direction": (('direction = "+z"\n', ""), r"amplitudes 2.*says no direction"),
    "unknown statistic": (('statistic = "rms"', 'statistic = "mean"'), r"statistic: .*found: 'mean'.*'peak', 'rms'"),
    "no amplitude": (("value = 180", "value = 0"), r"amplitudes 1, value: .*greater than 0"),
    "table for a list": (('[[designs]]\nname = "baseline"', '[designs]\nname = "baseline"'), r"is not valid TOML"),
    "not TOML": (("solve = 8", "solve = = 8"), r"is not valid TOML; found: .*line"),
    "key twice": (("solve = 8", "solve = 8\nsolve = 9"), r"is not valid TOML; found: .*line"),
}


@pytest.mark.parametrize("case", WRONG)
def test_one_clear_message(write, case):
    change, message = WRONG[case]
    path = write(FULL, change)
    with pytest.raises(DossierError, match=message) as caught:
        read_dossier(path)
    assert str(caught.value).startswith(str(path))
    assert "\n" not in str(caught.value)
    assert "pydantic" not in str(caught.value)


def test_no_design_at_all(write):
    with pytest.raises(DossierError, match="'designs' is missing"):
        read_dossier(write('title = "x"\n'))
    with pytest.raises(DossierError, match=r"designs: .*at least 1 item"):
        read_dossier(write('title = "x"\ndesigns = []\n'))


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b'title = "\xff"', "is not UTF-8 text"),
        (b"", "is missing"),
        (b"a" * 10_000_001, "too large"),
        (b"a = " + b"[" * 5000, "is not valid TOML"),
    ],
)
def test_files_that_are_no_dossier(tmp_path, content, message):
    (tmp_path / "d.toml").write_bytes(content)
    with pytest.raises(DossierError, match=message):
        read_dossier(tmp_path / "d.toml")


def test_no_file_and_folder(tmp_path):
    with pytest.raises(DossierError, match="there is no such file"):
        read_dossier(tmp_path / "none.toml")
    with pytest.raises(DossierError, match="is a folder"):
        read_dossier(tmp_path)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (
            ("youngs_modulus = 70", "youngs_modulus = 70e9"),
            "materials.aluminium: youngs modulus of 7e+19 Pa is implausible",
        ),
        (("density = 2.7", "density = 2700"), "density of 2.7e+06 kg/m³"),
        (("density = 7.85", "density = 0.00000785"), "density of 0.00785 kg/m³"),
        (("thickness = 2}", "thickness = 2000}"), "thickness of 2 m"),
        (("value = 180", "value = 180000"), "amplitude of 0.18 m"),
        (("inertia = [1e-3, 2e-3, 3e-3]", "inertia = [1e3, 2e3, 3e3]"), "radius of gyration of 40.8 m"),
        (
            ("mass = 1200, position = [0, 0, 500], inertia = [1e-3, 2e-3, 3e-3]", "mass = 1.2e12"),
            "mass of 1.2e+09 kg",
        ),
    ],
)
def test_implausible_values_are_flagged_not_refused(write, change, words):
    _, warnings = read_dossier_report(write(FULL, change))
    assert len(warnings) == 1
    assert words in warnings[0]


SWEEP = (
    FULL
    + """
[[sweeps]]
name = "sheet"
what = "thickness"
target = "*"
values = [2.5, 1.5, 2]
count = 3
insert = true
"""
)

SWEEPS = {
    "span": (("values = [2.5, 1.5, 2]", "from = 1.5\nto = 2.5\nsteps = 3"), (0.0015, 0.002, 0.0025), "mm"),
    "modulus": (('"thickness"\ntarget = "*"', '"youngs_modulus"\ntarget = "steel"'), (1.5e9, 2e9, 2.5e9), "GPa"),
    "density": (('"thickness"\ntarget = "*"', '"density"\ntarget = "steel"'), (1500, 2000, 2500), "g/cm³"),
    "mass": (('"thickness"\ntarget = "*"', '"mass"\ntarget = "camera"'), (0.0015, 0.002, 0.0025), "g"),
    "spring": (('"thickness"\ntarget = "*"', '"spring"\ntarget = "strap"'), (1.5, 2, 2.5), ""),
    "scale": (('"thickness"\ntarget = "*"', '"scale"\ntarget = "xz"'), (1.5, 2, 2.5), ""),
}


@pytest.mark.parametrize("case", SWEEPS)
def test_a_sweep_comes_out_in_si_ascending(write, case):
    change, values, unit = SWEEPS[case]
    (sweep,) = read_dossier(write(SWEEP, change)).sweeps
    assert (sweep.name, sweep.design, sweep.count, sweep.insert) == ("sheet", "baseline", 3, True)
    assert sweep.values == pytest.approx(values)
    assert sweep.variation.unit.name == unit
    assert (sweep.variation.unit.si == 1) == (not unit)


def test_what_a_sweep_leaves_out(write):
    (sweep,) = read_dossier(write(SWEEP, ("count = 3\ninsert = true", ""))).sweeps
    assert (sweep.design, sweep.count, sweep.insert) == ("baseline", 8, False)


WRONG_SWEEPS = {
    "unknown quantity": (('what = "thickness"', 'what = "length"'), r'\("sheet"\), what: .*found: \'length\''),
    "unknown target": (('target = "*"', 'target = "lid"'), r'\("sheet"\), target: no sheet assignment named'),
    "unknown material": (
        ('"thickness"\ntarget = "*"', '"density"\ntarget = "stel"'),
        r"target: no material named 'stel'.*did you mean 'steel'",
    ),
    "unknown axes": (('"thickness"\ntarget = "*"', '"scale"\ntarget = "xw"'), r"target: no axes named 'xw'"),
    "unknown design": (('name = "sheet"', 'name = "sheet"\ndesign = "base"'), r"design: no design named 'base'"),
    "design without material": (
        ('name = "sheet"', 'name = "sheet"\ndesign = "modified"'),
        r"design: design 'modified' cannot be solved anew",
    ),
    "no values": (("values = [2.5, 1.5, 2]", ""), r'sweeps 1 \("sheet"\): .*expected: either values ='),
    "half a span": (("values = [2.5, 1.5, 2]", "from = 1\nto = 2"), r"expected: either values ="),
    "both": (("count = 3", "steps = 3"), r"expected: either values ="),
    "one value": (("[2.5, 1.5, 2]", "[2.5]"), r"values: .*at least 2 items"),
    "a value twice": (("[2.5, 1.5, 2]", "[2, 1.5, 2]"), r"a value is given twice"),
    "value of nothing": (("[2.5, 1.5, 2]", "[0, 1]"), r"values 1: .*greater than 0"),
    "span of nothing": (("values = [2.5, 1.5, 2]", "from = 1\nto = 1\nsteps = 3"), r"from and to are the same"),
    "no modes": (("count = 3", "count = 0"), r"count: .*greater than or equal to 1"),
    "name twice": (
        ("[[sweeps]]", '[[sweeps]]\nname = "sheet"\nwhat = "scale"\ntarget = "x"\nvalues = [1, 2]\n[[sweeps]]'),
        r"sweeps: 'sheet' is given twice",
    ),
}  # fmt: skip


@pytest.mark.parametrize("case", WRONG_SWEEPS)
def test_one_clear_message_about_a_sweep(write, case):
    change, message = WRONG_SWEEPS[case]
    path = write(SWEEP, change)
    with pytest.raises(DossierError, match=message) as caught:
        read_dossier(path)
    assert str(caught.value).startswith(str(path)) and "\n" not in str(caught.value)


def test_a_sweep_over_implausible_values_is_flagged(write):
    assert any("sweeps 1" in words for words in read_dossier_report(write(SWEEP, ("2.5, 1.5, 2", "2, 2500")))[1])


def test_byte_order_mark_and_foreign_letters(write, tmp_path):
    (tmp_path / "größe.vtu").write_text("mesh")
    path = write("\ufeff" + FULL, ('mesh = "boom.vtu"', 'mesh = "größe.vtu"'))
    assert read_dossier(path).plans[0].mesh_file.name == "größe.vtu"


def test_mode_names_are_saved_without_touching_the_rest(write):
    path = write(FULL)
    save_mode_name(path, "baseline", 3, 'tip "waves" \\')
    save_mode_name(path, "modified", 2, "drehen ±")
    text = path.read_text(encoding="utf-8")
    plans = read_dossier(path).plans
    assert dict(plans[0].mode_names) == {1: "boom nods", 3: 'tip "waves" \\'}
    assert dict(plans[1].mode_names) == {2: "drehen ±"}
    kept = [line for line in FULL.splitlines() if "mode_names" not in line]
    assert all(line in text.splitlines() for line in kept)
    assert "# given by hand" in text
    save_mode_name(path, "baseline", 1, "boom bows")
    save_mode_name(path, "baseline", 3, "")
    save_mode_name(path, "modified", 2, "")
    plans = read_dossier(path).plans
    assert dict(plans[0].mode_names) == {1: "boom bows"}
    assert dict(plans[1].mode_names) == {}
    with pytest.raises(DossierError, match="no design named 'other'"):
        save_mode_name(path, "other", 1, "x")
    with pytest.raises(DossierError, match="counts from 1"):
        save_mode_name(path, "baseline", 0, "x")


def test_bare_dossier_says_what_it_found_and_reads_once_filled_in(tmp_path, mesh):
    write_interchange(tmp_path / "part.vtu", mesh)
    text = bare_dossier(mesh, tmp_path / "part.vtu")
    assert "16 nodes; 3 hex8, 1 quad4" in text
    assert '"root" (4)' in text
    path = tmp_path / "dossier.toml"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(DossierError, match="'youngs_modulus' is missing"):
        read_dossier(path)  # nothing physical is invented
    filled = text.replace("# youngs_modulus = ", "youngs_modulus = 70").replace("# poisson = ", "poisson = 0.3")
    filled = filled.replace("# density = ", "density = 2700").replace("thickness = }", "thickness = 0.002}")
    filled = filled.replace("# assign", "assign").replace("# supports", "supports").replace("# masses", "masses")
    start = filled.index("# [[points]]")
    filled = filled[:start] + filled[start:].replace("# A measured", "## A").replace("# [", "[").replace(
        "# name", "name"
    ).replace("# near", "near").replace("# direction", "direction").replace("# effect", "effect").replace(
        "# design", "design"
    ).replace("# mode", "mode").replace("# point", "point").replace("# value", "value").replace(
        "# condition", "condition"
    )
    path.write_text(filled, encoding="utf-8")
    dossier, warnings = read_dossier_report(path)
    assert warnings == ()
    design = dossier.plans[0].build(mesh)
    assert design.physics.supports[0].where.rows(mesh).tolist() == [0, 4, 8, 12]
    assert dossier.amplitudes[0].point == "camera lens"


def test_bare_dossier_with_modes_reads_as_it_stands(tmp_path, mesh, modes):
    (tmp_path / "results").mkdir()
    write_interchange(tmp_path / "part.vtu", mesh)
    write_interchange(tmp_path / "results" / "modes.npz", mesh, modes)
    text = bare_dossier(mesh, tmp_path / "part.vtu", tmp_path / "results" / "modes.npz")
    path = tmp_path / "dossier.toml"
    path.write_text(text, encoding="utf-8")
    (plan,) = read_dossier(path).plans
    assert plan.modes_file == tmp_path / "results" / "modes.npz"
    assert plan.physics.assignments == ()


def test_bare_dossier_of_awkward_names(tmp_path):
    """Quotes, strokes and line ends in names of files and groups stay inside their strings and comments."""
    from tests.loaders.samples import make_mesh

    mesh = make_mesh().with_(node_groups={'a"b\\c\n[designs]': [0]}, cell_groups={})
    text = bare_dossier(mesh, tmp_path / 'p "q".vtu', tmp_path / "m.npz")
    (tmp_path / 'p "q".vtu').write_text("x")
    (tmp_path / "m.npz").write_text("x")
    (tmp_path / "dossier.toml").write_text(text, encoding="utf-8")
    assert read_dossier(tmp_path / "dossier.toml").plans[0].mesh_file.name == 'p "q".vtu'
