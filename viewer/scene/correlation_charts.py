"""A test against an analysis as flat charts: the field of MAC, each side with itself, the two ladders."""

from __future__ import annotations

from collections.abc import Sequence

from viewer.insight.hammer_pairing import ALIKE, TestCorrelation
from viewer.scene.chart_side import Side, of_analysis, of_test
from viewer.scene.ladder_chart import Rung, ladders
from viewer.scene.mac_chart import SCALE, field_chart
from viewer.scene.primitives import Sheet


def correlation_field(correlation: TestCorrelation, names: Sequence[str] = (), theme: str = "light") -> Sheet:
    """Test modes in rows against analysis modes in columns, pairs framed; ``names`` of the analysis modes."""
    test, analysis = _sides(correlation, names)
    pairs = correlation.paired
    framed = {(p.test - 1, p.analysis - 1) for p in pairs if p.test and p.analysis}
    alone = len(correlation.matrix) - len(pairs)
    said = f"{len(pairs)} of {len(correlation.matrix)} test modes paired"
    said += f", {alone} without counterpart" if alone else ""
    said += f" · compared at {int(correlation.used.sum())} channels"
    notes = (f"{SCALE}); framed: paired", said)
    return field_chart(
        correlation.matrix,
        test,
        analysis,
        framed,
        notes,
        f"test {correlation.test} against {correlation.design}",
        theme,
    )


def own_field(
    correlation: TestCorrelation, which: str = "analysis", names: Sequence[str] = (), theme: str = "light"
) -> Sheet:
    """The modes of one side, ``which`` "test" or "analysis", against one another at the channels used: what these
    points cannot tell apart is framed."""
    side = _sides(correlation, names)[which == "analysis"]
    matrix = correlation.analysis_auto if which == "analysis" else correlation.test_auto
    count = len(matrix)
    alike = [(i, j) for i in range(count) for j in range(count) if i != j and matrix[i, j] > ALIKE]
    pairs = ", ".join(f"{i + 1} and {j + 1}" for i, j in alike if i < j)
    said = f"these points cannot tell apart: modes {pairs}" if pairs else "these points tell all modes apart"
    notes = (f"{SCALE}); framed: above {ALIKE:g} beside the diagonal", said)
    return field_chart(
        matrix,
        side,
        side,
        alike,
        notes,
        f"modes of {correlation.design if which == 'analysis' else correlation.test} against one another",
        theme,
    )


def correlation_ladder(correlation: TestCorrelation, names: Sequence[str] = (), theme: str = "light") -> Sheet:
    """Frequencies measured and computed as two ladders, ribbons between the pairs."""
    test, analysis = _sides(correlation, names)
    rungs = [Rung(p.kind, p.test, p.analysis, p.test_hz, p.analysis_hz, p.agreement) for p in correlation.pairs]
    said = correlation.sentence.removesuffix(".")
    return ladders(
        rungs,
        test,
        analysis,
        said,
        f"test {correlation.test} against {correlation.design}: which mode is which",
        theme,
    )


def _sides(correlation: TestCorrelation, names: Sequence[str]) -> tuple[Side, Side]:
    test_hz = {p.test: p.test_hz or 0.0 for p in correlation.pairs if p.test}
    own_hz = {p.analysis: p.analysis_hz or 0.0 for p in correlation.pairs if p.analysis}
    return (
        of_test(correlation.test, [test_hz[k + 1] for k in range(len(test_hz))]),
        of_analysis(correlation.design, [own_hz[k + 1] for k in range(len(own_hz))], names),
    )
