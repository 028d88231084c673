"""Tables by hand and from spreadsheets: read right, or refused with the line."""

import pytest

from tests.loaders.samples import clear, read_all
from viewer.errors import LoadError
from viewer.loaders import read_mesh

NODES = "node,x,y,z\n1,0,0,0\n2,1.5,0,0\n3,0,1.5,0\n4,1.5,1.5,0\n"
ELEMENTS = "element,kind,n1,n2,n3\n10,tri3,1,2,3\n11,tri3,2,4,3\n"
MODES = "mode,node,ux,uy,uz,freq_hz\n" + "".join(f"{m},{n},0.5,{m},{n},{m}.5\n" for m in (1, 2) for n in (1, 2, 3, 4))


def put_tables(folder, nodes=NODES, elements=ELEMENTS, modes=MODES, encoding="utf-8"):
    for tail, text in (("_nodes", nodes), ("_elements", elements), ("", modes)):
        (folder / f"t{tail}.csv").write_bytes(text if isinstance(text, bytes) else text.encode(encoding))
    return folder / "t.csv"


def semicolons(text):
    return text.replace(",", ";").replace(".", ",")


READ_RIGHT = {
    "as they stand": {},
    "semicolons and decimal commas": {"nodes": semicolons(NODES), "modes": semicolons(MODES)},
    "tabs": {"nodes": NODES.replace(",", "\t"), "elements": ELEMENTS.replace(",", "\t")},
    "bars and decimal commas": {"nodes": semicolons(NODES).replace(";", "|")},
    "quoted decimal commas": {"nodes": NODES.replace("1.5", '"1,5"')},
    "byte-order mark": {"encoding": "utf-8-sig"},
    "two bytes a letter": {"encoding": "utf-16"},
    "Windows line ends": {"nodes": NODES.replace("\n", "\r\n")},
    "old line ends": {"nodes": NODES.replace("\n", "\r")},
    "blank lines and spaces": {"nodes": "\n" + NODES.replace("\n", "\n\n").replace(",", " , ")},
    "capitals": {"nodes": NODES.replace("node,x,y,z", "Node,X,Y,Z"), "elements": ELEMENTS.replace("tri3", "TRI3")},
    "columns in another order": {"nodes": "z,node,y,x\n0,1,0,0\n0,2,0,1.5\n0,3,1.5,0\n0,4,1.5,1.5\n"},
    "lines in another order": {"modes": "\n".join([MODES.splitlines()[0], *MODES.splitlines()[:0:-1]]) + "\n"},
    "ids as spreadsheets write them": {"elements": ELEMENTS.replace("10,", "10.0,").replace("11,", "11.0,")},
    "a column more": {"nodes": NODES.replace("z\n", "z,remark\n").replace(",0\n", ",0,\n")},
}


@pytest.mark.parametrize("case", READ_RIGHT)
def test_tables_read_right(tmp_path, case):
    path = put_tables(tmp_path, **READ_RIGHT[case])
    mesh, modes, shapes = read_all(path, read_mesh(path))
    assert mesh.points.tolist() == [[0, 0, 0], [1.5, 0, 0], [0, 1.5, 0], [1.5, 1.5, 0]]
    assert mesh.blocks[0].nodes.tolist() == [[0, 1, 2], [1, 3, 2]]
    assert mesh.cell_ids.tolist() == [10, 11]
    assert modes.freq_hz.tolist() == [1.5, 2.5]
    assert shapes[1].tolist() == [[0.5, 2, n] for n in (1, 2, 3, 4)]


BAD_TABLES = {
    "decimal commas parted by commas": (
        {"nodes": NODES.replace("1.5", "1,5")},
        r"t_nodes\.csv, line 3: wrong number of fields; found: 5.*semicolons",
    ),
    "marks mixed": (
        {"nodes": semicolons(NODES).replace("1,5;0;0", "1.5;0;0")},
        r"line 5: .*mixed.*a comma here, a point in line 3",
    ),
    "thousands": ({"nodes": semicolons(NODES).replace("1,5;0;0", "1.000,5;0;0")}, r"line 3: .*thousands"),
    "word": ({"nodes": NODES.replace("2,1.5", "2,abc")}, r"line 3: column 'x' holds no number; found: 'abc'"),
    "blank": ({"nodes": NODES.replace("2,1.5", "2,")}, r"line 3: column 'x' holds no number; found: ''"),
    "digits grouped": ({"nodes": NODES.replace("2,1.5", "2,1_5")}, r"line 3: column 'x' holds no number"),
    "not a number": ({"nodes": NODES.replace("2,1.5", "2,nan")}, r"point 2: a coordinate is not finite"),
    "half a node": ({"nodes": NODES.replace("\n2,", "\n2.5,")}, r"line 3: column 'node' holds no whole number"),
    "huge node": ({"nodes": NODES.replace("\n2,", f"\n{10**30},")}, r"line 3: column 'node' holds no whole number"),
    "node twice": ({"nodes": NODES.replace("\n2,", "\n1,")}, r"an element names|node ids repeat"),
    "no x": ({"nodes": NODES.replace("x", "a")}, r"column 'x' is missing; found: node, a, y, z"),
    "column twice": ({"nodes": NODES.replace("y", "x")}, r"line 1: two columns are called 'x'"),
    "no nodes": ({"nodes": "node,x,y,z\n"}, r"t_nodes\.csv: holds no node"),
    "unknown node": ({"elements": ELEMENTS.replace("2,4,3", "2,9,3")}, r"t_elements\.csv, line 3: .*found: node 9"),
    "unknown kind": ({"elements": ELEMENTS.replace("11,tri3", "11,tri5")}, r"line 3: unknown kind of cell 'tri5'"),
    "too few columns": ({"elements": ELEMENTS.replace("tri3", "quad4")}, r"column 'n4' is missing"),
    "too many nodes": ({"elements": "element,kind,n1,n2,n3,n4\n1,tri3,1,2,3,4\n"}, r"line 2: a tri3 has 3 nodes"),
    "not text": ({"nodes": NODES.encode() + b"\xff\xfe"}, r"line 6: is not UTF-8 text"),
    "zero bytes": ({"nodes": NODES.replace("1.5", "1\0", 1)}, r"line 3: is not a text file"),
    "open quote": ({"nodes": NODES.replace("1.5", '"1.5', 1)}, r"line \d+: (cannot be taken apart|wrong number)"),
    "modes from zero": (
        {"modes": MODES.replace("\n1,", "\n0,")},
        r"line 2: modes are not numbered 1, 2, 3 …; found: mode 0",
    ),
    "mode left out": ({"modes": MODES.replace("\n2,", "\n3,")}, r"line 6: modes are not numbered.*found: mode 3"),
    "node left out": (
        {"modes": MODES[: MODES.index("2,4,")]},
        r"different numbers of nodes; found: 4 in mode 1, 3 in mode 2",
    ),
    "node twice in a mode": ({"modes": MODES.replace("2,4,", "2,3,")}, r"not on the same nodes; found: mode 2"),
    "two frequencies": ({"modes": MODES[:-2] + "7\n"}, r"more than one frequency; found: mode 2"),
    "no uy": ({"modes": MODES.replace("uy", "v")}, r"column 'uy' is missing"),
    "half complex": ({"modes": MODES.replace("ux", "ux_re")}, r"column 'ux_im' is missing"),
    "no frequencies": ({"modes": MODES.replace("freq_hz", "hertz")}, r"frequencies of the modes are missing"),
    "other nodes": (
        {"modes": MODES.replace(",4,0.5", ",5,0.5")},
        r"only in the mesh \(4\), 1 nodes only in the mode file \(5\)",
    ),
}


@pytest.mark.parametrize("case", BAD_TABLES)
def test_bad_tables(tmp_path, case):
    change, message = BAD_TABLES[case]
    good = read_mesh(put_tables(tmp_path))
    path = put_tables(tmp_path, **change)
    with pytest.raises(LoadError, match=message) as caught:
        read_all(path, good)
    clear(caught.value, path)


def test_a_table_of_the_set_is_missing(tmp_path):
    path = put_tables(tmp_path)
    (tmp_path / "t_elements.csv").unlink()
    with pytest.raises(LoadError, match=r"t_elements\.csv: there is no such table"):
        read_mesh(path)


def test_the_mesh_alone_may_be_named_by_any_of_its_tables(tmp_path):
    path = put_tables(tmp_path)
    path.unlink()
    for name in ("t.csv", "t_nodes.csv", "t_elements.csv"):
        assert read_mesh(tmp_path / name).n_cells == 2
