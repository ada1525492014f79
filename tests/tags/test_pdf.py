import numpy as np
import pypdfium2
import pytest
from kit.sample import sample_plan

from cutblock.base.errors import InputError
from cutblock.catalog.load import label_sheet
from cutblock.records.drawing import Drawing, Polygon
from cutblock.tags.describe import describe_tags
from cutblock.tags.pdf import codes_of_pdf, lost_letters, tags_pdf
from cutblock.tags.pdf_paint import printable


@pytest.fixture
def drawings():
    plan = sample_plan()
    return describe_tags(plan.job.title, plan.job.revision, plan.pieces, plan.sweeps, plan.blocks)


def test_the_codes_read_back_are_the_codes_printed(drawings):
    raw = tags_pdf(drawings, label_sheet("a4-2x4"))

    assert codes_of_pdf(raw) == tuple(drawing.title for drawing in drawings)


def test_the_same_tags_give_the_same_bytes(drawings):
    assert tags_pdf(drawings, label_sheet("a4-2x4")) == tags_pdf(drawings, label_sheet("a4-2x4"))


@pytest.mark.parametrize(
    ("sheet", "start", "pages"), [("a4-2x4", 1, 1), ("a4-2x4", 5, 1), ("a4-2x4", 6, 2), ("a4-2x2-a6", 4, 2)]
)
def test_tags_start_on_the_label_asked_for(drawings, sheet, start, pages):
    document = pypdfium2.PdfDocument(tags_pdf(drawings, label_sheet(sheet), start))

    assert len(document) == pages


@pytest.mark.parametrize("start", [0, 9, -1])
def test_a_label_the_sheet_has_not_is_refused(drawings, start):
    with pytest.raises(InputError, match="Start at 1 to 8"):
        tags_pdf(drawings, label_sheet("a4-2x4"), start)


@pytest.mark.parametrize("end", [0, 10, 400, -20])
def test_a_pdf_cut_short_is_noticed(drawings, end):
    with pytest.raises(InputError):
        codes_of_pdf(tags_pdf(drawings, label_sheet("a4-2x4"))[:end])


def test_letters_the_font_lacks_are_replaced_in_sight():
    assert printable("Weißwandstraße “A” – 5 €") == "Weißwandstraße “A” – 5 €"
    assert printable("Łódź Čáslav Őri") == "Lódz Cáslav Ori"
    assert printable("水\x07") == "? "
    assert printable("e\u0301") == "é"


def test_letters_that_cannot_be_printed_are_told_and_noted_on_the_sheet(drawings):
    plan = sample_plan()
    odd = describe_tags("Wand 水池 B", "A", plan.pieces, plan.sweeps, plan.blocks)

    assert lost_letters(odd) == "水池"
    assert lost_letters(drawings) == ""
    page = text_of(tags_pdf(odd, label_sheet("a4-2x4")))
    assert "Wand ?? B" in page
    assert "A ? on a tag stands for a letter that cannot be printed." in page
    assert "stands for" not in text_of(tags_pdf(drawings, label_sheet("a4-2x4")))


def test_letters_of_western_europe_reach_the_page_as_they_are():
    plan = sample_plan()
    title = "Größe “A” – Œuvre Ž 5 €"

    drawn = describe_tags(title, "A", plan.pieces, plan.sweeps, plan.blocks)

    assert title in text_of(tags_pdf(drawn, label_sheet("a4-2x4")))


def test_the_check_line_is_a_hundred_millimetres_long(drawings):
    """Read off the raster of an independent renderer (PDFium)."""
    sheet = label_sheet("a4-2x4")
    dots_per_mm = 20.0
    page = pypdfium2.PdfDocument(tags_pdf(drawings, sheet))[0]
    image = page.render(scale=dots_per_mm * 25.4 / 72.0, grayscale=True).to_numpy()
    margin = image[int((sheet.page_height_mm - 13.0) * dots_per_mm) :]

    longest = max(int(np.sum(row < 128)) for row in margin)

    assert longest / dots_per_mm == pytest.approx(100.0, abs=0.3)


def test_a_sheet_without_a_margin_has_no_check_line(drawings):
    assert "100 mm long" in text_of(tags_pdf(drawings, label_sheet("a4-2x4")))
    assert "100 mm long" not in text_of(tags_pdf(drawings, label_sheet("a4-2x4-a7")))
    assert "100 mm long" not in text_of(tags_pdf(drawings, label_sheet("roll-100x50")))


def test_labels_stand_where_the_sheet_has_them(drawings):
    """Dark dots fall inside the label asked for, measured on a raster."""
    sheet = label_sheet("a4-3x7")
    page = pypdfium2.PdfDocument(tags_pdf(drawings[:1], sheet, start=8))[0]
    dots_per_mm = 4.0
    image = page.render(scale=dots_per_mm * 25.4 / 72.0, grayscale=True).to_numpy()
    rows, columns = np.nonzero(image[: int((sheet.page_height_mm - 15.0) * dots_per_mm)] < 128)
    left = sheet.left_mm + sheet.pitch_x_mm
    top = sheet.top_mm + 2 * sheet.pitch_y_mm

    assert left <= columns.min() / dots_per_mm <= columns.max() / dots_per_mm <= left + sheet.label_width_mm
    assert top <= rows.min() / dots_per_mm <= rows.max() / dots_per_mm <= top + sheet.label_height_mm


def test_a_hatch_stays_inside_its_polygon():
    frame = np.array([[10.0, 10.0], [30.0, 10.0], [30.0, 25.0], [10.0, 25.0]])
    for hatch in ("/", "\\", "x", "."):
        mark = Polygon(points_mm=frame, hatch=hatch, width_mm=0.0)
        drawing = Drawing(width_mm=99.1, height_mm=67.7, marks=(mark,))
        page = pypdfium2.PdfDocument(tags_pdf((drawing,), label_sheet("a4-2x4")))[0]
        image = page.render(scale=4.0 * 25.4 / 72.0, grayscale=True).to_numpy()[: 4 * 280]
        rows, columns = np.nonzero(image < 200)
        left, top = 4.65, 13.1
        assert columns.size > 50, hatch
        assert 10.0 + left - 0.3 <= columns.min() / 4.0
        assert columns.max() / 4.0 <= 30.0 + left + 0.3
        assert 10.0 + top - 0.3 <= rows.min() / 4.0
        assert rows.max() / 4.0 <= 25.0 + top + 0.3


def text_of(raw):
    document = pypdfium2.PdfDocument(raw)
    return "\n".join(page.get_textpage().get_text_range() for page in document)
