import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as arrays
from kit.machining import roomy_machine

from cutblock.machinecode.clamping import ClampedBox
from cutblock.machinecode.passes import tower_positions
from cutblock.machinecode.placing import plain_place

RAILS = arrays.arrays(np.float64, (5, 2), elements=st.floats(-500.0, 500.0))


@given(near=RAILS, far=RAILS, wire_mm=st.floats(0.0, 800.0), width_mm=st.floats(50.0, 1500.0))
def test_the_wire_between_the_towers_passes_through_both_rails_wherever_the_box_stands(near, far, wire_mm, width_mm):
    machine = roomy_machine()
    box = ClampedBox(70.0, wire_mm, 110.0, 1000.0, width_mm, 300.0)

    towers = tower_positions(near, far, box, plain_place(machine), machine)

    origin = [machine.table_offset_mm + 70.0, machine.table_height_mm + 110.0]
    for rail, from_near_edge in ((near, wire_mm), (far, wire_mm + width_mm)):
        share = (machine.near_gap_mm + from_near_edge) / machine.span_mm
        on_wire = towers[:, :2] + share * (towers[:, 2:] - towers[:, :2])
        np.testing.assert_allclose(on_wire, rail + origin, atol=1e-7)


def test_level_rails_stay_level_out_to_the_towers():
    box = ClampedBox(0.0, 0.0, 0.0, 1000.0, 800.0, 300.0)
    rail = np.array([[-20.0, 150.0], [1020.0, 150.0]])

    towers = tower_positions(rail, rail, box, plain_place(roomy_machine()), roomy_machine())

    assert towers == pytest.approx(np.array([[280.0, 550.0, 280.0, 550.0], [1320.0, 550.0, 1320.0, 550.0]]))
