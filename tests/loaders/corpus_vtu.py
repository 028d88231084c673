"""Bad ``.vtu`` files: one text edit each of a file written by hand. (old, new, message) by name."""

import base64
import re
import zlib

import numpy as np

from tests.loaders.samples import make_mesh
from viewer.loaders import write_interchange

VTU = """<?xml version="1.0"?>
<VTKFile type="UnstructuredGrid" version="0.1" byte_order="LittleEndian">
<UnstructuredGrid><FieldData><DataArray type="Float64" Name="freq_hz" NumberOfTuples="1" format="ascii">5</DataArray>
</FieldData><Piece NumberOfPoints="4" NumberOfCells="2">
<PointData><DataArray type="Float64" Name="mode_001" NumberOfComponents="3" format="ascii">
1 0 0 0 1 0 0 0 1 1 1 1</DataArray><DataArray type="Int64" Name="node_id" format="ascii">4 3 2 1</DataArray>
</PointData>
<CellData/>
<Points><DataArray type="Float64" NumberOfComponents="3" format="ascii">0 0 0 1 0 0 0 1 0 1 1 0</DataArray></Points>
<Cells><DataArray type="Int64" Name="connectivity" format="ascii">0 1 2 1 3 2</DataArray>
<DataArray type="Int64" Name="offsets" format="ascii">3 6</DataArray>
<DataArray type="UInt8" Name="types" format="ascii">5 5</DataArray></Cells>
</Piece></UnstructuredGrid></VTKFile>
"""


BAD_VTU = {
    "index minus one": (
        "0 1 2 1 3 2",
        "0 -1 2 1 3 2",
        r"names a point that does not exist; found: index -1; expected: 0 to 3",
    ),
    "index n": ("0 1 2 1 3 2", "0 1 4 1 3 2", r"cell 1: a cell names a point that does not exist; found: index 4"),
    "index 2**40": ("0 1 2 1 3 2", f"0 1 2 1 3 {2**40}", r"cell 2: .*found: index 1099511627776"),
    "index too large for its type": ("0 1 2 1 3 2", f"0 1 2 1 3 {2**70}", r"connectivity.*no number"),
    "offsets fall": ("3 6</DataArray>", "6 3</DataArray>", r"offsets, cell 2.*do not grow; found: 3 after 6"),
    "offsets too few": (
        "3 6</DataArray>",
        "3</DataArray>",
        r"'offsets': an array's size.*found: 1 numbers; expected: 2",
    ),
    "wrong count for its type": (">5 5<", ">5 9<", r"cell 2: a cell of kind quad4 has a wrong number of nodes"),
    "types unknown": (">5 5<", ">99 99<", r"holds no cell of a known kind"),
    "claims 2e9 points": (
        'NumberOfPoints="4"',
        'NumberOfPoints="2000000000"',
        r"'Points': an array's size.*6000000000",
    ),
    "claims 2e9 cells": ('NumberOfCells="2"', 'NumberOfCells="2000000000"', r"'types': an array's size.*2000000000"),
    "one point too few": ('NumberOfPoints="4"', 'NumberOfPoints="3"', r"'Points': .*found: 12 numbers; expected: 9"),
    "points minus one": (
        'NumberOfPoints="4"',
        'NumberOfPoints="-1"',
        r"Piece: NumberOfPoints is not a number; found: '-1'",
    ),
    "not a number": (
        "0 1 0 1 1 0</DataArray></Points>",
        "0 1 0 1 nan 0</DataArray></Points>",
        r"point 4: a coordinate is not finite",
    ),
    "beyond reason": (
        "0 1 0 1 1 0</DataArray></Points>",
        "0 1 0 1 1e300 0</DataArray></Points>",
        r"point 4: a coordinate is beyond reason",
    ),
    "infinite shape": ("1 1 1</DataArray><", "1 1 inf</DataArray><", r"mode 1, row 4.*not finite"),
    "negative frequency": (">5</DataArray>", ">-5</DataArray>", r"freq_hz 1: a frequency is negative"),
    "word for a number": (
        "0 1 0 1 1 0</DataArray></Points>",
        "0 1 0 1 x 0</DataArray></Points>",
        r"'Points': .*no number",
    ),
    "decimal commas": (
        "0 1 0 1 1 0</DataArray></Points>",
        "0 1 0 1 1,5 0</DataArray></Points>",
        r"'Points': .*no number",
    ),
    "ids repeat": ("4 3 2 1", "4 3 3 1", r"node ids repeat; found: node 3 more than once"),
    "ids broken": (
        '"Int64" Name="node_id" format="ascii">4 3 2 1',
        '"Float64" Name="node_id" format="ascii">4 3 2.5 1',
        r"node ids are not whole numbers",
    ),
    "two components": (
        'Name="mode_001" NumberOfComponents="3" format="ascii">\n1 0 0 0 1 0 0 0 1 1 1 1',
        'Name="mode_001" NumberOfComponents="2" format="ascii">\n1 0 0 0 1 0 0 0',
        r"needs three components",
    ),
    "mode missing": ("mode_001", "mode_002", r"a mode shape is missing.*expected: array 'mode_001'"),
    "modes from zero": (
        "mode_001",
        "mode_000",
        r"a mode shape is missing.*expected: array 'mode_001'; modes count from 001",
    ),
    "mode number beyond reason": (
        "mode_001",
        "mode_999999999",
        r"a mode shape is missing.*expected: array 'mode_001'",
    ),
    "imaginary part missing": ("mode_001", "mode_001_re", r"do not belong together"),
    "rotations alone": ("mode_001", "mode_001_rot", r"do not belong together"),
    "no frequencies": ("freq_hz", "hertz", r"frequencies of the modes are missing"),
    "no connectivity": ("connectivity", "connections", r"Cells: array 'connectivity' is missing"),
    "no points": ("<Points>", "<Pints>", r"not a complete XML file"),
    "array twice": ('Name="offsets"', 'Name="types"', r"an array is given twice"),
    "other grid": ('type="UnstructuredGrid"', 'type="ImageData"', r"is not an unstructured grid"),
    "unknown format": (
        'Name="offsets" format="ascii"',
        'Name="offsets" format="morse"',
        r"unknown format; found: morse",
    ),
    "entity bomb": (
        '<?xml version="1.0"?>',
        '<?xml version="1.0"?><!DOCTYPE x [<!ENTITY a "aaaa"><!ENTITY b "&a;&a;&a;&a;">]>',
        r"declares a document type or entities",
    ),
    "file outside": (
        '<?xml version="1.0"?>',
        '<!DOCTYPE x SYSTEM "file:///etc/hostname">',
        r"declares a document type",
    ),
    "not XML": ("<VTKFile", "VTKFile", r"not a complete XML file"),
    "no piece": ('<Piece NumberOfPoints="4" NumberOfCells="2">', "", r"not a complete XML file"),
    "bad header type": ('byte_order="LittleEndian"', 'header_type="UInt16"', r"unknown header_type; found: UInt16"),
    "bad base64": ('format="ascii">3 6<', 'format="binary">@@@@<', r"base64 text is damaged"),
    "short base64": ('format="ascii">3 6<', 'format="binary">AAAA<', r"'offsets': an array's size"),
    "nothing appended": (
        'Name="offsets" format="ascii">3 6<',
        'Name="offsets" format="appended" offset="0"><',
        r"base64|ends before an array|size does not fit",
    ),
    "groups too long": (
        "<CellData/>",
        '<CellData><DataArray type="Int8" Name="group_a" format="ascii">1 0 1</DataArray></CellData>',
        r"'group_a': .*found: 3 numbers; expected: 2",
    ),
    "deep nesting": ("<CellData/>", "<a>" * 50 + "</a>" * 50, r"nested too deeply"),
}
FAULTS = {
    **dict.fromkeys(("index minus one", "index n", "index 2**40", "index too large for its type"), "INDEX"),
    **dict.fromkeys(
        (
            "offsets fall",
            "offsets too few",
            "wrong count for its type",
            "types unknown",
            "one point too few",
            "two components",
            "no connectivity",
            "no points",
            "array twice",
            "other grid",
            "unknown format",
            "not XML",
            "no piece",
            "bad header type",
            "bad base64",
            "short base64",
            "nothing appended",
            "groups too long",
            "deep nesting",
        ),
        "SHAPE",
    ),
    **dict.fromkeys(("claims 2e9 points", "claims 2e9 cells", "points minus one"), "COUNT"),
    **dict.fromkeys(("not a number", "beyond reason", "infinite shape", "word for a number"), "NUMBER"),
    "decimal commas": "TEXT",
    **dict.fromkeys(("ids repeat", "ids broken"), "IDS"),
    **dict.fromkeys(
        (
            "negative frequency",
            "mode missing",
            "modes from zero",
            "mode number beyond reason",
            "imaginary part missing",
            "rotations alone",
            "no frequencies",
        ),
        "MODES",
    ),
    "entity bomb": "BOMB",
    "file outside": "REFERENCE",
}


def _bomb(folder):
    """A zlib block of 4 GB of zeros declared in a few kilobytes."""
    packed = zlib.compress(bytes(1000))
    count = 178_956_970  # points; × 24 bytes = 4 GB
    head = base64.b64encode(np.array([1, count * 24, 0, len(packed)], "<u4").tobytes())
    text = (
        VTU.replace('NumberOfPoints="4"', f'NumberOfPoints="{count}"')
        .replace('byte_order="LittleEndian"', 'byte_order="LittleEndian" compressor="vtkZLibDataCompressor"')
        .replace(
            'NumberOfComponents="3" format="ascii">0 0 0 1 0 0 0 1 0 1 1 0',
            f'NumberOfComponents="3" format="binary">{(head + base64.b64encode(packed)).decode()}',
        )
    )
    (folder / "a.vtu").write_text(text)
    return folder / "a.vtu"


def _block(claim):
    """The size in front of the raw bytes of the points says something else."""

    def make(folder):
        path = write_interchange(folder / "a.vtu", make_mesh())
        data = path.read_bytes()
        offset = int(re.search(rb'Name="Points"[^/]*offset="(\d+)"', data)[1])
        at = data.index(b"_", data.index(b"<AppendedData")) + 1 + offset
        path.write_bytes(data[:at] + claim.to_bytes(8, "little") + data[at + 8 :])
        return path

    return make


def _other_mesh(folder):
    """Shapes on other nodes than those of the mesh they are read for."""
    (folder / "whole").mkdir()
    (folder / "whole" / "a.vtu").write_text(VTU.replace("4 3 2 1</DataArray>", "4 3 2 7</DataArray>"))
    (folder / "a.vtu").write_text(VTU)
    return folder / "a.vtu"


def _unknown_kinds_with_ids(folder):
    """Found by fuzzing: ids of cells of which none is kept."""
    ids = '<CellData><DataArray type="Int64" Name="elem_id" format="ascii">1 2</DataArray></CellData>'
    (folder / "a.vtu").write_text(VTU.replace("<CellData/>", ids).replace(">5 5<", ">99 99<"))
    return folder / "a.vtu"


MADE = (
    ("types unknown, with ids", "SHAPE", _unknown_kinds_with_ids, r"holds no cell of a known kind"),
    ("inflation bomb", "BOMB", _bomb, r"declares more than its compressed bytes can hold"),
    ("raw block of 2e9 bytes", "COUNT", _block(2_000_000_000), r"'Points': an array's size.*found: 2000000000 bytes"),
    ("raw block a byte short", "SHAPE", _block(383), r"'Points': an array's size.*found: 383 bytes; expected: 384"),
    ("modes of another mesh", "MODES", _other_mesh, r"not those of this mesh.*\(7\).*\(1\)"),
)
