import pytest

from cutblock.base.errors import CheckFailed
from cutblock.machinecode.reader import read_program

AXES = ("X", "Y", "U", "V")
HEAD = "(Wall A)\nG21 G90\nG61\nG93\n"
MOVE = "G1 X1.000 Y2.000 U3.000 V-4.500 F2.50\n"


def read(body):
    return read_program(HEAD + body, "cut.ngc", AXES)


def test_a_move_is_read_with_its_position_and_inverse_time():
    line = read(MOVE + "M2\n")[4]

    assert (line.number, line.motion, line.values) == (5, "1", (1.0, 2.0, 3.0, -4.5))
    assert (line.letters, line.decimals, line.feed, line.feed_decimals) == (AXES, (3, 3, 3, 3), 2.5, 2)


@pytest.mark.parametrize(
    ("body", "words"),
    [
        ("G1 X1e-05 Y2.000 U3.000 V4.000 F2.5\nM2\n", "not made of words"),
        ("G1 Xnan Y2.000 U3.000 V4.000 F2.5\nM2\n", "not made of words"),
        ("G1 X1,5 Y2.000 U3.000 V4.000 F2.5\nM2\n", "not made of words"),
        ("(piece A)G0 X999.000 (x)\nM2\n", "no safe comment"),
        ("(MSG hello)\nM2\n", "no safe comment"),
        ("(A (B))\nM2\n", "no safe comment"),
        ("\ufeffG0 Y1.000\nM2\n", "not made of words"),
        ("#1=5\nM2\n", "not made of words"),
        ("g0 y1.000\nM2\n", "not made of words"),
        ("\nM2\n", "not made of words"),
        ("G1 X1.000 X2.000 F2.5\nM2\n", "two words of one kind"),
        ("G0 G1 X1.000 F2.5\nM2\n", "two words of one kind"),
        ("G93 G94\nM2\n", "two words of one kind"),
        ("G2 X1.000 F2.5\nM2\n", "no place"),
        ("G92 X1.000\nM2\n", "no place"),
        ("X1.000\nM2\n", "without G0 or G1"),
        ("G1 X1.000\nM2\n", "no inverse-time feed"),
        ("G1 X1.000 F0\nM2\n", "no inverse-time feed"),
        ("G0\nM2\n", "no position"),
        ("G94\n" + MOVE + "M2\n", "G93 is not in force"),
        ("G20\n" + MOVE + "M2\n", "G21 is not in force"),
        ("G91\n" + MOVE + "M2\n", "G90 is not in force"),
        ("G64\n" + MOVE + "M2\n", "G61 is not in force"),
        ("(" + "x" * 260 + ")\nM2\n", "characters"),
        (MOVE, "stops before an end word"),
        ("M2\nG0 Y1.000\n", "after the end"),
        ("M2", "cut off"),
    ],
)
def test_what_a_controller_would_refuse_or_take_otherwise_is_refused_with_its_line(body, words):
    with pytest.raises(CheckFailed, match=words) as caught:
        read(body)
    assert caught.value.subject.startswith("cut.ngc:")


def test_an_end_word_may_be_a_percent_sign():
    assert read_program("%\n" + HEAD + MOVE + "%\n", "cut.ngc", AXES)[-1].text == "%"
