"""Settings of every test run: one BLAS thread a worker, no cache of the user's touched, no screen needed."""

from __future__ import annotations

import os

# Set before numpy is first imported: two workers with two threads each would only wait for one another.
for _name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(_name, "1")

import pytest  # noqa: E402


@pytest.fixture(autouse=True)
def _own_cache(tmp_path_factory, monkeypatch):
    """Commands under test keep their cache in a folder of the test run."""
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path_factory.getbasetemp() / "cache"))
