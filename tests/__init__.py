"""Tests: a package, so that tests.meshes and tests.checks can be imported from every folder."""
