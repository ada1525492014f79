import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.records.words import Favour
from cutblock.sweeps.kerf_law import centreline_offset_mm, face_offset_mm, kerf_error_mm


@given(kerf=st.floats(0.2, 30.0), coat=st.floats(0.0, 5.0))
def test_the_favoured_lower_face_ends_on_the_form(kerf, coat):
    assert kerf_error_mm(Favour.LOWER, kerf, coat) == pytest.approx(0.0)


@given(kerf=st.floats(0.2, 30.0), coat=st.floats(0.0, 5.0))
def test_a_favoured_upper_face_ends_on_the_form(kerf, coat):
    # The upper half's finished face lies kerf/2 - coat above the centreline.
    assert centreline_offset_mm(Favour.UPPER, kerf, coat) + kerf / 2 - coat == pytest.approx(0.0)


def test_a_shared_kerf_leaves_both_faces_off_alike():
    assert kerf_error_mm(Favour.SHARE, 1.2, 0.0) == pytest.approx(-0.6)
    assert face_offset_mm(1.2, 0.6) == pytest.approx(0.0)
