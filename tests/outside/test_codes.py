"""Printed codes against the world: standards, and a reader that knows nothing of the writer."""

import binascii
import re
from dataclasses import replace

import numpy as np
import pypdfium2
import pytest
import zxingcpp
from kit.sample import sample_plan

from cutblock.catalog.load import label_sheet
from cutblock.pairing.duties import piece_code
from cutblock.records.drawing import Drawing, Modules
from cutblock.tags.describe import describe_tags
from cutblock.tags.pdf import tags_pdf
from cutblock.tags.qr import qr_rows


def printed(sheet_name, count):
    """Return the pieces and their sheet of tags, laid out for its labels."""
    plan, sheet = sample_plan(), label_sheet(sheet_name)
    ids = [f"TW-S-B{number:02d}-L" for number in range(count)]
    pieces = tuple(replace(plan.pieces[0], id=name, code=piece_code(name, "A")) for name in ids)
    label = (sheet.label_width_mm, sheet.label_height_mm)
    return pieces, tags_pdf(describe_tags("Tide wall", "A", pieces, plan.sweeps, plan.blocks, label), sheet)


def raster(raw, dpi):
    return pypdfium2.PdfDocument(raw)[0].render(scale=dpi / 72.0, grayscale=True).to_numpy()


def read(image):
    return {result.text for result in zxingcpp.read_barcodes(image, formats=zxingcpp.BarcodeFormat.QRCode)}


@pytest.mark.parametrize("dpi", [100, 150, 300])
@pytest.mark.parametrize(("sheet", "count"), [("a4-2x4", 8), ("a4-3x7", 21), ("a4-2x7", 14), ("roll-100x150", 1)])
def test_an_independent_reader_reads_every_symbol_off_the_printed_sheet(dpi, sheet, count):
    """Reader: ZXing-C++, on a raster of the PDF by PDFium."""
    pieces, raw = printed(sheet, count)

    assert read(raster(raw, dpi)) == {piece.code for piece in pieces}


def test_a_symbol_reads_with_dust_and_scratches_on_it():
    """Level Q mends up to a quarter of the symbol (ISO/IEC 18004); the corner marks must stay whole."""
    pieces, raw = printed("a4-2x4", 1)
    image = raster(raw, 300).copy()
    rng = np.random.default_rng(4)
    noisy = np.clip(image + rng.normal(0.0, 30.0, image.shape), 0, 255).astype(np.uint8)
    mm = 300 / 25.4
    # A white scratch 0.8 mm wide across the middle of the symbol, which stands at the label's right.
    middle = int((13.1 + 10.6 + 12.5) * mm)
    noisy[middle : middle + int(0.8 * mm), int(70 * mm) : int(104 * mm)] = 255

    assert read(noisy) == {pieces[0].code}


def test_a_symbol_of_the_longest_ids_reads_back():
    """Reader: ZXing-C++; 61 characters are the most that version 3 holds at level M (ISO/IEC 18004, table 7)."""
    code = piece_code("TW12-NORTH-GALLERY-WALL-AB12.12-U", "B2")
    piece = replace(sample_plan().pieces[0], code=code)
    plan = sample_plan()
    raw = tags_pdf(describe_tags("", "B2", (piece,), plan.sweeps, plan.blocks), label_sheet("a4-2x4"))

    assert read(raster(raw, 150)) == {code}


@pytest.mark.parametrize(
    ("version", "level", "characters"),
    [(1, "Q", 16), (2, "Q", 29), (3, "Q", 47), (4, "Q", 67)],
)
def test_symbols_have_the_sizes_and_hold_what_the_standard_says(version, level, characters):
    """ISO/IEC 18004: 17 + 4 V modules a side (5.3.1); alphanumeric characters by version and level (table 7)."""
    assert level == "Q"
    assert len(qr_rows("A" * characters, 99)) == 17 + 4 * version
    assert len(qr_rows("A" * (characters + 1), 99)) == 17 + 4 * (version + 1)


@pytest.mark.parametrize(("version", "characters"), [(1, 20), (2, 38), (3, 61), (4, 90)])
def test_where_the_room_is_short_level_m_holds_more(version, characters):
    """ISO/IEC 18004, table 7: alphanumeric characters at level M."""
    side = 17 + 4 * version
    assert len(qr_rows("A" * characters, side)) == side
    assert len(qr_rows("A" * (characters + 1), side)) == side + 4


def test_the_symbol_has_the_corner_and_timing_marks_of_the_standard():
    """ISO/IEC 18004, 5.3: 7 x 7 finder patterns in three corners, a ring and a core; alternating timing row 6."""
    rows = qr_rows(piece_code("TW-S-A03-L", "A"), 99)
    modules = np.array([[key == "1" for key in row] for row in rows])
    finder = np.zeros((7, 7), dtype=bool)
    finder[[0, -1], :] = finder[:, [0, -1]] = True
    finder[2:5, 2:5] = True

    for corner in (modules[:7, :7], modules[:7, -7:], modules[-7:, :7]):
        np.testing.assert_array_equal(corner, finder)
    np.testing.assert_array_equal(modules[6, 8:-8], np.arange(8, len(rows) - 8) % 2 == 0)


def test_printed_modules_have_the_size_drawn():
    """Measured on a raster at 1200 dots an inch: the symbol is as wide as it is said to be."""
    rows = qr_rows("CB1:TW-S-A03-L:A:0000", 99)
    mark = Modules(x_mm=20.0, y_mm=10.0, side_mm=25.0, rows=rows)
    raw = tags_pdf((Drawing(width_mm=99.1, height_mm=67.7, marks=(mark,)),), label_sheet("a4-2x4"))
    dpi = 1200
    dark = raster(raw, dpi)[: int(80 / 25.4 * dpi)] < 128
    columns = np.flatnonzero(dark.any(axis=0))

    assert (columns[-1] - columns[0] + 1) * 25.4 / dpi == pytest.approx(25.0, abs=2 * 25.4 / dpi)
    # Row 6 alternates module by module: no seam and no bleeding.
    y = int((13.1 + 10.0 + 6.5 * 25.0 / len(rows)) / 25.4 * dpi)
    runs = np.diff(np.flatnonzero(np.diff(dark[y, columns[0] + 1 : columns[-1]].astype(int))))
    assert np.median(runs) * 25.4 / dpi == pytest.approx(25.0 / len(rows), abs=2 * 25.4 / dpi)


def test_the_check_of_a_code_is_the_published_crc():
    """CRC-16/XMODEM, polynomial 0x1021, initial 0: check value 0x31C3 (catalogue of parametrised CRCs, G. Cook)."""
    assert binascii.crc_hqx(b"123456789", 0) == 0x31C3
    head, check = piece_code("TW-S-A03-L", "B").rsplit(":", 1)
    assert head == "CB1:TW-S-A03-L:B"
    assert int(check, 16) == bitwise_crc(head.encode())
    assert len(check) == 4


def bitwise_crc(octets):
    """CRC-16/XMODEM from its definition: divide by x^16 + x^12 + x^5 + 1, most significant bit first."""
    register = 0
    for octet in octets:
        register ^= octet << 8
        for _ in range(8):
            register = (register << 1) ^ 0x1021 if register & 0x8000 else register << 1
            register &= 0xFFFF
    return register


@pytest.mark.parametrize("position", range(14))
def test_one_wrong_letter_in_a_code_is_always_noticed(position):
    """A CRC-16 finds every error burst of 16 bits or fewer (Peterson and Brown, 1961)."""
    head, check = piece_code("TW-S-A03-L", "B").rsplit(":", 1)
    wrong = [
        head[:position] + letter + head[position + 1 :]
        for letter in "ABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789"
        if letter != head[position]
    ]

    assert all(bitwise_crc(text.encode()) != int(check, 16) for text in wrong)


@pytest.mark.parametrize("piece", ["TW-S-A03-L", "X-S2-B12.2-U", "TW-NORTH-WALL-AB12.3-U"])
def test_codes_use_the_alphanumeric_set_and_one_grammar(piece):
    """ISO/IEC 18004, table 5: digits, capitals and space $ % * + - . / : make the smallest symbols."""
    code = piece_code(piece, "B2")

    assert re.fullmatch(r"CB1:[A-Z0-9.\-]+-[LU]:[A-Z0-9]+:[0-9A-F]{4}", code)
    assert set(code) <= set("0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZ $%*+-./:")
