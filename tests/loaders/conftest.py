"""One awkward mesh and a mode set on it."""

import pytest

from tests.loaders.samples import make_mesh, make_modes


@pytest.fixture
def mesh():
    return make_mesh()


@pytest.fixture
def modes(mesh):
    return make_modes(mesh)
