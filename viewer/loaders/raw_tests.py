"""What readers of test files hand over, and the checks that all test sets pass."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from viewer.errors import LoadError
from viewer.model.arrays import Array
from viewer.model.testset import TestSet

LARGEST = 1e30  # of a shape's numbers; beyond it sums of squares are no numbers any more
LARGEST_COORDINATE = 1e9
# Outside of these nothing is wrong for certain, but most often a unit was mixed up. Common practice, no source.
_USUAL_SIZE, _USUAL_HZ, _USUAL_DAMPING = (0.01, 100.0), (0.1, 20_000.0), (0.0, 0.2)


@dataclass(eq=False)
class RawTest:
    """One run as a format found it, its arrays checked one by one: fields as of :class:`TestSet`, but points in the
    file's unit and modes in the file's order. ``length_unit``: metres to that unit if the file itself states it."""

    labels: list[str]
    points: Array
    lines: Array
    sensor: Array
    directions: Array
    freq_hz: Array
    shapes: Array
    damping: Array | None = None
    length_unit: float | None = None
    remarks: list[str] = field(default_factory=list)
    name: str = ""  # when it is not that of the file


def finish_test(raw: RawTest, path: Path, length_unit: float | None) -> TestSet:
    """Into metres, by frequency, with what is implausible remarked upon. Raises ``LoadError``."""
    remarks = list(raw.remarks)
    unit = _unit(raw.length_unit, length_unit, path, remarks)
    order = np.argsort(raw.freq_hz, kind="stable")
    damping = raw.damping if raw.damping is None or np.isfinite(raw.damping).any() else None
    shapes = raw.shapes[order]
    test = TestSet(
        raw.name or path.stem,
        tuple(raw.labels),
        raw.points * unit,
        raw.lines,
        raw.sensor,
        raw.directions,
        raw.freq_hz[order],
        shapes.real if np.iscomplexobj(shapes) and not shapes.imag.any() else shapes,
        None if damping is None else damping[order],
        str(path),
    )
    return test.with_(remarks=(*remarks, *_remarks(test, unit)))


def _unit(stated: float | None, given: float | None, path: Path, remarks: list[str]) -> float:
    """Metres to the unit of length: what is declared, or what the file states; both must agree."""
    if stated is None and given is None:
        raise LoadError(
            "nothing states the unit of length of the points",
            file=path,
            expected='a declared unit, for example length_unit = "mm"',
            do="declare length_unit with the test in the dossier",
        )
    if given is not None and not 0 < given < np.inf:
        raise LoadError("the unit of length is not above zero", file=path, found=f"{given:g} m")
    if stated is not None and given is not None and abs(stated / given - 1) > 1e-4:
        raise LoadError(
            "the unit of length is stated twice and differs",
            file=path,
            found=f"{stated:g} m in the file, {given:g} m declared",
            do="leave length_unit out, or mend the units in the file",
        )
    if given is None:
        assert stated is not None
        remarks.append(f"the file states its unit of length: {stated:g} m")
        return stated
    remarks.append(f"the unit of length was declared: {given:g} m")
    return given


def _remarks(test: TestSet, unit: float) -> list[str]:
    remarks = []
    low, high = _USUAL_SIZE
    if not low <= test.size <= high:
        remarks.append(
            f"the points measure {test.size:.3g} m from corner to corner, which is implausible: "
            f"check the unit of length (1 unit of the file was taken as {unit:g} m)"
        )
    odd = (test.freq_hz < _USUAL_HZ[0]) | (test.freq_hz > _USUAL_HZ[1])
    if odd.any():
        remarks.append(f"a frequency of {test.freq_hz[odd][0]:.3g} Hz is implausible: frequencies are in Hz")
    if test.damping is not None:
        odd = (test.damping < _USUAL_DAMPING[0]) | (test.damping > _USUAL_DAMPING[1])
        if odd.any():
            mode = int(np.argmax(odd))
            remarks.append(
                f"damping of {test.damping[mode]:.3g} of mode {mode + 1} is implausible: it is a ratio, 0.01 is one "
                "percent"
            )
    idle = np.setdiff1d(np.arange(len(test.labels)), test.sensor)
    if len(idle):
        names = ", ".join(test.labels[row] for row in idle[:10]) + (" …" if len(idle) > 10 else "")
        remarks.append(f"points without a channel: {names}")
    return remarks
