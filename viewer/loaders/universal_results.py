"""Data at nodes and on elements of universal files: data sets 55 and 2414."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.loaders.universal_text import Records
from viewer.model.arrays import Array, frozen

STATIC, NORMAL_MODE, TRANSIENT, FREQUENCY_RESPONSE, BUCKLING = 1, 2, 4, 5, 6
COMPLEX_MODES = (3, 7)
ANALYSES = {
    0: "of unknown origin",
    STATIC: "static",
    NORMAL_MODE: "normal modes",
    3: "complex modes",
    TRANSIENT: "transient",
    FREQUENCY_RESPONSE: "frequency response",
    BUCKLING: "buckling",
    7: "complex modes",
    9: "static, nonlinear",
}
UNKNOWN, GENERAL, STRAIN_ENERGY, DISPLACEMENT, VELOCITY, ACCELERATION = 0, 1, 7, 8, 11, 12
AT_NODES, ON_ELEMENTS = 1, 2
_MOST_WHOLE, _MOST_REAL = 10, 12  # by the description of data set 55
_LOCATIONS = {AT_NODES: "nodes", ON_ELEMENTS: "elements"}


@dataclass(frozen=True, eq=False)
class ResultData:
    """One data set 55 or 2414.

    number      55 or 2414; ``place`` where its records start, for messages
    location    1 at nodes, 2 on elements; others are read no further (``labels`` empty)
    analysis    2 normal mode, 3 and 7 complex mode, others as in ``ANALYSES``
    quantity    8 displacement, 11 velocity, 12 acceleration, 7 strain energy, 0 and 1 unknown and general
    labels      (n,) of nodes or elements; ``values`` (n, components) float64 or complex128
    mode        number of the mode or step as stated
    freq_hz     Hz: as stated, of complex modes |λ| / 2π with the eigenvalue λ in rad/s
    damping     ratio to critical: viscous as stated, else half the hysteretic one; of complex modes −Re λ / |λ|
    modal_mass  as stated, 0 when not
    entries     line of the file at which the first entry stands, and how many lines each has
    """

    number: int
    place: str
    location: int
    analysis: int
    quantity: int
    labels: Array
    values: Array
    mode: int
    freq_hz: float
    damping: float
    modal_mass: float
    titles: tuple[str, ...]
    entries: tuple[int, int] = (0, 1)

    def __post_init__(self) -> None:
        object.__setattr__(self, "labels", frozen(self.labels, np.int64, shape=(len(self.values),)))
        object.__setattr__(self, "values", frozen(self.values, shape=(None, None)))

    def place_of(self, row: int) -> str:
        """Where the entry in ``row`` stands, for messages."""
        return f"line {self.entries[0] + row * self.entries[1]} (data set {self.number})"

    @property
    def is_mode(self) -> bool:
        return self.analysis == NORMAL_MODE or self.analysis in COMPLEX_MODES


def result_55(records: Records) -> ResultData:
    """Data set 55, data at nodes."""
    titles = tuple(records.text("the titles") for _ in range(5))
    _, analysis, _, quantity, data_type, count = records.whole((10,) * 6, "the definition of the data")
    n_whole, n_real, *whole = records.whole((10,) * 8, "the definition of the data")
    if not (0 <= n_whole <= _MOST_WHOLE and 0 <= n_real <= _MOST_REAL):
        raise records.error(
            "the numbers of parameters are beyond reason",
            found=f"{n_whole}, {n_real}",
            expected=f"at most {_MOST_WHOLE} whole and {_MOST_REAL} real ones",
        )
    if n_whole > len(whole):
        records.take(1, "the definition of the data")
    real = records.reals(n_real, "the definition of the data")
    mode = whole[1] if n_whole > 1 else whole[0]
    is_complex = _is_complex(records, data_type, {2: False, 5: True})
    if analysis in COMPLEX_MODES:
        freq, damping, mass = *_of_eigenvalue(records, _at(real, 0), _at(real, 1)), 0.0
    else:
        freq, mass = _at(real, 0), _at(real, 1)
        damping = _ratio(_at(real, 2), _at(real, 3)) if analysis == NORMAL_MODE else 0.0
    labels, values, entries = _entries(records, count, is_complex, (10,), 13)
    return ResultData(
        55, _place(records), AT_NODES, analysis, quantity, labels, values, mode, freq, damping, mass, titles, entries
    )


def result_2414(records: Records) -> ResultData:
    """Data set 2414, analysis data; data at nodes on elements and at points are left unread."""
    place = _place(records)
    records.take(1, "the label")
    name = records.text("the name")
    (location,) = records.whole((10,), "the location of the data")
    titles = (name, *(records.text("the titles") for _ in range(5)))
    _, analysis, _, quantity, data_type, count = records.whole((10,) * 6, "the definition of the data")
    whole = records.wholes(8, "the definition of the data")
    records.take(1, "the definition of the data")
    real = [*records.reals(6, "the definition of the data"), *records.reals(6, "the definition of the data")]
    is_complex = _is_complex(records, data_type, {2: False, 4: False, 5: True, 6: True})
    if analysis in COMPLEX_MODES:
        freq, damping = _of_eigenvalue(records, real[6], real[7])
    else:
        freq, damping = real[1], _ratio(real[4], real[5])
    labels, values, entries = np.empty(0, np.int64), np.empty((0, count)), (0, 1)
    if location in _LOCATIONS:
        heads = (10,) if location == AT_NODES else (10, 10)
        labels, values, entries = _entries(records, count, is_complex, heads, 25 if data_type in (4, 6) else 13)
    return ResultData(
        2414, place, location, analysis, quantity, labels, values, whole[5], freq, damping, real[3], titles, entries
    )


def _place(records: Records) -> str:
    return f"line {records.first} (data set {records.number})"


def _is_complex(records: Records, data_type: int, known: dict[int, bool]) -> bool:
    if data_type not in known:
        raise records.error(
            "unknown type of numbers",
            records.at,
            found=str(data_type),
            expected=", ".join(f"{number} {'complex' if c else 'real'}" for number, c in known.items()),
        )
    return known[data_type]


def _at(values: list[float], index: int) -> float:
    return values[index] if index < len(values) else 0.0


def _ratio(viscous: float, hysteretic: float) -> float:
    return viscous or hysteretic / 2


def _of_eigenvalue(records: Records, real: float, imaginary: float) -> tuple[float, float]:
    size = float(np.hypot(real, imaginary))
    return size / (2 * np.pi), -real / size if size > 0 else 0.0


def _entries(
    records: Records, count: int, is_complex: bool, heads: tuple[int, ...], width: int
) -> tuple[Array, Array, tuple[int, int]]:
    """Labels, values and where they stand: a line with the label, then ``count`` numbers (pairs when complex), over
    and over."""
    if not 1 <= count <= 1000:
        raise records.error("the number of values is beyond reason", found=str(count), expected="1 to 1000")
    numbers = count * (2 if is_complex else 1)
    per_line = 6 if width == 13 else 3
    step = 1 + -(-numbers // per_line)
    if width != 13 and records.left > 1 and (records.left % step or len(records.lines[records.at + 1].split()) > 3):
        per_line, width, step = 6, 13, 1 + -(-numbers // 6)  # double precision in the columns of single
    if records.left % step:
        raise records.error(
            "the data set ends inside an entry",
            len(records.lines) - 1,
            found=f"{records.left} lines",
            expected=f"a multiple of {step}: a label and {numbers} numbers each",
        )
    rows = records.take(records.left, "its data")
    labels = records.integers(rows[::step], heads)
    if len(heads) == 2 and len(labels) and (labels[:, 1] != count).any():
        row = int(np.argmax(labels[:, 1] != count))
        raise records.error(
            "an element has another number of values than the data set says",
            rows[::step][row],
            found=str(labels[row, 1]),
            expected=str(count),
        )
    values = records.values([rows[1 + i :: step] for i in range(step - 1)], numbers, per_line, width)
    if is_complex:
        parts, values = values, np.empty((len(values), count), complex)
        values.real, values.imag = parts[:, ::2], parts[:, 1::2]  # infinities stay where they are
    return labels[:, 0], values, (records.first + rows.start, step)
