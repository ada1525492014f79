import pickle

import pytest

from cutblock.base.errors import CheckFailed, CutblockError, GeometryError, InputError, NotCuttable, StockError


@pytest.mark.parametrize("kind", [CutblockError, InputError, GeometryError, NotCuttable, StockError, CheckFailed])
def test_an_error_survives_the_way_between_processes(kind):
    error = kind("wall is 40 mm, wanted 60 mm", "S-A03", "Raise the billet.")

    back = pickle.loads(pickle.dumps(error))

    assert type(back) is kind
    assert (back.message, back.subject, back.remedy) == ("wall is 40 mm, wanted 60 mm", "S-A03", "Raise the billet.")
    assert str(back) == "S-A03: wall is 40 mm, wanted 60 mm. Raise the billet."
