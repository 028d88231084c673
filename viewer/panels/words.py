"""In words: the answers about the chosen mode, each of which lights up what it speaks of."""

from __future__ import annotations

from PySide6.QtCore import QRectF, Qt, Signal
from PySide6.QtGui import QKeyEvent, QMouseEvent, QPainter, QPaintEvent
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QPushButton, QScrollArea, QVBoxLayout, QWidget

from viewer.panels.theme import LABEL, MARGIN, WORDS, colour, face
from viewer.scene.tokens import THEMES
from viewer.session.words import Bar, Entry

HINTS = "space  pause    T  true scale    D  drawn    G  ghost\nE  energy    C  compare    ?  all keys"


class _Bars(QWidget):
    """Shares as bars, figure and name beside each."""

    def __init__(self, parent: QWidget) -> None:
        super().__init__(parent)
        self._bars: tuple[Bar, ...] = ()
        self._theme = "light"

    def show_bars(self, bars: tuple[Bar, ...], theme: str) -> None:
        self._bars, self._theme = bars, theme
        self.setVisible(bool(bars))
        self.setFixedHeight(21 * len(bars) + 4 if bars else 0)
        self.setAccessibleName(", ".join(f"{bar.label} {_percent(bar.share)}" for bar in bars))
        self.update()

    def paintEvent(self, event: QPaintEvent) -> None:
        painter, tokens = QPainter(self), THEMES[self._theme]
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setFont(face(LABEL))
        for row, bar in enumerate(self._bars):
            top = 4.0 + 21 * row
            painter.setPen(colour(tokens.soft))
            painter.drawText(QRectF(0, top, 60, 18), Qt.AlignmentFlag.AlignVCenter, bar.label)
            painter.setPen(colour(tokens.ink))
            room = QRectF(self.width() - 60, top, 60, 18)
            flags = Qt.AlignmentFlag.AlignVCenter | Qt.AlignmentFlag.AlignRight
            painter.drawText(room, flags, _percent(bar.share))
            painter.setPen(Qt.PenStyle.NoPen)
            painter.setBrush(colour(tokens.rule))
            full = QRectF(62, top + 5, self.width() - 62 - 66, 8)
            painter.drawRoundedRect(full, 3, 3)
            painter.setBrush(colour(tokens.energy[4] if bar.kind == "energy" else tokens.mass))
            full.setWidth(max(full.width() * min(bar.share, 1.0), 2.0))
            painter.drawRoundedRect(full, 3, 3)
        painter.end()


def _percent(share: float) -> str:
    return f"{100 * share:.2g} %" if share < 0.995 else "100 %"


class EntryWidget(QFrame):
    """One question and its answer: a press lights it up."""

    pressed = Signal(str)
    taken_up = Signal(str)

    def __init__(self, parent: QWidget) -> None:
        super().__init__(parent)
        self.setObjectName("entry")
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self._heading, self._sentence = QLabel(self), QLabel(self)
        self._heading.setObjectName("entry_heading")
        self._sentence.setObjectName("sentence")
        self._sentence.setWordWrap(True)
        self._bars = _Bars(self)
        box = QVBoxLayout(self)
        box.setContentsMargins(14, 8, 14, 10)
        box.setSpacing(3)
        for part in (self._heading, self._sentence, self._bars):
            box.addWidget(part)
        self.offer = QPushButton(self)
        self.offer.clicked.connect(self._take_up)
        box.addWidget(self.offer, 0, Qt.AlignmentFlag.AlignLeft)
        self.entry: Entry | None = None

    def show_entry(self, entry: Entry, lit: bool, theme: str) -> None:
        self.entry = entry
        self._heading.setText(entry.heading)
        self._sentence.setText(entry.sentence)
        self._bars.show_bars(entry.bars if lit else (), theme)
        self.offer.setText(entry.offer)
        self.offer.setVisible(bool(entry.offer))
        self.setAccessibleName(f"{entry.heading}: {entry.sentence}")
        state = (lit, entry.known)
        if (self.property("lit"), self.property("known")) != state:
            self.setProperty("lit", lit)
            self.setProperty("known", entry.known)
            for widget in (self, self._heading, self._sentence):
                widget.style().unpolish(widget)
                widget.style().polish(widget)

    def _take_up(self) -> None:
        if self.entry is not None:
            self.taken_up.emit(self.entry.subject)

    def mousePressEvent(self, event: QMouseEvent) -> None:
        if event.button() == Qt.MouseButton.LeftButton and self.entry is not None:
            self.pressed.emit(self.entry.subject)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter) and self.entry is not None:
            self.pressed.emit(self.entry.subject)
        elif event.key() in (Qt.Key.Key_Down, Qt.Key.Key_Up):
            self.focusNextPrevChild(event.key() == Qt.Key.Key_Down)
        else:
            super().keyPressEvent(event)


class WordsPanel(QWidget):
    """``lit(subject)``: a sentence was pressed; ``taken_up(subject)``: what it offers is wished."""

    lit = Signal(str)
    taken_up = Signal(str)

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("words")
        self.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        self.setFixedWidth(WORDS)
        self.setAccessibleName("In words")
        title, self._heading = QLabel("In words", self), QLabel(self)
        title.setObjectName("words_title")
        self._heading.setObjectName("mode_heading")
        top = QHBoxLayout()
        top.setContentsMargins(24, 14, 24, 8)
        top.addWidget(title)
        top.addStretch(1)
        top.addWidget(self._heading)
        self._inner = inner = QWidget()
        self._list = QVBoxLayout(inner)
        self._list.setContentsMargins(8, 4, 8, 4)
        self._list.setSpacing(4)
        self._list.addStretch(1)
        area = QScrollArea(self)
        area.setWidgetResizable(True)
        area.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        area.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        area.setWidget(inner)
        self._area = area
        hints = QLabel(HINTS, self)
        hints.setObjectName("hints")
        foot = QFrame(self)
        foot.setObjectName("foot")
        room = QVBoxLayout(foot)
        room.setContentsMargins(0, 8, 0, 10)
        room.addWidget(hints)
        box = QVBoxLayout(self)
        box.setContentsMargins(0, 0, 0, 0)
        box.setSpacing(0)
        box.addLayout(top)
        box.addWidget(area, 1)
        sides = QHBoxLayout()
        sides.setContentsMargins(MARGIN, 0, MARGIN, 0)
        sides.addWidget(foot)
        box.addLayout(sides)
        self._lit = ""
        self.entries: list[EntryWidget] = []

    def show_entries(self, entries: tuple[Entry, ...], heading: str, subject: str, theme: str) -> None:
        """Show what is said, ``subject`` lit."""
        self._heading.setText(heading)
        while len(self.entries) < len(entries):
            widget = EntryWidget(self._inner)
            widget.pressed.connect(self.lit)
            widget.taken_up.connect(self.taken_up)
            self._list.insertWidget(self._list.count() - 1, widget)
            self.entries.append(widget)
        lit = next((w for w, e in zip(self.entries, entries, strict=False) if e.subject == subject), None)
        for widget, entry in zip(self.entries, entries, strict=False):
            widget.show_entry(entry, entry.subject == subject, theme)
            widget.show()
        for widget in self.entries[len(entries) :]:
            widget.hide()
        if lit is not None and subject != self._lit:
            self._list.activate()
            self._area.ensureWidgetVisible(lit, 0, 12)
        self._lit = subject
