"""The bar over the gallery that says which modes it shows: a band of frequencies, a functional point that moves."""

from __future__ import annotations

from PySide6.QtCore import QLocale, Qt, Signal
from PySide6.QtGui import QDoubleValidator
from PySide6.QtWidgets import QComboBox, QFrame, QHBoxLayout, QLabel, QLineEdit, QPushButton, QWidget

from viewer.panels.theme import MARGIN
from viewer.session.gallery import MOVES
from viewer.session.state import Band

_ALL = "anything"


class FilterBar(QFrame):
    """``wished(band)``: show these; ``closed()``: all again."""

    wished = Signal(object)
    closed = Signal()

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("filter_bar")
        self.low, self.high = (
            self._field(words) for words in ("Lowest frequency, hertz", "Highest frequency, hertz")
        )
        self.moving = QComboBox(self)
        self.moving.setAccessibleName("Only modes that move this point along its direction")
        self.moving.setToolTip(f"by at least {MOVES:.0f} % of the mode's largest motion")
        self.count = QLabel(self)
        self.count.setObjectName("soft")
        self.all_button = QPushButton("Show all", self)
        self.all_button.clicked.connect(self.closed)
        box = QHBoxLayout(self)
        box.setContentsMargins(MARGIN, 4, 12, 4)
        for part in (QLabel("from", self), self.low, QLabel("to", self), self.high, QLabel("Hz that move", self)):
            box.addWidget(part)
        box.addWidget(self.moving)
        box.addWidget(self.count, 1)
        box.addWidget(self.all_button)
        self.moving.activated.connect(self._wish)
        self.hide()

    def _field(self, words: str) -> QLineEdit:
        field = QLineEdit(self)
        field.setFixedWidth(84)
        field.setPlaceholderText("any")
        field.setAccessibleName(words)
        field.setLocale(QLocale.c())  # a point is a point everywhere, as in the dossier
        check = QDoubleValidator(0.0, 1e12, 6, field)
        check.setLocale(QLocale.c())
        field.setValidator(check)
        field.textEdited.connect(self._wish)
        return field

    def show_band(self, band: Band, points: tuple[str, ...], shown: int, of: int) -> None:
        """``points``: what modes can be chosen by; ``shown`` of ``of`` modes pass."""
        names = (_ALL, *points)
        if names != tuple(self.moving.itemText(i) for i in range(self.moving.count())):
            self.moving.clear()
            self.moving.addItems(names)
        self.moving.setCurrentIndex(names.index(band.moving) if band.moving in names else 0)
        for field, value in ((self.low, band.low), (self.high, band.high)):
            if _number(field) != value:
                field.setText("" if value is None else f"{value:g}")
        self.count.setText(f"{shown} of {of} modes")
        self.setVisible(not band.open or not self.isHidden())

    def ask(self) -> None:
        """Show the bar and write into it."""
        self.show()
        self.low.setFocus(Qt.FocusReason.ShortcutFocusReason)
        self.low.selectAll()

    @property
    def written_into(self) -> bool:
        """Whether the keys go here."""
        focus = self.window().focusWidget()
        return focus is not None and self.isAncestorOf(focus)

    def _wish(self) -> None:
        moving = self.moving.currentText() if self.moving.currentIndex() > 0 else ""
        self.wished.emit(Band(_number(self.low), _number(self.high), moving))


def _number(field: QLineEdit) -> float | None:
    """What the field says; None while it says nothing, or nothing whole."""
    value, good = field.locale().toDouble(field.text())
    return value if good else None
