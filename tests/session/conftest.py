"""A project of which all is known, found out once."""

from __future__ import annotations

import pytest

from tests.session_parts import answer_all, write_strip
from viewer.session import State
from viewer.session.loading import open_project


@pytest.fixture(scope="session")
def folder(tmp_path_factory):
    return write_strip(tmp_path_factory.mktemp("strip")).parent


@pytest.fixture(scope="session")
def known(folder):
    """The project, and the kinds of questions in the order in which they were asked."""
    return answer_all(open_project(folder), State(design="thin"))


@pytest.fixture
def project(known):
    return known[0]


@pytest.fixture
def state():
    return State(design="thin")
