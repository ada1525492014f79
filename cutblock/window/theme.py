"""Colours and text size: our own light and dark palettes on the Fusion style, and the colours that tell things apart.

The colours of data are those of Okabe and Ito (Color Universal Design, 2008), told apart with any colour vision; each
comes with a letter or a hatch, so that nothing rests on colour alone.
"""

from typing import NamedTuple

from PySide6.QtCore import Qt
from PySide6.QtGui import QColor, QFont, QPalette
from PySide6.QtWidgets import QApplication

ORANGE = "#E69F00"
SKY = "#56B4E9"
GREEN = "#009E73"
YELLOW = "#F0E442"
BLUE = "#0072B2"
VERMILLION = "#D55E00"
PURPLE = "#CC79A7"
GREY = "#999999"

SYSTEM, LIGHT, DARK = "system", "light", "dark"
THEMES = (SYSTEM, LIGHT, DARK)
ZOOMS = (0.8, 0.9, 1.0, 1.1, 1.25, 1.5, 1.75, 2.0)
PAPER, PAPER_IN_DARK = "#ffffff", "#e9ebee"  # drawings lie on paper in either theme

_LIGHT = {
    QPalette.ColorRole.Window: "#f3f4f6",
    QPalette.ColorRole.WindowText: "#1c2024",
    QPalette.ColorRole.Base: "#ffffff",
    QPalette.ColorRole.AlternateBase: "#f6f8fa",
    QPalette.ColorRole.Text: "#1c2024",
    QPalette.ColorRole.Button: "#e9ebee",
    QPalette.ColorRole.ButtonText: "#1c2024",
    QPalette.ColorRole.BrightText: "#ffffff",
    QPalette.ColorRole.Highlight: "#005f96",
    QPalette.ColorRole.HighlightedText: "#ffffff",
    QPalette.ColorRole.Link: "#005f96",
    QPalette.ColorRole.ToolTipBase: "#fffbe6",
    QPalette.ColorRole.ToolTipText: "#1c2024",
    QPalette.ColorRole.PlaceholderText: "#6b7280",
    QPalette.ColorRole.Mid: "#c4c9cf",
    QPalette.ColorRole.Light: "#ffffff",
    QPalette.ColorRole.Midlight: "#f0f2f4",
    QPalette.ColorRole.Dark: "#a3a9b1",
    QPalette.ColorRole.Shadow: "#767c84",
}
_DARK = {
    QPalette.ColorRole.Window: "#26292d",
    QPalette.ColorRole.WindowText: "#e4e7ea",
    QPalette.ColorRole.Base: "#1d2023",
    QPalette.ColorRole.AlternateBase: "#22262a",
    QPalette.ColorRole.Text: "#e4e7ea",
    QPalette.ColorRole.Button: "#33383d",
    QPalette.ColorRole.ButtonText: "#e4e7ea",
    QPalette.ColorRole.BrightText: "#ffffff",
    QPalette.ColorRole.Highlight: "#2f7fb5",
    QPalette.ColorRole.HighlightedText: "#ffffff",
    QPalette.ColorRole.Link: "#7cc4f0",
    QPalette.ColorRole.ToolTipBase: "#3a4046",
    QPalette.ColorRole.ToolTipText: "#e4e7ea",
    QPalette.ColorRole.PlaceholderText: "#98a0a8",
    QPalette.ColorRole.Mid: "#4a5057",
    QPalette.ColorRole.Light: "#4a5057",
    QPalette.ColorRole.Midlight: "#3a4046",
    QPalette.ColorRole.Dark: "#17191c",
    QPalette.ColorRole.Shadow: "#0c0d0e",
}
_FAINT_LIGHT, _FAINT_DARK = "#8a9099", "#7d858d"
_TEXT_ROLES = (QPalette.ColorRole.WindowText, QPalette.ColorRole.Text, QPalette.ColorRole.ButtonText)


class Ink(NamedTuple):
    """The colours our own painted views take from the theme."""

    ground: QColor
    text: QColor
    faint: QColor  # second text, axes
    grid: QColor
    near: QColor  # rail at y = 0
    far: QColor  # rail at y = width
    accent: QColor


def palette_of(is_dark: bool) -> QPalette:
    """Return our palette."""
    palette = QPalette()
    for role, colour in (_DARK if is_dark else _LIGHT).items():
        palette.setColor(role, QColor(colour))
    for role in _TEXT_ROLES:
        palette.setColor(QPalette.ColorGroup.Disabled, role, QColor(_FAINT_DARK if is_dark else _FAINT_LIGHT))
    return palette


def is_dark(palette: QPalette) -> bool:
    """Tell whether the palette is a dark one."""
    return palette.color(QPalette.ColorRole.Window).lightness() < 128


def ink_of(palette: QPalette) -> Ink:
    """Return the colours of our own painted views."""
    dark = is_dark(palette)
    return Ink(
        ground=palette.color(QPalette.ColorRole.Base),
        text=palette.color(QPalette.ColorRole.Text),
        faint=QColor("#a9b0b7" if dark else "#59616a"),
        grid=QColor("#353a40" if dark else "#e1e4e8"),
        near=QColor(SKY if dark else BLUE),
        far=QColor(ORANGE if dark else VERMILLION),
        accent=QColor(SKY if dark else BLUE),
    )


def paper_colour(palette: QPalette) -> QColor:
    """Return the colour of the sheet a drawing lies on."""
    return QColor(PAPER_IN_DARK if is_dark(palette) else PAPER)


def text_on(fill: QColor) -> QColor:
    """Return black or white, whichever reads better on `fill` (relative luminance of WCAG 2.2)."""
    shares = (fill.redF(), fill.greenF(), fill.blueF())
    parts = [share / 12.92 if share <= 0.04045 else ((share + 0.055) / 1.055) ** 2.4 for share in shares]
    luminance = 0.2126 * parts[0] + 0.7152 * parts[1] + 0.0722 * parts[2]
    return QColor("#ffffff") if luminance < 0.179 else QColor("#000000")


class Theme:
    """The theme and text size of the application; keeps the size the desktop gave as 100 %."""

    def __init__(self, application: QApplication) -> None:
        self._application = application
        self._base_font = QFont(application.font())
        application.setStyle("Fusion")

    def apply(self, choice: str, zoom: float) -> None:
        """Set palette, font and the sizes of headings."""
        hints = self._application.styleHints()
        dark = choice == DARK or (choice == SYSTEM and hints.colorScheme() is Qt.ColorScheme.Dark)
        self._application.setPalette(palette_of(dark))
        size = max(self._base_font.pointSizeF(), 9.0) * zoom
        font = QFont(self._base_font)
        font.setPointSizeF(size)
        self._application.setFont(font)
        faint = "#a9b0b7" if dark else "#59616a"
        self._application.setStyleSheet(
            f'QLabel[kind="title"] {{ font-size: {size * 1.7:.1f}pt; font-weight: 600; }}'
            f'QLabel[kind="heading"] {{ font-size: {size * 1.1:.1f}pt; font-weight: 600; }}'
            f'QLabel[kind="note"] {{ color: {faint}; }}'
            f'QLabel[kind="figure"] {{ font-size: {size * 1.25:.1f}pt; font-weight: 600; }}'
            "QTableView::item { padding: 0 6px; }"
            "QHeaderView::section { background: palette(button); color: palette(button-text); padding: 4px 6px;"
            " border: none; border-bottom: 1px solid palette(mid); border-right: 1px solid palette(mid); }"
            "QToolTip { padding: 3px; }"
        )
