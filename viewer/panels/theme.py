"""Colours and type of the window, from the tokens that pictures use."""

from __future__ import annotations

from PySide6.QtGui import QColor, QFont, QPalette

from viewer.scene.tokens import THEMES

TINT = {"light": "#E6EEF6", "dark": "#1B2A3A"}  # ground of what is chosen
WARNING = {"light": "#9A4A00", "dark": "#F2B366"}
HEADER, RAIL, GALLERY, WORDS = 48, 76, 172, 380  # logical pixels
MARGIN, GAP = 20, 24
TITLE, SENTENCE, LABEL, KEY = 16, 15, 13, 12  # px


def colour(text: str) -> QColor:
    return QColor(text)


def face(size: int, bold: bool = False) -> QFont:
    """The system's face at a size in px."""
    font = QFont()
    font.setPixelSize(size)
    font.setBold(bold)
    return font


def palette(theme: str) -> QPalette:
    """The palette of a theme, for whatever the style sheet does not reach."""
    tokens, found = THEMES[theme], QPalette()
    roles = QPalette.ColorRole
    for role, text in (
        (roles.Window, tokens.background),
        (roles.Base, tokens.background),
        (roles.AlternateBase, tokens.band),
        (roles.Button, tokens.band),
        (roles.ToolTipBase, tokens.band),
        (roles.WindowText, tokens.ink),
        (roles.Text, tokens.ink),
        (roles.ButtonText, tokens.ink),
        (roles.ToolTipText, tokens.ink),
        (roles.PlaceholderText, tokens.soft),
        (roles.Highlight, tokens.accent),
        (roles.HighlightedText, tokens.background),
    ):
        found.setColor(role, QColor(text))
    return found


def sheet(theme: str) -> str:
    """The style sheet of a theme."""
    t, tint = THEMES[theme], TINT[theme]
    return f"""
    QWidget {{ color: {t.ink}; background: {t.background}; font-size: {LABEL}px; }}
    QLabel {{ background: transparent; }}
    QToolTip {{ color: {t.ink}; background: {t.band}; border: 1px solid {t.rule}; padding: 4px; }}
    #title, #words_title {{ font-size: {TITLE}px; font-weight: bold; }}
    #soft, #mode_heading, #hints {{ color: {t.soft}; }}
    #hints {{ font-size: {KEY}px; }}
    #header {{ border-bottom: 1px solid {t.rule}; }}
    #words {{ border-left: 1px solid {t.rule}; }}
    #foot {{ border-top: 1px solid {t.rule}; }}
    #gallery {{ border: none; border-top: 1px solid {t.rule}; }}
    #segments {{ background: {t.band}; border-radius: 8px; }}
    #segments QPushButton {{ background: transparent; border: 1px solid transparent; border-radius: 6px;
        padding: 3px 10px; color: {t.soft}; }}
    #segments QPushButton:checked {{ background: {t.background}; color: {t.ink}; font-weight: bold; }}
    #segments QPushButton:disabled {{ color: {t.rule}; }}
    QPushButton:focus, QToolButton:focus, QLineEdit:focus, QComboBox:focus, QAbstractSpinBox:focus
        {{ border: 1px solid {t.accent}; }}
    QToolButton, QPushButton {{ border: 1px solid {t.rule}; border-radius: 6px; padding: 4px 10px;
        background: {t.band}; }}
    QToolButton::menu-indicator {{ image: none; }}
    QLineEdit, QComboBox, QAbstractSpinBox {{ border: 1px solid {t.rule}; border-radius: 6px; padding: 3px 6px; }}
    QMenu {{ border: 1px solid {t.rule}; background: {t.background}; padding: 4px; }}
    QMenu::item {{ padding: 4px 24px 4px 12px; }}
    QMenu::item:selected {{ background: {tint}; }}
    QMenu::item:disabled {{ color: {t.soft}; }}
    QScrollArea {{ border: none; }}
    QScrollBar:vertical {{ width: 8px; background: transparent; }}
    QScrollBar:horizontal {{ height: 8px; background: transparent; }}
    QScrollBar::handle {{ background: {t.rule}; border-radius: 4px; min-width: 24px; min-height: 24px; }}
    QScrollBar::add-line, QScrollBar::sub-line {{ width: 0; height: 0; }}
    #entry {{ border: none; border-left: 4px solid transparent;
        border-top-right-radius: 8px; border-bottom-right-radius: 8px; background: transparent; }}
    #entry:focus {{ border-left: 4px solid {t.soft}; }}
    #entry[lit="true"] {{ background: {tint}; border-left: 4px solid {t.accent}; }}
    #entry #entry_heading {{ color: {t.soft}; font-size: {LABEL}px; }}
    #entry[lit="true"] #entry_heading {{ color: {t.accent}; font-weight: bold; }}
    #entry #sentence {{ font-size: {SENTENCE}px; }}
    #entry[known="false"] #sentence {{ color: {t.soft}; font-style: italic; }}
    #notice {{ background: {t.band}; border: 1px solid {t.rule}; border-radius: 8px; }}
    #notice[kind="error"] {{ border: 2px solid {WARNING[theme]}; }}
    #notice QLabel {{ font-size: {SENTENCE}px; }}
    #notice[kind="error"] #notice_heading {{ color: {WARNING[theme]}; font-weight: bold; }}
    QProgressBar {{ border: 1px solid {t.rule}; border-radius: 4px; height: 8px; background: {t.background}; }}
    QProgressBar::chunk {{ background: {t.accent}; border-radius: 3px; }}
    #card {{ background: {t.band}; border-radius: 8px; }}
    """
