from dataclasses import replace

import numpy as np
from kit.sample import sample_block

from cutblock.halves.bodies import billet_bodies


def test_blocks_stand_in_a_row_along_y_with_a_gap_between():
    first = sample_block()
    second = replace(first, id="SM-B02")

    bodies = {body.name: body.mesh for body in billet_bodies((first, second))}

    assert len(bodies) == 4
    moved = bodies["SM-B02_SM-T-A01"].vertices - bodies["SM-B01_SM-T-A01"].vertices
    np.testing.assert_allclose(moved, np.broadcast_to([0.0, 1250.0 + 200.0, 0.0], moved.shape))
