"""File stems of designs in a review folder."""

from __future__ import annotations

import pytest

from viewer.export.file_names import slugs


@pytest.mark.parametrize(
    "names", [("x", "x-3", "X"), ("X", "x", "x-2", "X-2"), ("a b", "a-b", "a_b"), ("§", "design-1")]
)
def test_no_two_designs_share_a_stem(names):
    stems = slugs(names)
    assert set(stems) == set(names)
    assert len(set(stems.values())) == len(names)
