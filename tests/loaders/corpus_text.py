"""Bad ``.xdmf``, text decks, tables, surfaces and what libraries read: one small text each."""

from functools import partial

import numpy as np

from tests.loaders.samples import make_mesh, make_modes
from viewer.loaders import write_interchange


def made():
    """(name, class of fault, maker, message, what else may be) of every case."""
    for suffix, good, faults in (
        (".xdmf", XDMF, BAD_XDMF),
        (".inp", INP, BAD_INP),
        (".bdf", BDF, BAD_BDF),
        (".obj", OBJ, BAD_OBJ),
    ):
        for name, (fault, old, new, says) in faults.items():
            yield f"{suffix}: {name}", fault, partial(_edited, suffix, good, old, new), says
        yield f"{suffix}: byte-order mark", "TEXT", partial(_edited, suffix, "", "", "\ufeff" + good), "", "equal"
        may = "equal" if suffix == ".xdmf" else ""  # XML says of itself how it is encoded
        yield f"{suffix}: UTF-16", "TEXT", partial(_encoded, suffix, good, "utf-16"), "", may
        yield f"{suffix}: letters that are not ASCII", "TEXT", partial(_renamed, suffix, good), "", "equal"
    for name, (suffix, fault, content, says) in FOREIGN.items():
        yield f"{suffix}: {name}", fault, partial(_content, suffix, content), says
    for name, (fault, table, old, new, says) in TABLES.items():
        yield f".csv: {name}", fault, partial(_table, table, old, new), says
    yield ".csv: decimal commas between commas", "TEXT", partial(_table, "_nodes", ".", ","), "wrong number of fields"
    yield ".csv: only delimiters", "TEXT", _only_delimiters, "nothing but marks between fields"
    yield ".csv: zero bytes", "TEXT", partial(_table, "_nodes", "\n", "\0\n"), "is not a text file"


def _put(path, text, encoding="utf-8"):
    path.parent.mkdir(exist_ok=True)
    path.write_bytes(text.encode(encoding))
    return path


def _edited(suffix, good, old, new, folder):
    assert old in good
    _put(folder / "whole" / f"a{suffix}", good or new.lstrip("\ufeff"))
    (folder / "sub").mkdir()
    _put(
        folder / "sub" / "circle.txt",
        {".inp": "*INCLUDE, INPUT=a.inp\n", ".bdf": "INCLUDE 'a.bdf'\n"}.get(suffix, ""),
    )
    _put(folder / "binary.txt", "\0\0\0")
    return _put(folder / f"a{suffix}", good.replace(old, new, 1) if good else new)


def _encoded(suffix, good, encoding, folder):
    _put(folder / "whole" / f"a{suffix}", good)
    return _put(folder / f"a{suffix}", good, encoding)


def _renamed(suffix, good, folder):
    _put(folder / "whole" / f"a{suffix}", good)
    (folder / "größe 1 мода").mkdir()
    return _put(folder / "größe 1 мода" / f"ä б{suffix}", good)


def _content(suffix, content, folder):
    (folder / f"a{suffix}").write_bytes(content if isinstance(content, bytes) else content.encode())
    return folder / f"a{suffix}"


def _table(tail, old, new, folder):
    mesh = make_mesh()
    for path in (folder / "whole" / "a.csv", folder / "a.csv"):
        write_interchange(path, mesh, make_modes(mesh))
    target = folder / f"a{tail}.csv"
    text = target.read_text()
    assert old in text
    target.write_text(text.replace(old, new))
    return folder / "a.csv"


def _only_delimiters(folder):
    """Found by fuzzing."""
    return _put(folder / "a_nodes.csv", ";;\n ; ;\n")


# --- XDMF ---

_POINTS = '<DataItem Dimensions="4 3" Precision="8">0 0 0 1 0 0 0 1 0 0 0 1</DataItem>'
_U = '<Attribute Name="u" Center="Node" AttributeType="Vector">' + _POINTS + "</Attribute>"
XDMF = f"""<?xml version="1.0"?>
<Xdmf Version="3.0"><Domain><Grid Name="m"><Topology TopologyType="Tetrahedron" NumberOfElements="1">
<DataItem NumberType="Int" Dimensions="1 4">0 1 2 3</DataItem></Topology>
<Geometry GeometryType="XYZ">{_POINTS}</Geometry>
<Set Name="s" SetType="Node"><DataItem NumberType="Int" Dimensions="2">0 3</DataItem></Set></Grid>
<Grid Name="t" GridType="Collection" CollectionType="Temporal"><Grid Name="one"><Time Value="3.5"/>{_U}</Grid>
<Grid Name="two"><Time Value="3.5"/>{_U}</Grid></Grid></Domain></Xdmf>
"""
_CELLS = ">0 1 2 3<"
_INCLUDE = '<xi:include xmlns:xi="http://www.w3.org/2001/XInclude" '
BAD_XDMF = {
    "index -1": ("INDEX", _CELLS, ">0 -1 2 3<", "found: index -1; expected: 0 to 3"),
    "index n": ("INDEX", _CELLS, ">0 4 2 3<", "found: index 4; expected: 0 to 3"),
    "index 2**40 in 64 bits": (
        "INDEX",
        'Int" Dimensions="1 4">0 1 2 3<',
        'Int" Precision="8" Dimensions="1 4">0 1 2 1099511627776<',
        "found: index 1099511627776",
    ),
    "index beyond its type": ("INDEX", _CELLS, ">0 1 2 1099511627776<", "Topology: .*no number"),
    "set outside": ("INDEX", ">0 3<", ">0 4<", "Set 's': a set reaches outside"),
    "one number too few": ("SHAPE", _CELLS, ">0 1 2<", "Topology: .*found: 3 numbers; expected: 4"),
    "one point too few": ("INDEX", '4 3" Precision="8">0 0 0', '3 3" Precision="8">', "reaches outside|index 3"),
    "two coordinates": ("SHAPE", "XYZ", "XY", "points have a wrong shape"),
    "nodes per cell": ("SHAPE", "Tetrahedron", "Triangle", "wrong number of nodes per cell"),
    "claims 2e9": ("COUNT", "1 4", "2000000000 4", "found: 4 numbers; expected: 8000000000"),
    "claims 10**15": ("COUNT", "1 4", "999999999999999 4", "found: 4 numbers"),
    "claims beyond counting": ("COUNT", "1 4", "9" * 40, "Dimensions are not numbers"),
    "no dimensions": ("SHAPE", ' Dimensions="1 4"', "", "Dimensions are not numbers"),
    "mixed, cell ends early": ("SHAPE", 'Tetrahedron"', 'Mixed"', "cell is of a kind that is not read|ends early"),
    "mixed, unknown number": ("SHAPE", 'Tetrahedron" NumberOfElements="1"', 'Mixed"', "not read; found: type 0"),
    "not a number": ("NUMBER", "0 0 0 1<", "0 0 nan 1<", "point 4: a coordinate is not finite"),
    "infinite shape": (
        "NUMBER",
        f'3.5"/>{_U}</Grid>\n',
        '3.5"/>' + _U.replace("0 1<", "0 inf<") + "</Grid>\n",
        "mode 1",
    ),
    "word": ("NUMBER", "0 0 0 1<", "0 0 x 1<", "Geometry: .*no number"),
    "digit groups": ("NUMBER", "0 0 0 1<", "0 0 0 1_0<", "Geometry: .*no number"),
    "decimal commas": ("TEXT", "0 0 0 1<", "0 0 0 1,5<", "Geometry: .*no number"),
    "a word without end": ("BOMB", "0 0 0 1<", "0 0 0 1" + "0" * 100_000 + "<", "a word of 100001 letters"),
    "unknown precision": ("SHAPE", 'Precision="8"', 'Precision="16"', "unknown type of number"),
    "unknown item": (
        "MEANING",
        "<DataItem NumberType",
        '<DataItem ItemType="Function" NumberType',
        "found: Function",
    ),
    "unknown format": ("SHAPE", "<DataItem NumberType", '<DataItem Format="TIFF" NumberType', "unknown format"),
    "unknown topology": ("MEANING", "Tetrahedron", "Hexahedron_64", "not read; found: hexahedron_64"),
    "structured": ("MEANING", "Tetrahedron", "3DSMesh", "not read; found: 3dsmesh"),
    "unknown geometry": ("MEANING", "XYZ", "ORIGIN_DXDYDZ", "not read; found: ORIGIN_DXDYDZ"),
    "own order of nodes": ("MEANING", 'Tetrahedron"', 'Tetrahedron" Order="3 2 1 0"', "a topology is not understood"),
    "spatial collection": ("MEANING", 'CollectionType="Temporal"', "", "found: collection  of 2 grids"),
    "two meshes": (
        "MEANING",
        '<Grid Name="t"',
        '<Grid Name="n"/><Grid Name="t"',
        "holds several grids; found: t, m, n",
    ),
    "no grid": ("SHAPE", "Domain>", "Dom>", "not a complete XML file"),
    "no geometry": ("SHAPE", '<Geometry GeometryType="XYZ">', '<Geometry GeometryType="XYZ"/><g>', "complete XML"),
    "no step": (
        "MODES",
        f'<Grid Name="one"><Time Value="3.5"/>{_U}</Grid>\n<Grid Name="two"><Time Value="3.5"/>{_U}</Grid>',
        "",
        "holds no step",
    ),
    "step without the shape": ("MODES", f"{_U}</Grid>\n", "</Grid>\n", "step 1: holds no vector array|step 1"),
    "steps of other nodes": (
        "MODES",
        f"{_U}</Grid>\n",
        _U.replace("4 3", "3 3").replace("0 0 0 1 ", "0 ", 1) + "</Grid>\n",
        "step 1",
    ),
    "time is a word": ("MODES", 'Value="3.5"', 'Value="soon"', "frequency or time is no number; found: 'soon'"),
    "frequencies in one step": ("MODES", "<Time", '<Information Name="freq_hz" Value="7"/><Time', "some have none"),
    "entity bomb": (
        "BOMB",
        '<?xml version="1.0"?>',
        '<!DOCTYPE x [<!ENTITY a "aaaa"><!ENTITY b "&a;&a;&a;&a;">]>',
        "declares a document type or entities",
    ),
    "entity of a file": (
        "REFERENCE",
        '<?xml version="1.0"?>',
        '<!DOCTYPE x SYSTEM "file:///etc/hostname">',
        "document",
    ),
    "deep nesting": ("BOMB", "<Geometry", "<a>" * 5000 + "</a>" * 5000 + "<Geometry", "nested too deeply"),
    "not closed": ("TEXT", "</Domain>", "", "line 7: is not a complete XML file"),
    "HDF5 above the folder": (
        "REFERENCE",
        '<DataItem NumberType="Int" Dimensions="1 4">0 1 2 3<',
        '<DataItem Format="HDF" Dimensions="1 4">../secret.h5:/data<',
        r"refers to a file outside its folder; found: \.\./secret\.h5",
    ),
    "HDF5 anywhere": (
        "REFERENCE",
        '<DataItem NumberType="Int" Dimensions="1 4">0 1 2 3<',
        '<DataItem Format="HDF" Dimensions="1 4">/etc/secret.h5:/data<',
        r"refers to a file outside its folder; found: /etc/secret\.h5",
    ),
    "HDF5 missing": (
        "REFERENCE",
        '<DataItem NumberType="Int" Dimensions="1 4">0 1 2 3<',
        '<DataItem Format="HDF" Dimensions="1 4">b.h5:/data<',
        r"refers to a file that does not exist; found: b\.h5",
    ),
    "HDF5 that is none": (
        "REFERENCE",
        '<DataItem NumberType="Int" Dimensions="1 4">0 1 2 3<',
        '<DataItem Format="HDF" Dimensions="1 4">binary.txt:/data<',
        r"binary\.txt: the file is damaged or no HDF5 file",
    ),
    "bytes beyond the end": (
        "REFERENCE",
        '<DataItem NumberType="Int" Dimensions="1 4">0 1 2 3<',
        '<DataItem NumberType="Int" Format="Binary" Dimensions="1 4">binary.txt<',
        r"the file ends inside an array; found: 3 bytes; expected: at least 16",
    ),
    "includes another file": ("REFERENCE", "<Geometry", f'{_INCLUDE}href="b.xdmf"/><G', "complete XML"),
    "mesh of another file": (
        "REFERENCE",
        '<Geometry GeometryType="XYZ">' + _POINTS + "</Geometry>",
        f'{_INCLUDE}href="../b.xdmf"/>',
        r"includes another file; found: \.\./b\.xdmf",
    ),
    "include not understood": (
        "REFERENCE",
        '<Geometry GeometryType="XYZ">' + _POINTS + "</Geometry>",
        f'{_INCLUDE}xpointer="xpointer(//Grid[3])"/>',
        "an include is not understood",
    ),
    "reference in a circle": (
        "REFERENCE",
        _POINTS,
        '<DataItem Reference="/Xdmf/Domain/Grid/Geometry/DataItem"/>',
        "references go round in a circle",
    ),
    "reference to nothing": (
        "REFERENCE",
        _POINTS,
        '<DataItem Reference="/Xdmf/Domain/DataItem[7]"/>',
        "leads nowhere",
    ),
    "reference that is no path": ("REFERENCE", _POINTS, '<DataItem Reference="/Xdmf/[[["/>', "leads nowhere"),
}

# --- decks ---

INP = """*NODE
1, 0., 0., 0.
2, 1., 0., 0.
3, 0., 1., 0.
4, 0., 0., 1.
*ELEMENT, TYPE=C3D4, ELSET=body
7, 1, 2, 3, 4
*NSET, NSET=root
1, 2
"""
BAD_INP = {
    "node that is not there": ("INDEX", "2, 3, 4", "2, 3, 9", "line 7: .*node that does not exist; found: node 9"),
    "node -1": ("INDEX", "2, 3, 4", "2, 3, -1", "line 7: an id is no whole number; found: '-1'"),
    "node 2**40": ("INDEX", "2, 3, 4", "2, 3, 1099511627776", "found: node 1099511627776"),
    "too many nodes": ("SHAPE", "2, 3, 4", "2, 3, 4, 4", "too many nodes; found: 5; expected: 4"),
    "too few nodes": ("SHAPE", "2, 3, 4", "2, 3", "line 7: an element has too few nodes; found: 3"),
    "not a number": ("NUMBER", "0., 1.\n", "0., nan\n", "point 4: a coordinate is not finite"),
    "word": ("NUMBER", "0., 1.\n", "0., x\n", "line 5: a coordinate is no number"),
    "decimal commas": ("TEXT", "4, 0., 0., 1.", "4, 0,5, 0,5, 1,5, 0, 0", "line 5: a node is not understood"),
    "node twice": ("IDS", "3, 0., 1., 0.", "2, 0., 1., 0.", "line 4: node ids repeat; found: node 2"),
    "element twice": ("IDS", "7, 1, 2, 3, 4", "7, 1, 2, 3, 4\n7, 1, 2, 3, 4", "line 8: element ids repeat"),
    "id is no number": ("IDS", "3, 0., 1., 0.", "3.5, 0., 1., 0.", "line 4: a node id is no whole number"),
    "axisymmetric": ("MEANING", "C3D4", "CAX4", "element type is not understood; found: TYPE=CAX4"),
    "no type": ("MEANING", "TYPE=C3D4, ", "", "element type is not understood"),
    "local system": ("MEANING", "*NODE", "*SYSTEM\n1,0,0\n*NODE", r"line 1: .*found: \*SYSTEM"),
    "cylindrical": ("MEANING", "*NODE", "*NODE, SYSTEM=C", r"found: \*NODE, SYSTEM=C"),
    "made nodes": ("MEANING", "*NSET", "*NGEN\n1,3,1\n*NSET", r"line 8: .*found: \*NGEN"),
    "moved part": ("MEANING", "*NODE", "*INSTANCE, NAME=a\n1., 0., 0.\n*NODE", "line 2: a part is moved or turned"),
    "two parts": ("MEANING", "*NODE", "*PART, NAME=a\n*PART, NAME=b\n*NODE", "line 2: holds several parts"),
    "set of nothing": ("IDS", "1, 2\n", "elsewhere\n", "'root' names a set that does not exist; found: elsewhere"),
    "set without name": ("SHAPE", "NSET=root", "UNSORTED", "line 8: a set has no name"),
    "generated backwards": ("SHAPE", "=root\n1, 2", "=root, GENERATE\n1, 5, 0", "generated set is not understood"),
    "include above the folder": (
        "REFERENCE",
        "*NSET",
        "*INCLUDE, INPUT=../b.inp\n*NSET",
        "line 8: .*outside the folder",
    ),
    "include anywhere": (
        "REFERENCE",
        "*NSET",
        "*INCLUDE, INPUT=/etc/hostname\n*NSET",
        "line 8: .*outside the folder",
    ),
    "include of nothing": (
        "REFERENCE",
        "*NSET",
        "*INCLUDE, INPUT=b.inp\n*NSET",
        "includes a file that does not exist",
    ),
    "include of itself": ("REFERENCE", "*NSET", "*INCLUDE, INPUT=a.inp\n*NSET", "go round in a circle"),
    "include in a circle": ("REFERENCE", "*NSET", "*INCLUDE, INPUT=sub/circle.txt\n*NSET", "go round in a circle"),
    "include of bytes": (
        "REFERENCE",
        "*NSET",
        "*INCLUDE, INPUT=binary.txt\n*NSET",
        "binary.txt: is not a plain text file",
    ),
    "no nodes": ("SHAPE", "*NODE", "*NOD", "holds no nodes|does not exist"),
}
BDF = """BEGIN BULK
GRID           1              0.      0.      0.
GRID           2              1.      0.      0.
GRID,3,,0.,1.,0.
GRID           4              0.      0.      1.
CTETRA         7       1       1       2       3       4
ENDDATA
"""
BAD_BDF = {
    "node that is not there": ("INDEX", "3       4\n", "3       9\n", "line 6: .*found: node 9 in element 7"),
    "node -1": ("INDEX", "3       4\n", "3      -1\n", "line 6: a node id is no whole number; found: '-1'"),
    "too few nodes": ("SHAPE", "3       4\n", "3\n", "line 6: an element has too few nodes; found: 3 in CTETRA 7"),
    "half of the mid-side nodes": (
        "MEANING",
        "3       4\n",
        "3       4       1\n",
        "some mid-side nodes are missing",
    ),
    "not a number": ("NUMBER", "0.      1.\n", "0.     nan\n", "point 4: a coordinate is not finite"),
    "word": ("NUMBER", "0.      1.\n", "0.       x\n", "line 5: a coordinate is no number"),
    "decimal commas": (
        "TEXT",
        "GRID,3,,0.,1.,0.",
        "GRID,3,,0,5,1,5,0,5",
        "line 4: a coordinate is no number; found: '0'",
    ),
    "columns that slipped": ("TEXT", "1.      0.      0.", "1. 0. 0.", "fields do not stand in columns of 8 or 16"),
    "tabs": ("TEXT", "GRID           4", "GRID\t4\t", "line 5: holds a tab"),
    "node twice": ("IDS", "GRID,3", "GRID,2", "line 4: node ids repeat; found: node 2"),
    "local system": ("MEANING", "GRID,3,,", "GRID,3,17,", "line 4: .*local system of coordinates.*GRID in system 17"),
    "local system for all": ("MEANING", "GRID,3", "GRDSET,,9\nGRID,3", "line 4: .*GRDSET in system 9"),
    "superelements": ("MEANING", "CTETRA", "BEGIN SUPER=1\nCTETRA", "several bulk sections"),
    "axisymmetric": ("MEANING", "CTETRA ", "CTRIAX6,1,1,1,2,3\nCTETRA ", "found: CTRIAX6"),
    "no end": ("CUT", "ENDDATA\n", "", "ends without ENDDATA"),
    "continuation of nothing": ("SHAPE", "BEGIN BULK\n", "BEGIN BULK\n        1\n", "a continuation follows nothing"),
    "include above the folder": ("REFERENCE", "CTETRA", "INCLUDE '../b.bdf'\nCTETRA", "line 6: .*outside the folder"),
    "include in a circle": ("REFERENCE", "CTETRA", "INCLUDE 'sub/circle.txt'\nCTETRA", "go round in a circle"),
    "no nodes": ("SHAPE", BDF, "BEGIN BULK\nENDDATA\n", "holds no nodes"),
}
OBJ = "v 0 0 0\nv 1 0 0\nv 1 1 0\nv 0 1 0\nf 1 2 3 4\n"
BAD_OBJ = {
    "index n": ("INDEX", "3 4\n", "3 5\n", "line 5: a face names a point that does not exist; found: 5"),
    "index 0": ("INDEX", "3 4\n", "3 0\n", "line 5: .*found: 0; expected: 1 to 4"),
    "index -5": ("INDEX", "3 4\n", "3 -5\n", "line 5: .*found: -5"),
    "index 2**40": ("INDEX", "3 4\n", "3 1099511627776\n", "found: 1099511627776"),
    "corner is a word": ("NUMBER", "3 4\n", "3 x\n", "line 5: a corner of a face is no number"),
    "not a number": ("NUMBER", "v 0 1 0", "v 0 nan 0", "point 4: a coordinate is not finite"),
    "decimal commas": ("TEXT", "v 0 1 0", "v 0 1,5 0", "line 4: is no point"),
    "two corners": ("SHAPE", " 3 4\n", "\n", "line 5: a face has too few corners; found: 2"),
    "no face": ("SHAPE", "f 1 2 3 4\n", "", "holds no faces"),
    "free form": ("MEANING", "f 1", "curv 0 1 1 2\nf 1", "free-form curves"),
}

# --- tables ---

TABLES = {
    "index that is not there": ("INDEX", "_elements", ",153,", ",999,", "names a node that does not exist"),
    "node twice": (
        "IDS",
        "_nodes",
        "3,0.35",
        "3,0.35,0.05,0.05,0,1\n3,0.35",
        "node ids repeat|wrong number of fields",
    ),
    "no kind": ("SHAPE", "_elements", "hex8", "hex9", "unknown kind of cell 'hex9'"),
    "brackets": ("TEXT", "_nodes", "node,", '"node,', "cannot be taken apart|missing"),
    "not a number": ("NUMBER", "_nodes", "0.05", "nan", "a coordinate is not finite"),
    "word": ("NUMBER", "_nodes", "0.05", "here", "column 'x' holds no number"),
    "frequencies of nothing": ("MODES", "_frequencies", "\n1,", "\n9,", "frequenc|mode"),
    "node of another mesh": ("MODES", "", ",153,", ",159,", "not those of this mesh|node"),
}

# --- what libraries read ---

_VTK = "# vtk DataFile Version 3.0\nx\nASCII\nDATASET UNSTRUCTURED_GRID\n"
_THREE = "POINTS 3 float\n0 0 0 1 0 0 0 1 0\n"
_PLY = "ply\nformat {}\nelement vertex {}\nproperty float x\nproperty float y\nproperty float z\nelement face 1\n" + (
    "property list uchar int vertex_indices\nend_header\n"
)
FOREIGN = {
    "points -1": (".vtk", "COUNT", _VTK + "POINTS -1 float\n", r"POINTS: declares more .* can hold; found: -1"),
    "points 2e9": (
        ".vtk",
        "COUNT",
        _VTK + "POINTS 2000000000 float\n0 0 0\n",
        r"declares more than the file can hold",
    ),
    "points missing": (
        ".vtk",
        "CUT",
        _VTK + "POINTS 4 float\n0 0 0 1\n",
        r"reports an error|no mesh|not the one decl",
    ),
    "index n": (
        ".vtk",
        "INDEX",
        _VTK + _THREE + "CELLS 1 4\n3 0 1 7\nCELL_TYPES 1\n5\n",
        r"index 7; expected: 0 to 2",
    ),
    "index -1": (".vtk", "INDEX", _VTK + _THREE + "CELLS 1 4\n3 0 1 -1\nCELL_TYPES 1\n5\n", r"index -1; exp"),
    "not legacy": (".vtk", "SUFFIX", "hello", r"is no legacy VTK file"),
    "given up": (".msh", "SUFFIX", "hello\n", r"cannot be read; found: meshio gave the file up"),
    "nodes missing": (".msh", "CUT", "$MeshFormat\n2.2 0 8\n$EndMeshFormat\n$Nodes\n4\n1 0 0 0\n", r"cannot be read"),
    "view cut": (".msh", "CUT", '$MeshFormat\n2.2 0 8\n$EndMeshFormat\n$NodeData\n1\n"a"\n', r"section does not end"),
    "entities": (".xml", "BOMB", '<!DOCTYPE a [<!ENTITY b "c">]><a>&b;</a>', r"declares a document type or entities"),
    "entities through VTK": (".vtp", "BOMB", '<!DOCTYPE a [<!ENTITY b "c">]><a>&b;</a>', r"declares a document type"),
    "triangles 2e9": (".stl", "COUNT", b"\0" * 80 + (2_000_000_000).to_bytes(4, "little"), r"triangles does not fit"),
    "facet not closed": (
        ".stl",
        "CUT",
        "solid a\nfacet normal 0 0 1\nouter loop\nvertex 0 0 0\n",
        r"is not complete",
    ),
    "points 2e9 ": (".ply", "COUNT", _PLY.format("binary_little_endian 1.0", 2_000_000_000), r"declares more"),
    "text 2e9": (".ply", "COUNT", _PLY.format("ascii 1.0", 2_000_000_000), r"declares more"),
    "no end of header": (".ply", "CUT", "ply\nformat ascii 1.0\nelement vertex 3\n", r"has no complete header"),
    "property unknown": (
        ".ply",
        "SHAPE",
        _PLY.format("ascii 1.0", 3).replace("float x", "half x"),
        r"not understood",
    ),
    "points missing ": (
        ".ply",
        "CUT",
        _PLY.format("binary_little_endian 1.0", 3).encode() + bytes(30),
        r"ends early",
    ),
    "index outside": (
        ".ply",
        "INDEX",
        _PLY.format("binary_little_endian 1.0", 3).encode()
        + np.eye(3, dtype="<f4").tobytes()
        + b"\3"
        + np.array([0, 1, 9], "<i4").tobytes(),
        r"reports an error|broke down|does not exist|not the one declared",
    ),
    "no HDF5": (".med", "SUFFIX", "MED?", r"its content is not what its suffix says"),
    "garbage": (".mesh", "SUFFIX", "\0\1\2", r"cannot be read"),
    "old container": (
        ".cgns",
        "MEANING",
        b"@(#)ADF Database Version B02012>" + bytes(1000),
        r"container that is not read",
    ),
}
