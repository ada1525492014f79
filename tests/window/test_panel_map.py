import numpy as np
import pytest
from kit.finished import maps_of
from kit.sample import sample_job, sample_panel, sample_sweep
from kit.shown import sample_shown
from PySide6.QtGui import QColor

from cutblock.records.deviation import PanelDeviation
from cutblock.window.detailing import DetailingDesk
from cutblock.window.deviation import SIGNED_STEPS, signed_steps_of, signed_text
from cutblock.window.panel_map import PanelMap

PANELS = (sample_panel(), sample_panel("S2-A01", 2))


def colours(widget):
    image = widget.grab().toImage()
    return {image.pixelColor(x, y).name() for x in range(0, image.width(), 2) for y in range(0, image.height(), 2)}


def tilted():
    """Foam 3 mm too low at one end and 3 mm too high at the other."""
    panel = PANELS[0]
    values = panel.samples_mm[:, 0] / 200.0 - 3.0
    worst = int(np.argmax(np.abs(values)))
    return PanelDeviation(
        panel=panel.id,
        points_mm=panel.samples_mm,
        deviation_mm=values,
        samples_per_m2=400.0,
        worst_mm=float(values[worst]),
        worst_at_mm=panel.samples_mm[worst],
        p95_mm=2.9,
    )


@pytest.fixture
def shown_map(qtbot):
    made = PanelMap()
    qtbot.addWidget(made)
    made.resize(460, 420)
    return made


def test_steps_end_at_the_tolerance_and_the_tolerance_is_within():
    found = signed_steps_of(np.array([-2.01, -2.0, -1.0, -0.5, 0.0, 0.3, 1.5, 2.0, 2.01]), 2.0)
    assert found.tolist() == [0, 1, 2, 2, 3, 4, 5, 5, 6]
    assert signed_text(SIGNED_STEPS[0], 2.0) == "under -2.00 mm"
    assert signed_text(SIGNED_STEPS[4], 2.0) == "0.20 to 1.00 mm"
    assert signed_text(SIGNED_STEPS[-1], 2.0) == "over 2.00 mm"


def test_every_step_that_occurs_is_painted_low_left_and_high_right(shown_map):
    shown_map.show_panel(PANELS[0], tilted(), 2.0)

    image = shown_map._image
    assert image.pixelColor(0, 5).name() == QColor(SIGNED_STEPS[0].colour).name()
    assert image.pixelColor(image.width() - 1, 5).name() == QColor(SIGNED_STEPS[-1].colour).name()
    assert {QColor(step.colour).name() for step in SIGNED_STEPS} <= colours(shown_map)


def test_the_first_row_of_the_picture_is_the_far_edge(shown_map):
    panel = PANELS[0]
    deviation = tilted()
    along_y = PanelDeviation(
        panel=panel.id,
        points_mm=panel.samples_mm,
        deviation_mm=panel.samples_mm[:, 1] / 100.0,
        samples_per_m2=400.0,
        worst_mm=10.0,
        worst_at_mm=deviation.worst_at_mm,
        p95_mm=9.0,
    )
    shown_map.show_panel(panel, along_y, 2.0)

    image = shown_map._image
    assert image.pixelColor(3, 0).name() == QColor(SIGNED_STEPS[-1].colour).name()
    assert image.pixelColor(3, image.height() - 1).name() == QColor(SIGNED_STEPS[3].colour).name()


def test_the_caption_tells_the_worst_point_with_its_side(shown_map):
    assert shown_map.caption() == "No panel is chosen"
    shown_map.show_panel(PANELS[0], tilted(), 2.0)
    assert shown_map.caption() == "S1-A01: worst 3.00 mm below the form, 95 % within 2.90 mm"
    assert shown_map.accessibleDescription() == shown_map.caption()
    shown_map.show_panel(PANELS[0], None, 2.0)
    assert shown_map.caption() == "S1-A01: no sweep"


def test_a_plan_from_its_folder_has_the_worst_point_but_no_colours(shown_map):
    whole = tilted()
    bare = PanelDeviation(
        panel=whole.panel,
        points_mm=np.zeros((0, 3)),
        deviation_mm=np.zeros(0),
        samples_per_m2=400.0,
        worst_mm=whole.worst_mm,
        worst_at_mm=whole.worst_at_mm,
        p95_mm=whole.p95_mm,
    )
    shown_map.show_panel(PANELS[0], bare, 2.0)

    assert shown_map._image is None
    assert QColor(SIGNED_STEPS[0].colour).name() not in colours(shown_map)


def test_the_desk_shows_the_map_of_the_panel_that_is_picked(qtbot):
    desk = DetailingDesk()
    qtbot.addWidget(desk)
    deviations = maps_of(sample_job(), PANELS, (sample_sweep(),))
    for _ in desk.showing(sample_shown(deviations=deviations)):
        pass
    desk._pick_panel("S2-A01")

    assert desk.panel_map.caption() == "S2-A01: worst 0.60 mm below the form, 95 % within 0.60 mm"
