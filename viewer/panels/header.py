"""The header: what is open, which design, how designs are compared, and the one menu."""

from __future__ import annotations

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QFontMetrics, QResizeEvent
from PySide6.QtWidgets import (
    QButtonGroup,
    QComboBox,
    QFrame,
    QHBoxLayout,
    QLabel,
    QMenu,
    QPushButton,
    QSizePolicy,
    QToolButton,
    QWidget,
)

from viewer.panels.theme import HEADER, LABEL, MARGIN, face

LAYOUT_WORDS = {"side": "side by side", "overlay": "overlay", "difference": "difference"}
TEST_WORDS = {"test over": "test on top", "test beside": "test beside", "test alone": "test alone"}


class _Title(QLabel):
    """Words that are shortened to the room there is; a tail stays whole."""

    def __init__(self, parent: QWidget) -> None:
        super().__init__(parent)
        self._words, self._tail = "", ""

    def say(self, words: str, tail: str) -> None:
        self._words, self._tail = words, tail
        self._fit()

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self._fit()

    def _fit(self) -> None:
        metrics = self.fontMetrics()
        room = self.width() - metrics.horizontalAdvance(self._tail)
        self.setText(metrics.elidedText(self._words, Qt.TextElideMode.ElideRight, room) + self._tail)


class HeaderPanel(QWidget):
    """``design_chosen(name)``, ``layout_chosen(layout)``, ``test_wished()`` (once more: the next of its layouts),
    ``beside_chosen(name)`` of what is to be beside the design."""

    design_chosen = Signal(str)
    layout_chosen = Signal(str)
    test_wished = Signal()
    beside_chosen = Signal(str)

    def __init__(self, menu: QMenu, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("header")
        self.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        self.setFixedHeight(HEADER)
        self._title = _Title(self)
        self._title.setObjectName("title")
        self._title.setTextInteractionFlags(Qt.TextInteractionFlag.NoTextInteraction)
        self._title.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Preferred)  # buttons come first
        self._segments = QFrame(self)
        self._segments.setObjectName("segments")
        self._segments.setAccessibleName("What is on the stage")
        self._row = QHBoxLayout(self._segments)
        self._row.setContentsMargins(3, 2, 3, 2)
        self._segments.setFixedHeight(HEADER - 14)
        self._row.setSpacing(2)
        self._group = QButtonGroup(self)
        self._group.setExclusive(True)
        self._made: tuple[tuple[str, ...], bool] | None = None
        self._test: QPushButton | None = None
        self.beside = QComboBox(self)
        self.beside.setAccessibleName("What is beside the design")
        self.beside.setToolTip("what is beside the design (V: the next)")
        self.beside.textActivated.connect(self.beside_chosen)
        self.beside.hide()
        more = QToolButton(self)
        more.setText("≡")
        more.setAccessibleName("All commands")
        more.setToolTip("All commands (F10)")
        more.setPopupMode(QToolButton.ToolButtonPopupMode.InstantPopup)
        more.setMenu(menu)
        self.more = more
        box = QHBoxLayout(self)
        box.setContentsMargins(MARGIN, 0, 12, 0)
        box.addWidget(more)
        box.addSpacing(6)
        box.addWidget(self._title, 1)
        box.addWidget(self.beside)
        box.addWidget(self._segments)

    def show_project(
        self, title: str, designs: tuple[str, ...], shown: str, layout: str, unsaved: bool, tested: bool = False
    ) -> None:
        """``shown``: the chosen design; ``unsaved``: names wait to be saved; ``tested``: some design has a test."""
        self._title.say(title, "  • not saved" if unsaved else "")
        self._title.setToolTip(f"{title}: names not saved yet (Ctrl+S)" if unsaved else title)
        if (designs, tested) != self._made:
            self._make(designs, tested)
        key = f"design:{shown}" if layout == "single" else f"layout:{layout}"
        if self._test is not None:
            self._test.setText(TEST_WORDS.get(layout, "test"))
        if layout in TEST_WORDS:
            key = "test:"
        for button in self._group.buttons():
            button.setChecked(button.property("key") == key)
        self._segments.setVisible(bool(designs))

    def show_beside(self, names: tuple[str, ...], chosen: str) -> None:
        """What can be beside the design; nothing to choose from is not shown."""
        if names != tuple(self.beside.itemText(i) for i in range(self.beside.count())):
            self.beside.clear()
            self.beside.addItems(names)
        self.beside.setCurrentText(chosen)
        self.beside.setVisible(len(names) > 1)

    def _make(self, designs: tuple[str, ...], tested: bool) -> None:
        for button in self._group.buttons():
            self._group.removeButton(button)
            self._row.removeWidget(button)
            button.deleteLater()
        self._made = designs, tested
        self._test = None
        for name in designs:
            self._add(name, f"design:{name}", f"Design {name}")
        if len(designs) > 1:
            for layout, words in LAYOUT_WORDS.items():
                self._add(words, f"layout:{layout}", f"Compare designs: {words}")
        if tested:
            self._test = self._add("test beside", "test:", "Hammer test with the design; again: laid out otherwise")
            self._test.setToolTip("hammer test: on top, beside, alone (X)")

    def _add(self, words: str, key: str, spoken: str) -> QPushButton:
        button = QPushButton(words, self._segments)
        button.setCheckable(True)
        bold = QFontMetrics(face(LABEL, True))
        button.setMinimumWidth(bold.horizontalAdvance(words) + 26)  # the checked one is bold
        button.setProperty("key", key)
        button.setAccessibleName(spoken)
        button.clicked.connect(self._clicked)
        self._group.addButton(button)
        self._row.addWidget(button)
        return button

    def _clicked(self) -> None:
        kind, _, name = str(self.sender().property("key")).partition(":")
        if kind == "test":
            self.test_wished.emit()
        else:
            (self.design_chosen if kind == "design" else self.layout_chosen).emit(name)
