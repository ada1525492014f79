import numpy as np
import pytest
from PySide6.QtCore import QRectF
from PySide6.QtGui import QImage, QPainter

from cutblock.records.drawing import Drawing, Line, Modules, Polygon, Text
from cutblock.window.paint import drawing_image, fitted, painting


def painted(*marks, width_px=400):
    return drawing_image(Drawing(width_mm=100.0, height_mm=50.0, marks=marks), width_px)


def colour(image, x_mm, y_mm):
    return image.pixelColor(round(x_mm * image.width() / 100.0), round(y_mm * image.height() / 50.0)).name()


def dark_columns(image):
    """Return the columns, mm, that hold anything dark."""
    width = image.width()
    dark = [
        x for x in range(width) if any(image.pixelColor(x, y).lightness() < 100 for y in range(0, image.height(), 2))
    ]
    return np.array(dark) * 100.0 / width


def square(**changes):
    return Polygon(points_mm=np.array([[20, 10], [60, 10], [60, 40], [20, 40]], dtype=float), **changes)


def test_a_line_has_its_place_width_and_colour():
    image = painted(Line(x1_mm=10.0, y1_mm=25.0, x2_mm=90.0, y2_mm=25.0, width_mm=4.0, colour="#0072B2"))

    assert colour(image, 50, 25) == colour(image, 50, 26.5) == "#0072b2"
    assert colour(image, 50, 28) == colour(image, 5, 25) == "#ffffff"


def test_a_dashed_line_has_gaps():
    dashed = painted(Line(x1_mm=0.0, y1_mm=25.0, x2_mm=100.0, y2_mm=25.0, width_mm=2.0, is_dashed=True))

    row = {dashed.pixelColor(x, 100).name() for x in range(400)}
    assert {"#000000", "#ffffff"} <= row


def test_a_polygon_is_filled_within_its_corners():
    image = painted(square(fill="#E69F00", stroke=""))

    assert colour(image, 40, 25) == "#e69f00"
    assert colour(image, 15, 25) == colour(image, 65, 25) == "#ffffff"


@pytest.mark.parametrize("hatch", ["/", "\\", "x", "."])
def test_every_hatch_draws_on_the_fill_and_keeps_some_of_it(hatch):
    image = painted(square(fill="#56B4E9", stroke="#000000", hatch=hatch))

    inside = {image.pixelColor(x, y).name() for x in range(100, 220) for y in range(60, 140)}
    assert "#56b4e9" in inside
    assert len(inside) > 1


def test_a_capital_letter_is_as_high_as_the_text_says():
    image = painted(Text(x_mm=10.0, y_mm=40.0, text="H", size_mm=20.0), width_px=1000)

    rows = [y for y in range(image.height()) if any(image.pixelColor(x, y).lightness() < 100 for x in range(1000))]
    assert rows[0] / 10.0 == pytest.approx(20.0, abs=0.4)
    assert rows[-1] / 10.0 == pytest.approx(40.0, abs=0.4)


def test_text_too_long_for_its_room_is_shrunk_to_it():
    text = "a rather long name of a piece"
    free = dark_columns(painted(Text(x_mm=5.0, y_mm=30.0, text=text, size_mm=6.0)))
    fitted_in = dark_columns(painted(Text(x_mm=5.0, y_mm=30.0, text=text, size_mm=6.0, room_mm=40.0)))

    assert free.max() > 60.0
    assert fitted_in.max() <= 45.5


@pytest.mark.parametrize(("anchor", "low", "high"), [("start", 50, 100), ("middle", 25, 75), ("end", 0, 50)])
def test_text_lies_on_the_side_its_anchor_says(anchor, low, high):
    columns = dark_columns(painted(Text(x_mm=50.0, y_mm=30.0, text="anchor", size_mm=4.0, anchor=anchor)))

    assert low <= columns.min()
    assert columns.max() <= high


def test_turned_text_runs_down():
    columns = dark_columns(painted(Text(x_mm=50.0, y_mm=5.0, text="turned", size_mm=4.0, turn_deg=90.0)))

    assert columns.max() - columns.min() < 8.0


def test_dark_modules_touch_without_a_light_seam():
    image = painted(Modules(x_mm=20.0, y_mm=5.0, side_mm=40.0, rows=("110", "110", "001")), width_px=417)

    assert colour(image, 25, 10) == colour(image, 40, 25) == colour(image, 55, 40) == "#000000"
    assert colour(image, 55, 10) == colour(image, 25, 40) == "#ffffff"
    block = {
        image.pixelColor(x, y).name() for x in range(84, 84 + 108) for y in range(22, 22 + 108) if x < 190 and y < 128
    }
    assert block == {"#000000"}


def test_a_drawing_is_fitted_without_being_stretched():
    drawing = Drawing(width_mm=100.0, height_mm=50.0, marks=())

    assert fitted(drawing, QRectF(0, 0, 300, 300)) == QRectF(0, 75, 300, 150)
    assert fitted(drawing, QRectF(0, 0, 1000, 100)) == QRectF(400, 0, 200, 100)


def test_a_painter_is_ended_even_when_the_painting_fails():
    image = QImage(10, 10, QImage.Format.Format_RGB32)
    painters = []

    def fail():
        with painting(image) as painter:
            painters.append(painter)
            raise ZeroDivisionError

    with pytest.raises(ZeroDivisionError):
        fail()

    assert not painters[0].isActive()
    again = QPainter(image)
    assert again.isActive()
    again.end()
