import pytest
from kit.sample import sample_plan

from cutblock.base.errors import InputError
from cutblock.catalog.load import label_sheet
from cutblock.tags.describe import describe_tags
from cutblock.tags.pdf import codes_of_pdf, tags_pdf
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
    import pypdfium2

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
    assert printable("Weißwandstraße") == "Weißwandstraße"
    assert printable("Łódź Čáslav") == "?ódz Cáslav"
    assert printable("水\x07") == "? "
