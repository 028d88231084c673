"""What several tables of a dossier share: places, directions, files, names that must be known, plausible values."""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from pathlib import Path
from typing import Any

import numpy as np

from viewer.errors import DossierError
from viewer.loaders import dossier_schema as schema
from viewer.loaders.dossier_parse import short
from viewer.model.design import Selector

# Outside these bounds a value is no error but is flagged: most often a unit was mixed up. Softest foams lie near
# 1e4 Pa and 10 kg/m³, diamond near 1.2e12 Pa, osmium near 22 600 kg/m³ (handbook values, rounded outwards).
_PLAUSIBLE = {
    "youngs_modulus": (1e4, 1.3e12, "Pa"),
    "density": (5.0, 23_000.0, "kg/m³"),
    "thickness": (1e-5, 0.2, "m"),
    "mass": (1e-6, 1e5, "kg"),
    "radius_of_gyration": (1e-4, 20.0, "m"),
    "amplitude": (1e-12, 0.1, "m"),
}


class Parts:
    """Reads parts of tables; ``length`` is metres per unit of length in the dossier. Collects warnings."""

    def __init__(self, path: Path, length: float) -> None:
        self.path, self.length = path, length
        self.warnings: list[str] = []

    def inertia(self, given: Any, place: str) -> np.ndarray:
        values = np.zeros(3) if given is None else np.asarray(given, float)
        matrix = np.diag(values) if values.shape == (3,) else values
        if matrix.shape != (3, 3):
            raise DossierError(
                "wrong number of values",
                file=self.path,
                place=place,
                found=short(given),
                expected="three values about x, y, z, or a 3 × 3 matrix",
            )
        moments = np.linalg.eigvalsh((matrix + matrix.T) / 2)
        if not np.allclose(matrix, matrix.T) or moments[0] < -1e-9 * max(moments[-1], 0.0) or moments[0] < -1e-300:
            raise DossierError(
                "is no inertia of a real body",
                file=self.path,
                place=place,
                found=short(given),
                expected="a symmetric matrix without negative principal moments",
            )
        return matrix

    def selector(self, item: schema.Place, place: str) -> Selector:
        box = None if item.box is None else self.box(item.box, place)
        near = None if item.near is None else np.array(item.near) * self.length
        return Selector(item.group or "", item.nodes, box, near)  # type: ignore[arg-type]

    def box(self, given: list[list[float]], place: str) -> np.ndarray:
        box = np.array(given) * self.length
        if (box[0] > box[1]).any():
            raise DossierError(
                "the lower corner of the box lies above the upper one",
                file=self.path,
                place=f"{place}, box",
                found=short(given),
                expected="[[xmin, ymin, zmin], [xmax, ymax, zmax]]",
            )
        return box

    def position(self, given: list[float] | None) -> np.ndarray | None:
        return None if given is None else np.array(given) * self.length

    def direction(self, given: Any, place: str) -> np.ndarray:
        if isinstance(given, str):
            word = given.strip().lower()
            sign, axis = (-1.0 if word[:1] == "-" else 1.0), word.lstrip("+-")
            if axis not in ("x", "y", "z") or len(word) - len(axis) > 1:
                raise DossierError(
                    "is no direction",
                    file=self.path,
                    place=place,
                    found=short(given),
                    expected='three components, or a word such as "x", "-z"',
                )
            return sign * np.eye(3)["xyz".index(axis)]
        vector = np.asarray(given, float)
        size = float(np.linalg.norm(vector))
        if not size > 0 or not np.isfinite(size):
            raise DossierError("a direction has no length", file=self.path, place=place, found=short(given))
        return vector / size

    def vector(self, given: list[float] | None, place: str) -> tuple[float, ...] | None:
        return None if given is None else tuple(self.direction(given, place).tolist())

    def existing(self, name: str, place: str) -> Path:
        path = self.path.parent / name
        if not path.is_file():
            raise DossierError(
                "is a folder" if path.is_dir() else "there is no such file",
                file=self.path,
                place=place,
                found=str(path),
                expected="a file; paths are relative to the dossier",
                do="check the path",
            )
        return path

    def known(self, word: str, name: str, among: Iterable[str], place: str) -> None:
        among = list(among)
        if name not in among:
            close = difflib.get_close_matches(name, among, 1)
            raise DossierError(
                f"no {word} named '{name}'",
                file=self.path,
                place=place,
                expected=f"one of: {', '.join(among)}" if among else f"a {word}, none is declared",
                do=f"did you mean '{close[0]}'?" if close else "",
            )

    def no_duplicates(self, place: str, names: list[str]) -> None:
        for i, name in enumerate(names):
            if name in names[:i]:
                raise DossierError(
                    f"'{name}' is given twice",
                    file=self.path,
                    place=place,
                    expected="each once",
                    do="rename one",
                )

    def plausible(self, what: str, value: float, place: str) -> float:
        low, high, unit = _PLAUSIBLE[what]
        if not low <= value <= high:
            self.warnings.append(
                f"{place}: {what.replace('_', ' ')} of {value:.3g} {unit} is implausible "
                f"(usual: {low:.3g} to {high:.3g} {unit}); check [units]"
            )
        return value
