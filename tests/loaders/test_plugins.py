"""Plug-ins: the documented example works, broken ones disturb nobody; installed by a folder on the path."""

import os
import re
import subprocess
import sys
import textwrap
from pathlib import Path

import pytest

from viewer.loaders import plugin_api

HERE = Path(__file__).parent
FILE = """node 7 0 0 0
node 5 1 0 0
node 9 0 1 0
tri 30 7 5 9
mode 12.5
u 9 0 0 1
u 5 0 0 2
u 7 0 0 3
"""


@pytest.fixture
def run(tmp_path):
    """Runs a script with the sample plug-ins installed; the reader is the example in the documentation itself."""
    example = re.search(r"::\n\n(    import numpy.*?)\n\nand in its", plugin_api.__doc__, re.S)[1]
    (tmp_path / "acme_readers.py").write_text(textwrap.dedent(example) + "\n")
    (tmp_path / "a.acme").write_text(FILE)

    def run(script, **more):
        path = os.pathsep.join(map(str, [tmp_path, HERE / "plugin_sample", HERE.parent.parent]))
        done = subprocess.run(
            [sys.executable, "-c", textwrap.dedent(script)],
            cwd=tmp_path,
            env={**os.environ, "PYTHONPATH": path, **more},
            capture_output=True,
            text=True,
        )
        assert done.returncode == 0, done.stderr
        return done.stdout

    return run


def test_the_documented_example(run):
    said = run("""
        from viewer.loaders import read_mesh, read_modes
        mesh = read_mesh("a.acme", length_unit=0.1)
        modes = read_modes("a.acme", mesh)
        print(mesh.node_ids.tolist(), mesh.cell_ids.tolist(), mesh.points.max(), mesh.blocks[0].kind)
        print(modes.freq_hz.tolist(), modes.shape(0)[:, 2].tolist())
    """)
    assert said.splitlines() == ["[7, 5, 9] [30] 0.1 tri3", "[12.5] [3.0, 2.0, 1.0]"]


def test_errors_of_the_example_are_clear(run, tmp_path):
    (tmp_path / "b.acme").write_text(FILE.replace("1 0 0", "1,5 0 0"))
    (tmp_path / "c.acme").write_text(FILE.replace("7 5 9", "7 5 8"))
    (tmp_path / "d.acme").write_text(FILE.replace("u 9", "u 8"))
    said = run("""
        from viewer.errors import LoadError
        from viewer.loaders import read_mesh, read_modes
        mesh = read_mesh("a.acme")
        for read in (lambda: read_mesh("b.acme"), lambda: read_mesh("c.acme"), lambda: read_modes("d.acme", mesh)):
            try:
                read()
            except LoadError as error:
                print(error)
    """).splitlines()
    assert said[0] == "b.acme, line 2: holds no number; found: node 5 1,5 0 0"
    assert said[1] == "c.acme: an element names a node that does not exist; found: node 8"
    assert said[2].startswith("d.acme: the mode shapes are not those of this mesh; found: 1 nodes only in the")


def test_broken_plug_ins_disturb_nobody(run):
    """Import that ends the process, no suffixes, a suffix that is none, a suffix taken: words, not failures."""
    said = run("""
        import numpy as np
        from viewer.errors import LoadError
        from viewer.loaders import read_mesh, read_modes
        from viewer.loaders.plugin_api import plug_ins
        print(sorted(plug_ins().by_suffix), len(plug_ins().faults))
        np.savez("a.npz", points=np.eye(3), cells_tri3=[[0, 1, 2]])
        print(read_mesh("a.npz").n_cells)
        for name in ("a.ends", "a.qqq"):
            open(name, "w").write("x")
            try:
                read_mesh(name)
            except LoadError as error:
                print(error)
        try:
            read_modes("a.ends", read_mesh("a.npz"))
        except LoadError as error:
            print(error)
    """).splitlines()
    assert said[0] == "['.acme', '.ends', '.vtu'] 4"
    assert said[1] == "1"
    assert said[2].startswith("a.ends: the plug-in 'ends_the_process' failed on this file; found: SystemExit: 3")
    assert "unknown format" in said[3]
    assert ".acme" in said[3]
    assert "plug-in 'broken_on_import' could not be loaded: SystemExit: a package that ends the process" in said[3]
    assert said[4].startswith("a.ends: the plug-in 'ends_the_process' gave something else than it should; ")
