"""The one tree of errors that Hingelight raises.

HingelightError                      anything a user can be told about
├── InputError                       exit 1: something the user gave is unusable
│   ├── LoadError                    a mesh, mode set or test file
│   ├── DossierError                 dossier.toml
│   └── ModelError                   the design cannot be solved or has no energies as described
├── RefusedError                     a question whose data is missing; the text says what to give
├── SolveError                       the eigen-solution did not reach its own checks
├── ExportError                      a picture, loop or table could not be written
└── Cancelled                        the user asked to stop

A message names the file, the place in it, what was found, what was expected, and what to do.
"""

from __future__ import annotations


class HingelightError(Exception):
    """Root of the tree. ``str(error)`` is the one line shown to the user.

    Every part is optional and keyword-only, so that a low layer can raise what it knows and a higher one
    can add the file with :meth:`at`.
    """

    def __init__(
        self,
        problem: str,
        *,
        file: object = None,
        place: str = "",
        found: str = "",
        expected: str = "",
        do: str = "",
    ) -> None:
        self.problem, self.place, self.found, self.expected, self.do = problem, place, found, expected, do
        self.file = None if file is None else str(file)
        super().__init__(problem)

    def at(self, *, file: object = None, place: str = "") -> HingelightError:
        """The same error with the file or place filled in where it was still empty."""
        if self.file is None and file is not None:
            self.file = str(file)
        if not self.place:
            self.place = place
        return self

    def __str__(self) -> str:
        where = ", ".join(part for part in (self.file, self.place) if part)
        text = f"{where}: {self.problem}" if where else self.problem
        for word, part in (("found", self.found), ("expected", self.expected), ("do", self.do)):
            if part:
                text += f"; {word}: {part}"
        return text

    def to_dict(self) -> dict[str, str | None]:
        """The parts, for ``--json``."""
        return {
            "error": type(self).__name__,
            "problem": self.problem,
            "file": self.file,
            "place": self.place,
            "found": self.found,
            "expected": self.expected,
            "do": self.do,
        }

    def __reduce__(self):  # keeps the parts when an error crosses a process boundary
        return _rebuild, (type(self), self.to_dict())


def _rebuild(kind: type[HingelightError], parts: dict[str, str | None]) -> HingelightError:
    names = ("file", "place", "found", "expected", "do")
    return kind(parts["problem"] or "", **{name: parts[name] for name in names})  # type: ignore[arg-type]


class InputError(HingelightError):
    """Something the user gave is unusable."""


class LoadError(InputError):
    """A mesh, mode set or test file cannot be read as what it claims to be."""


class DossierError(InputError):
    """dossier.toml is wrong."""


class ModelError(InputError):
    """The design cannot be solved, or its energies cannot be formed, as described."""


class RefusedError(HingelightError):
    """A question whose data is missing. The text says what would answer it."""


class SolveError(HingelightError):
    """The eigen-solution failed or did not pass its own checks."""


class ExportError(HingelightError):
    """An output could not be written."""


class Cancelled(HingelightError):
    """The user asked to stop; nothing half-written is left."""

    def __init__(self, problem: str = "cancelled", **parts) -> None:
        super().__init__(problem, **parts)
