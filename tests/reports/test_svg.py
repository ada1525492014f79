"""Drawings as SVG."""

from dataclasses import replace
from xml.etree import ElementTree as ET

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.sample import sample_block, sample_plan
from reportlab.pdfbase.pdfmetrics import stringWidth

from cutblock.records.drawing import Drawing, Line, Modules, Polygon, Text
from cutblock.reports.blocks import block_drawing
from cutblock.reports.svg import svg_text, text_width

SVG = "{http://www.w3.org/2000/svg}"
SQUARE = np.array([[0.0, 0.0], [10.0, 0.0], [10.0, 10.0], [0.0, 10.0]])


def root_of(*marks, title=""):
    return ET.fromstring(svg_text(Drawing(width_mm=100.0, height_mm=50.0, marks=marks, title=title)))


def test_a_drawing_keeps_its_size_in_millimetres():
    root = root_of()

    assert root.attrib["viewBox"] == "0 0 100 50"
    assert (root.attrib["width"], root.attrib["height"]) == ("100mm", "50mm")


def test_every_kind_of_mark_has_its_element():
    root = root_of(
        Line(x1_mm=1.0, y1_mm=2.0, x2_mm=3.0, y2_mm=4.0, is_dashed=True),
        Polygon(points_mm=SQUARE, fill="#56B4E9", hatch="/", title="a tip"),
        Text(x_mm=5.0, y_mm=6.0, text="words", size_mm=3.6, anchor="end", turn_deg=-90.0, is_bold=True),
        Modules(x_mm=0.0, y_mm=0.0, side_mm=2.0, rows=("10", "01")),
        title="A drawing",
    )

    line = root.find(f"{SVG}line")
    assert (line.attrib["x1"], line.attrib["y2"], line.attrib["stroke-dasharray"]) == ("1", "4", "1.2 0.8")
    filled, hatched = root.findall(f"{SVG}polygon")
    assert filled.attrib["points"] == "0,0 10,0 10,10 0,10"
    assert filled.find(f"{SVG}title").text == hatched.find(f"{SVG}title").text == "a tip"
    pattern = root.find(f"{SVG}defs/{SVG}pattern")
    assert hatched.attrib["fill"] == f"url(#{pattern.attrib['id']})"
    words = root.find(f"{SVG}text")
    assert words.attrib["transform"] == "rotate(-90 5 6)"
    assert words.attrib["text-anchor"] == "end"
    assert float(words.attrib["font-size"]) == pytest.approx(3.6 / 0.72)
    assert root.find(f"{SVG}path").attrib["d"] == "M0,0h1v1h-1zM1,1h1v1h-1z"
    assert root.find(f"{SVG}title").text == "A drawing"


def test_text_shrinks_to_its_room_and_no_further():
    short = root_of(Text(x_mm=0.0, y_mm=9.0, text="ok", size_mm=3.6, room_mm=50.0)).find(f"{SVG}text")
    long = root_of(Text(x_mm=0.0, y_mm=9.0, text="W" * 40, size_mm=3.6, room_mm=50.0)).find(f"{SVG}text")

    assert float(short.attrib["font-size"]) == pytest.approx(5.0)
    assert text_width("W" * 40, float(long.attrib["font-size"])) == pytest.approx(50.0, rel=1e-3)


@pytest.mark.parametrize("font", ["Helvetica", "Helvetica-Bold"])
@pytest.mark.parametrize(
    "text",
    ["TW-S-A03", "TW-NORTH-WALL-AB12.3", "1200 × 1000 × 195", "From above, at a height of 118 mm", "lilili", "MWMW"],
)
def test_the_estimate_of_a_width_is_never_too_narrow(font, text):
    """Against Adobe's font metrics of Helvetica, as reportlab carries them."""
    true = stringWidth(text, font, 10.0)

    assert true <= text_width(text, 10.0, font.endswith("Bold")) <= 1.35 * true


@given(text=st.text(st.characters(), max_size=30))
def test_any_text_gives_well_formed_xml_that_says_the_same(text):
    root = root_of(Text(x_mm=0.0, y_mm=1.0, text=f"|{text}|", size_mm=2.0), title="t")

    shown = root.find(f"{SVG}text").text
    kept = "".join(
        sign if sign in "\t\n" or 0x20 <= ord(sign) < 0xD800 or ord(sign) > 0xDFFF else "\ufffd" for sign in text
    )
    kept = kept.replace("\ufffe", "\ufffd").replace("\uffff", "\ufffd")
    if "\r" not in text:  # XML reads a return as a new line
        assert shown == f"|{kept}|"


def test_a_name_cannot_become_markup():
    root = root_of(Polygon(points_mm=SQUARE, title='"/><script>x</script>'), title="<b>&amp;")

    assert root.find(f"{SVG}title").text == "<b>&amp;"
    assert [element.tag for element in root.iter() if "script" in element.tag] == []


def test_the_hatches_of_two_pictures_on_one_page_have_names_of_their_own():
    """HTML: an id is the name of one element only."""
    block, pieces = sample_block(), sample_plan().pieces
    texts = [svg_text(block_drawing(replace(block, id=name), pieces)) for name in ("SM-B01", "SM-B02")]
    names = [{element.attrib["id"] for element in ET.fromstring(text).iter(f"{SVG}pattern")} for text in texts]

    assert names[0]
    assert not names[0] & names[1]


def test_the_same_drawing_gives_the_same_text():
    block, pieces = sample_block(), sample_plan().pieces

    assert svg_text(block_drawing(block, pieces)) == svg_text(block_drawing(block, pieces))
