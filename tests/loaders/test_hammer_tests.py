"""Test sets: tables against files of pyuff, round trips, local axes, runs merged, units, what is remarked upon."""

import numpy as np
import pytest
import pyuff

from tests.loaders import universal_samples as sample
from tests.loaders.hammer_sets import ROOT_HALF, as_pyuff, same, small_test
from viewer.errors import LoadError
from viewer.loaders import merge_runs, read_test, write_test
from viewer.loaders.universal_frames import KINDS_OF_FRAME, Frame

POINTS = "point,x,y,z\n1,0,0,0\n2,1000,0,0\n"
SHAPES = "mode,point,direction,value\n1,1,+X,1\n1,1,-Z,0.5\n1,2,y,-2\n"
FREQUENCIES = "mode,freq_hz,damping\n1,12.5,0.01\n"


def tables(folder, name="t", points=POINTS, shapes=SHAPES, frequencies=FREQUENCIES, lines=None, encoding="utf-8"):
    texts = {"points": points, "shapes": shapes, "frequencies": frequencies, "lines": lines}
    for tail, text in texts.items():
        if text is not None:
            (folder / f"{name}_{tail}.csv").write_bytes(text.encode(encoding))
    return folder / f"{name}_points.csv"


# --- both formats say the same ---


@pytest.mark.parametrize("nodes", [15, 2411])
@pytest.mark.parametrize("is_complex", [False, True])
def test_a_file_of_pyuff_and_its_twin_in_tables_read_equal(tmp_path, nodes, is_complex):
    test = small_test(is_complex)
    write_test(tmp_path / "small.csv", test, length_unit=0.001)
    by_tables = read_test(tmp_path / "small_shapes.csv", length_unit=0.001)
    by_pyuff = read_test(as_pyuff(tmp_path / "small.uff", test, nodes=nodes))
    same(by_tables, test)
    # an eigenvalue of six digits gives the frequency to 1e-6 and the ratio of real part to size to 1e-6 of one
    np.testing.assert_allclose(by_pyuff.points, by_tables.points, rtol=0, atol=2e-5)  # 15 has six digits
    same(by_pyuff.with_(points=by_tables.points), by_tables, 2e-6 if is_complex else 1e-12)
    assert by_pyuff.is_complex is is_complex and by_tables.name == "small"


@pytest.mark.parametrize("suffix", [".csv", ".unv"])
@pytest.mark.parametrize("is_complex", [False, True])
@pytest.mark.parametrize("oblique", [False, True])
def test_round_trip(tmp_path, suffix, is_complex, oblique):
    test = small_test(is_complex, oblique)
    path = write_test(tmp_path / f"a{suffix}", test, length_unit=0.0254)
    again = read_test(path, length_unit=0.0254)
    same(again, test, 1e-12 if suffix == ".csv" else 2e-6)
    assert again.source == str(path)
    np.testing.assert_allclose(again.motion(1), test.motion(1), atol=2e-6)


def test_what_we_write_pyuff_reads(tmp_path):
    test = small_test(is_complex=True)
    sets = {s["type"]: s for s in pyuff.UFF(str(write_test(tmp_path / "a.unv", test))).read_sets() if s["type"] != 55}
    assert sets[2411]["node_nums"].tolist() == [1, 2, 30, 4, 77]
    np.testing.assert_allclose(np.column_stack([sets[2411][axis] for axis in "xyz"]), test.points)
    assert sets[164]["length"] == 1.0
    modes = [s for s in pyuff.UFF(str(tmp_path / "a.unv")).read_sets() if s["type"] == 55]
    assert [m["mode_n"] for m in modes] == [1, 2, 3]
    np.testing.assert_allclose(abs(modes[0]["eig"]) / 2 / np.pi, 12.5, rtol=1e-5)
    np.testing.assert_allclose(modes[0]["r1"][0], test.shapes[0, 0], atol=1e-6)


def test_mode_shapes_of_analysis_data_2414(tmp_path):
    path = tmp_path / "a.unv"
    path.write_text(
        sample.units()
        + sample.nodes_2411([3, 8], [[0.0, 0, 0], [1, 0, 0]])
        + sample.analysis_2414(1, [3, 8], [[1.0, 0, 2], [0, 0, -3]], 40.0, mode=2, damping=0.03)
        + sample.analysis_2414(1, [3, 8], [[4.0, 0, 5], [0, 0, 6]], 20.0, mode=1)
    )
    test = read_test(path)
    assert test.freq_hz.tolist() == [20, 40]  # ascending, whatever the order in the file
    assert test.shapes.tolist() == [[4, 5, 6], [1, 2, -3]]
    assert np.isnan(test.damping[0]) and test.damping[1] == 0.03
    assert [test.channel_words(c) for c in range(3)] == ["point 3, +X", "point 3, +Z", "point 8, +Z"]


# --- tables ---


def test_tables_by_hand(tmp_path):
    test = read_test(tables(tmp_path, lines="from,to\n2,1\n"), length_unit=0.001)
    assert test.labels == ("1", "2") and test.points.tolist() == [[0, 0, 0], [1, 0, 0]]
    assert test.directions.tolist() == [[1, 0, 0], [0, 0, -1], [0, 1, 0]]
    assert test.shapes.tolist() == [[1, 0.5, -2]] and not test.is_complex
    assert test.lines.tolist() == [[1, 0]]
    assert test.freq_hz.tolist() == [12.5] and test.damping.tolist() == [0.01]
    assert test.name == "t" and test.remarks == ("the unit of length was declared: 0.001 m",)


@pytest.mark.parametrize("named", ["t.csv", "t_points.csv", "t_lines.csv", "t_shapes.csv", "t_frequencies.csv"])
def test_a_set_of_tables_goes_by_any_of_its_names(tmp_path, named):
    tables(tmp_path, lines="from,to\n2,1\n")
    assert read_test(tmp_path / named, 1.0).name == "t"


@pytest.mark.parametrize("separator", [";", "\t", "|"])
@pytest.mark.parametrize("encoding", ["utf-8-sig", "utf-16"])
def test_tables_of_a_spreadsheet_with_decimal_commas(tmp_path, separator, encoding):
    texts = [text.replace(",", separator).replace(".", ",") for text in (POINTS, SHAPES, FREQUENCIES)]
    texts[0] = texts[0].replace("1000", "1000,5").replace("\n", "\r\n")
    test = read_test(tables(tmp_path, "t", *texts, encoding=encoding), 0.001)
    assert test.points[1, 0] == 1.0005 and test.shapes[0, 1] == 0.5 and test.damping[0] == 0.01


def test_labels_with_points_are_words(tmp_path):
    points, shapes = (text.replace("\n1", "\n3.1").replace(",1,", ",3.1,") for text in (POINTS, SHAPES))
    shapes = shapes.replace("\n3.1", "\n1")
    points, shapes = (text.replace(",", ";").replace("0.5", "0,5") for text in (points, shapes))
    test = read_test(tables(tmp_path, points=points, shapes=shapes), 1.0)
    assert test.labels == ("3.1", "2") and test.shapes[0, 1] == 0.5


def test_values_as_amplitude_and_phase(tmp_path):
    shapes = "mode,point,direction,amplitude,phase_deg\n1,1,+X,2,0\n1,1,-Z,0.5,180\n1,2,y,1,{}\n"
    real = read_test(tables(tmp_path, shapes=shapes.format(-180)), 1.0)
    assert real.shapes.tolist() == [[2, -0.5, -1]] and not real.is_complex
    skew = read_test(tables(tmp_path, shapes=shapes.format(450)), 1.0)
    assert skew.shapes.tolist() == [[2, -0.5, 1j]]
    skew = read_test(tables(tmp_path, shapes=shapes.format(30)), 1.0)
    np.testing.assert_allclose(skew.shapes[0, 2], np.cos(np.pi / 6) + 0.5j)


def test_directions_as_vectors_and_a_channel_that_turns_between_modes(tmp_path):
    shapes = "mode,point,dx,dy,dz,value\n1,1,0.71,0.71,0,1\n2,1,-0.71,-0.71,0,3\n"
    test = read_test(tables(tmp_path, shapes=shapes, frequencies="mode,freq_hz\n1,5\n2,6\n"), 1.0)
    np.testing.assert_allclose(test.directions, [[ROOT_HALF, ROOT_HALF, 0]])
    assert test.shapes.tolist() == [[1], [-3]] and test.damping is None
    assert any("points without a channel: 2" in remark for remark in test.remarks)


@pytest.mark.parametrize(
    ("columns", "values"),
    [
        ("turn_z,turn_y,turn_x", ["0,0,0", "90,0,0", "0,90,0", "0,0,90", "90,90,0"]),
        (
            "x_axis_x,x_axis_y,x_axis_z,y_axis_x,y_axis_y,y_axis_z",
            ["1,0,0,0,1,0", "0,1,0,-1,0,0", "0,0,-1,0,1,0", "1,0,0,0,0,1", "0,0,-1,-1,0,0"],
        ),
    ],
)
def test_sensors_with_axes_of_their_own(tmp_path, columns, values):
    """Right-handed turns: about z takes x to y; about y takes z to x; about x takes y to z; about z, then the turned
    y: x goes where z was turned down, y stays where z turned it."""
    points = f"point,x,y,z,{columns}\n" + "".join(f"{i},{i},0,0,{value}\n" for i, value in enumerate(values))
    rows = [f"1,{i},{axis},{i + 1}" for i in range(5) for axis in ("+X", "-Y")]
    shapes = "\n".join(["mode,point,direction,value", *rows])
    test = read_test(tables(tmp_path, points=points, shapes=shapes), 1.0)
    wanted = [[1, 0, 0], [0, -1, 0], [0, 1, 0], [1, 0, 0], [0, 0, -1], [0, -1, 0], [1, 0, 0], [0, 0, -1]]
    wanted += [[0, 0, -1], [1, 0, 0]]
    np.testing.assert_allclose(test.directions, wanted, atol=1e-15)
    assert "sensors have axes of their own, which were applied" in test.remarks


# --- universal files ---


def test_displacement_systems_of_points_are_applied(tmp_path):
    """A system turned by 90° about z: its x is the part's y. And a cylindrical one: r and θ at the point."""
    turned = np.array([[0, 1.0, 0], [-1, 0, 0], [0, 0, 1], [5, 6, 7]])
    around = np.vstack([np.eye(3), [[10.0, 0, 0]]])
    path = tmp_path / "a.uff"
    sets = [
        {
            "type": 2420,
            "CS_sys_labels": [12, 13],
            "CS_types": [0, 1],
            "CS_colors": [1, 1],
            "CS_names": ["a", "b"],
            "CS_matrices": [turned, around],
        },
        pyuff.prepare_2411(
            node_nums=[1, 2, 3],
            def_cs=[0, 0, 0],
            disp_cs=[12, 13, 0],
            color=[0, 0, 0],
            x=[0.0, 10, 1],
            y=[0.0, 2, 1],
            z=[0.0, 0, 0],
        ),
        pyuff.prepare_55(
            model_type=1, analysis_type=2, data_ch=2, spec_data_type=8, load_case=1, mode_n=1, modal_m=0.0,
            modal_damp_vis=0.0, modal_damp_his=0.04, freq=9.0, node_nums=[1, 2, 3], r1=[1.0, 2, 3], r2=[0.0, 4, 0],
            r3=[0.0, 0, 5], n_data_per_node=3, data_type=2,
        ),
    ]  # fmt: skip
    file = pyuff.UFF(str(path))
    for number, item in enumerate(sets):
        file.write_sets(item, "overwrite" if number == 0 else "add")
    test = read_test(path, 1.0)
    np.testing.assert_allclose(test.motion(0), [[0, 1, 0], [-4, 2, 0], [3, 0, 5]], atol=1e-12)
    assert test.damping.tolist() == [0.02]  # half the hysteretic one
    assert "points with a coordinate system of their own measure along its axes: 1, 2" in test.remarks
    assert any("4 directions at points are zero in every mode" in remark for remark in test.remarks)


@pytest.mark.parametrize("kind", KINDS_OF_FRAME)
def test_directions_of_a_system_are_those_in_which_its_coordinates_grow(kind):
    """Against differences of the coordinates themselves."""
    axes = np.linalg.qr(np.random.default_rng(2).normal(size=(3, 3)))[0]
    frame = Frame(5, kind, "a", [1.0, 2, 3], axes * np.sign(np.linalg.det(axes)))
    at = np.array([[2.0, 30, 50], [1.5, -120, 100], [0.7, 200, 20]])
    for axis in range(3):
        step = np.eye(3)[axis] * 1e-4
        grown = frame.to_part(at + step) - frame.to_part(at - step)
        wanted = grown / np.linalg.norm(grown, axis=1, keepdims=True)
        np.testing.assert_allclose(frame.directions(frame.to_part(at))[:, axis], wanted, atol=1e-7)


def test_turning_at_points_is_left_out(tmp_path):
    path = tmp_path / "a.unv"
    mode = sample.mode_55([1, 2], [[1.0, 0, 0, 5, 6, 7], [2.0, 0, 0, 0, 0, 0]], 5.0)
    path.write_text(sample.nodes_15([1, 2], [[0.0, 0, 0], [1, 0, 0]]) + mode)
    test = read_test(path, 1.0)
    assert test.shapes.tolist() == [[1, 2]]
    assert "turning at points is in the file and was left out" in test.remarks


# --- units ---


def test_a_unit_that_nothing_states_is_asked_for_not_guessed(tmp_path):
    with pytest.raises(LoadError, match=r"nothing states the unit of length.*length_unit = \"mm\""):
        read_test(tables(tmp_path))
    with pytest.raises(LoadError, match="is not above zero"):
        read_test(tables(tmp_path), length_unit=0.0)


def test_a_unit_stated_twice_must_agree(tmp_path):
    path = as_pyuff(tmp_path / "a.uff", small_test())
    assert read_test(path, 0.001).remarks[-2] == "the unit of length was declared: 0.001 m"
    with pytest.raises(LoadError, match=r"stated twice and differs; found: 0\.001 m in the file, 1 m declared"):
        read_test(path, 1.0)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"unit": 1.0}, "measure 1e+03 m from corner to corner, which is implausible"),
        ({"unit": 1e-6}, "measure 0.001 m from corner to corner"),
        ({"frequencies": "mode,freq_hz\n1,0.012\n"}, "a frequency of 0.012 Hz is implausible"),
        ({"frequencies": "mode,freq_hz,damping\n1,12,0.5\n"}, "damping of 0.5 of mode 1 is implausible"),
        ({"frequencies": "mode,freq_hz,damping\n1,12,-0.01\n"}, "damping of -0.01 of mode 1 is implausible"),
    ],
)
def test_the_implausible_is_read_and_remarked_upon(tmp_path, change, words):
    unit = change.pop("unit", 0.001)
    test = read_test(tables(tmp_path, **change), unit)
    assert any(words in remark for remark in test.remarks)


# --- runs ---


def runs_of(test, parts, factors, stretch=0.002):
    return [
        test.only(part).with_(
            shapes=test.shapes[:, part] * factor, freq_hz=test.freq_hz * (1 + stretch * n), name=f"run {n}"
        )
        for n, (part, factor) in enumerate(zip(parts, factors, strict=True))
    ]


@pytest.mark.parametrize("is_complex", [False, True])
def test_runs_are_scaled_to_one_another_on_their_common_channels(is_complex):
    """The third run shares nothing with the first, only with the second."""
    test = small_test(is_complex)
    factors = [1, -2, 0.5j if is_complex else 0.5]
    sets = runs_of(test, [[0, 1, 2], [4, 5, 6], [2, 3, 4]], factors)
    merged = merge_runs(sets)
    same(merged.with_(freq_hz=test.freq_hz), test)
    np.testing.assert_allclose(merged.freq_hz, test.freq_hz * 1.002)
    assert merged.remarks[0] == "3 runs were merged on their common channels"
    assert any("differ by at most 0.40%" in remark for remark in merged.remarks)
    assert merge_runs(sets[:1]) is sets[0]


def test_least_squares_on_shared_channels():
    """Two shared channels that disagree: the factor is bᵀa / bᵀb, and the mean of both runs is kept there."""
    test = small_test()
    first = test.only([0, 1]).with_(shapes=[[1.0, 2.0]] * 3)
    second = test.only([0, 1, 2]).with_(shapes=[[1.0, 1.0, 4.0]] * 3)
    merged = merge_runs([first, second])
    np.testing.assert_allclose(merged.shapes, [[1.25, 1.75, 6.0]] * 3)  # the factor is 3 / 2
    assert any("run 2 differs from the others by 32%" in remark for remark in merged.remarks)


def test_a_shared_channel_may_point_the_other_way():
    test = small_test()
    turned = test.with_(directions=-test.directions, shapes=-test.shapes)
    same(merge_runs([test.only([0, 1, 2, 3]), turned.only([3, 4, 5, 6])]), test)


def test_a_mode_that_a_run_lacks_is_left_out_and_named():
    test = small_test()
    rows, channels = [0, 2], [2, 3, 4]
    second = test.with_(
        freq_hz=test.freq_hz[rows],
        shapes=test.shapes[np.ix_(rows, channels)],
        damping=[0.03, np.nan],
        sensor=test.sensor[channels],
        directions=test.directions[channels],
    )
    merged = merge_runs([test.only([0, 1, 2]), second])
    assert merged.freq_hz.tolist() == [12.5, 31.0]
    np.testing.assert_allclose(merged.damping, [0.02, 0.015])
    assert any("modes of run 1 that are not in every run were left out: 20.25 Hz" in r for r in merged.remarks)


def test_close_modes_keep_their_order():
    """The sum of differences is the same either way round; squared, only the one in order is least."""
    test = small_test().with_(freq_hz=[12.5, 12.6, 31.0])
    merged = merge_runs([test, test.with_(freq_hz=[13.0, 13.2, 31.0])])
    np.testing.assert_allclose(merged.freq_hz, [12.75, 12.9, 31.0])
    np.testing.assert_allclose(merged.shapes, test.shapes)


def test_runs_that_cannot_be_merged():
    test = small_test()
    with pytest.raises(LoadError, match=r"run 2 has no channel in common with the others.*reference point"):
        merge_runs([test.only([0, 1]), test.only([2, 3])])
    moved = test.with_(points=test.points + np.array([0.1, 0, 0]))
    with pytest.raises(LoadError, match=r"run 2: point 1 lies at two places"):
        merge_runs([test, moved])
    with pytest.raises(LoadError, match=r"no mode in common.*12\.5, 20\.25, 31 Hz; 125, 202\.5, 310 Hz"):
        merge_runs([test, test.with_(freq_hz=test.freq_hz * 10)])
    still = test.shapes.copy()
    still[1, 2] = 0
    with pytest.raises(LoadError, match=r"shared channels of run 2 do not move in the mode at 20\.25 Hz"):
        merge_runs([test.only([0, 1, 2]), test.with_(shapes=still).only([2, 3])])


def test_a_faint_reference_is_remarked_upon():
    test = small_test()
    shapes = test.shapes.copy()
    shapes[0, 2] = 0.01
    merged = merge_runs([s.only(c) for s, c in ((test, [0, 1, 2]), (test.with_(shapes=shapes), [2, 3, 4, 5, 6]))])
    assert any("run 2 hardly move in the mode at 12.5 Hz" in remark for remark in merged.remarks)


def test_runs_in_several_files_and_in_one(tmp_path):
    test = small_test(is_complex=True)
    paths = [
        as_pyuff(tmp_path / f"run_{n}.uff", run)
        for n, run in enumerate(runs_of(test, [[0, 1, 2, 3], [3, 4, 5, 6]], [1, 3j], stretch=0), 1)
    ]
    by_files = read_test(paths)
    same(by_files.with_(points=test.points), test, 2e-5)
    assert by_files.name == "run_1" and by_files.source == f"{paths[0]}; {paths[1]}"
    in_one = read_test(as_pyuff(tmp_path / "all.uff", test, runs=[[0, 1, 2, 3], [3, 4, 5, 6]]))
    same(in_one.with_(points=test.points), test, 2e-5)
    with pytest.raises(LoadError, match=r"all\.uff: run 2 has no channel in common"):
        read_test(as_pyuff(tmp_path / "all.uff", test, runs=[[0, 1, 2, 3], [4, 5, 6]]))


# --- writing ---


def test_what_a_universal_file_has_no_place_for(tmp_path):
    test = small_test()
    with pytest.raises(LoadError, match=r"labels of points do not fit.*'tip left'"):
        write_test(tmp_path / "a.unv", test.with_(labels=("tip left", "2", "3", "4", "5")))
    skew = test.directions.copy()
    skew[4] = [0, 0.6, 0.8]
    with pytest.raises(LoadError, match=r"channels of point 2 do not fit.*\(0 0\.6 0\.8\)"):
        write_test(tmp_path / "a.unv", test.with_(directions=skew))
    with pytest.raises(LoadError, match=r"\.txt; expected: \.csv"):
        write_test(tmp_path / "a.txt", test)
    assert not list(tmp_path.iterdir())
    write_test(tmp_path / "a.csv", test.with_(directions=skew, labels=("tip left", "2", "3", "4", "5")))
    assert read_test(tmp_path / "a.csv", 1.0).directions[4].tolist() == [0, 0.6, 0.8]
