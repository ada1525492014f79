import pytest
from PySide6.QtGui import QColor, QPalette

from cutblock.window import theme as colours
from cutblock.window.deviation import NOT_CUT, STEPS
from cutblock.window.theme import ink_of, is_dark, palette_of, text_on


def luminance(colour):
    parts = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in colour.getRgbF()[:3]]
    return sum(weight * part for weight, part in zip((0.2126, 0.7152, 0.0722), parts, strict=True))


def contrast(one, other):
    """The contrast ratio of WCAG 2.2, 1.4.3."""
    high, low = sorted((luminance(QColor(one)), luminance(QColor(other))), reverse=True)
    return (high + 0.05) / (low + 0.05)


@pytest.mark.parametrize("dark", [False, True])
def test_text_is_readable_in_both_themes(dark):
    palette = palette_of(dark)
    role = QPalette.ColorRole
    pairs = (
        (role.WindowText, role.Window),
        (role.Text, role.Base),
        (role.Text, role.AlternateBase),
        (role.ButtonText, role.Button),
        (role.ToolTipText, role.ToolTipBase),
        (role.PlaceholderText, role.Base),
        (role.Link, role.Window),
    )
    for text, ground in pairs:
        assert contrast(palette.color(text), palette.color(ground)) >= 4.5, (text, ground)
    assert contrast(palette.color(role.HighlightedText), palette.color(role.Highlight)) >= 4.0
    assert contrast(ink_of(palette).faint, palette.color(role.Base)) >= 4.5
    assert is_dark(palette) == dark


@pytest.mark.parametrize("dark", [False, True])
def test_lines_stand_out_from_their_ground_in_both_themes(dark):
    """Graphics need a contrast of 3 (WCAG 2.2, 1.4.11)."""
    ink = ink_of(palette_of(dark))

    assert min(contrast(line, ink.ground) for line in (ink.near, ink.far, ink.text, ink.faint)) >= 3.0


def test_letters_are_readable_on_every_colour_of_the_data():
    fills = [step.colour for step in (*STEPS, NOT_CUT)]
    fills += [colours.ORANGE, colours.SKY, colours.GREEN, colours.YELLOW]
    fills += [colours.BLUE, colours.VERMILLION, colours.PURPLE, colours.GREY]

    assert min(contrast(text_on(QColor(fill)), fill) for fill in fills) >= 4.5


def test_the_system_theme_is_one_of_ours(theme, qapp):
    theme.apply(colours.SYSTEM, 1.0)

    assert qapp.palette().window().color().name() in {
        palette_of(dark).window().color().name() for dark in (False, True)
    }
