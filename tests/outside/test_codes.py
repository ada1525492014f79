"""Printed codes against the world: standards, and a reader that knows nothing of the writer."""

import binascii
from dataclasses import replace

import pypdfium2
import pytest
import zxingcpp
from kit.sample import sample_plan

from cutblock.catalog.load import label_sheet
from cutblock.pairing.duties import piece_code
from cutblock.tags.describe import describe_tags
from cutblock.tags.pdf import tags_pdf
from cutblock.tags.qr import qr_rows


def many_pieces(count):
    piece = sample_plan().pieces[0]
    ids = [f"TW-S-B{number:02d}-L" for number in range(count)]
    return tuple(replace(piece, id=name, code=piece_code(name, "A")) for name in ids)


@pytest.mark.parametrize("dpi", [150, 300])
@pytest.mark.parametrize(("sheet", "count"), [("a4-2x4", 8), ("a4-3x7", 21)])
def test_an_independent_reader_reads_every_symbol_off_the_printed_sheet(dpi, sheet, count):
    """Reader: ZXing-C++, on a raster of the PDF by PDFium."""
    plan = sample_plan()
    pieces = many_pieces(count)
    drawings = describe_tags(plan.job.title, "A", pieces, plan.sweeps, plan.blocks)

    page = pypdfium2.PdfDocument(tags_pdf(drawings, label_sheet(sheet)))[0]
    image = page.render(scale=dpi / 72.0).to_numpy()
    read = {result.text for result in zxingcpp.read_barcodes(image, formats=zxingcpp.BarcodeFormat.QRCode)}

    assert read == {piece.code for piece in pieces}


def test_symbols_have_the_sizes_of_the_standard():
    """ISO/IEC 18004: 17 + 4 V modules a side; versions 2 and 3 hold 29 and 47 alphanumeric characters at Q."""
    assert len(qr_rows("A" * 29, 99)) == 17 + 4 * 2
    assert len(qr_rows("A" * 30, 99)) == 17 + 4 * 3
    assert len(qr_rows("A" * 47, 99)) == 17 + 4 * 3
    assert len(qr_rows("A" * 48, 99)) == 17 + 4 * 4


def test_the_check_of_a_code_is_the_published_crc():
    """CRC-16/XMODEM, polynomial 0x1021, initial 0: check value 0x31C3 (catalogue of parametrised CRCs)."""
    assert binascii.crc_hqx(b"123456789", 0) == 0x31C3
    head, check = piece_code("TW-S-A03-L", "B").rsplit(":", 1)
    assert head == "CB1:TW-S-A03-L:B"
    assert int(check, 16) == binascii.crc_hqx(head.encode(), 0)
    assert len(check) == 4


def test_codes_use_the_alphanumeric_set_only():
    """ISO/IEC 18004, table 5: digits, capitals and space $ % * + - . / : make the smallest symbols."""
    allowed = set("0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZ $%*+-./:")

    assert set(piece_code("TW-NORTH-WALL-AB12.3-U", "B2")) <= allowed
