import binascii
import re

from hypothesis import given
from hypothesis import strategies as st
from kit.sample import sample_job, sample_pieces, sample_sweep

from cutblock.pairing.duties import duty_findings, make_pieces, piece_code
from cutblock.records.words import Duty


def test_the_checksum_is_the_catalogued_one():
    """CRC-16/XMODEM of "123456789" is 31C3 (its check value in catalogues of CRC algorithms, from memory)."""
    assert f"{binascii.crc_hqx(b'123456789', 0):04X}" == "31C3"
    body = "CB1:SM-A01-L:A"
    assert piece_code("SM-A01-L", "A") == f"{body}:{binascii.crc_hqx(body.encode(), 0):04X}"


@given(piece=st.text("ABCXYZ0189-.", min_size=1, max_size=20), other=st.text("ABCXYZ0189-.", min_size=1, max_size=20))
def test_codes_fit_the_alphanumeric_mode_and_name_their_piece(piece, other):
    code = piece_code(piece, "B")

    assert re.fullmatch(r"[0-9A-Z $%*+\-./:]+", code)
    assert (code == piece_code(other, "B")) == (piece == other)


def test_each_half_knows_the_other():
    pieces = make_pieces(sample_job(), [sample_sweep(), sample_sweep("SM-T-A01", ("T-A01",))])

    by_id = {piece.id: piece for piece in pieces}
    assert list(by_id) == ["SM-S1-A01-L", "SM-S1-A01-U", "SM-T-A01-L", "SM-T-A01-U"]
    for piece in pieces:
        assert by_id[piece.partner].partner == piece.id
        assert by_id[piece.partner].half is not piece.half
        assert by_id[piece.partner].sweep == piece.sweep


def test_nothing_is_said_where_every_half_is_a_mould():
    sweep = sample_sweep()

    assert duty_findings(sample_job(), sample_pieces(sweep, Duty.MOULD)) == ()
