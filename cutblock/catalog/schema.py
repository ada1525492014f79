"""The shape of the catalogue's TOML files: every key, its type and the range it must lie in."""

import re
from collections.abc import Iterator
from datetime import date
from typing import Annotated

import msgspec
import numpy as np

from cutblock.wire.foam import LARGEST_HEAT_J_KG, LEAST_HEAT_J_KG

Name = Annotated[str, msgspec.Meta(min_length=1, max_length=60)]
Positive = Annotated[float, msgspec.Meta(gt=0.0, lt=1e7)]
NotNegative = Annotated[float, msgspec.Meta(ge=0.0, lt=1e7)]
Density = Annotated[float, msgspec.Meta(ge=8.0, le=60.0)]
Count = Annotated[int, msgspec.Meta(ge=1, le=100)]
Axis = Annotated[str, msgspec.Meta(pattern="^[XYZUVWABC]$")]
Words = Annotated[str, msgspec.Meta(pattern="^[ -~]+$")]  # printable ASCII, as controllers read it

# What is wrong with a table that its types allow: (key, what, remedy).
Complaint = tuple[str, str, str]

_Row = tuple[float, float, float]
_NEEDED_WORDS = ("G21", "G90", "G61")
# What a header may say beside them: plane, no offsets, no cycle, inverse time, the plain work system.
_ALLOWED_CODES = {"17", "18", "19", "40", "49", "54", "80", "93", *(word[1:] for word in _NEEDED_WORDS)}
_ENDS = ("M2", "M02", "M30", "%")
_WORDS_OF_CODE = re.compile(r"%|([A-Z][-+]?[0-9]*\.?[0-9]+ ?)+")
_LEAST_TABLE_HEIGHT_MM = 10.0  # the wire goes below the part, into the slats it lies on
_LEAST_TABLE_OFFSET_MM = 20.0  # the wire goes down before the part


class _Table(msgspec.Struct, forbid_unknown_fields=True, kw_only=True):
    """A TOML table in which every key must be known."""

    def complaints(self) -> Iterator[Complaint]:
        """Yield what does not fit together."""
        yield from ()


class GradeTable(_Table):
    """`[[grade]]` of grades.toml; the keys are the fields of `records.shop.Grade`."""

    name: Name
    density_kg_m3: Density
    density_low_kg_m3: Density
    density_high_kg_m3: Density
    strength_kpa: Positive
    bending_kpa: Positive
    stand: bool = False

    def complaints(self) -> Iterator[Complaint]:
        """Yield a density outside its own range."""
        low, high = self.density_low_kg_m3, self.density_high_kg_m3
        if not low <= self.density_kg_m3 <= high:
            text = f"{self.density_kg_m3:g} kg/m3 does not lie between {low:g} and {high:g} kg/m3"
            yield "density_kg_m3", text, "Give the typical density between the low and the high one."


class WireTable(_Table):
    """`[[wire]]` of wires.toml; the keys are the fields of `records.shop.Wire`."""

    name: Name
    alloy: Name
    diameter_mm: Annotated[float, msgspec.Meta(ge=0.05, le=5.0)]
    resistivity_ohm_m: Annotated[float, msgspec.Meta(ge=1e-8, le=1e-5)]
    density_kg_m3: Annotated[float, msgspec.Meta(ge=1000.0, le=25000.0)]
    clearance_mm: Annotated[float, msgspec.Meta(ge=0.0, le=2.0)]


class BlockTable(_Table):
    """`[[block]]` of blocks.toml; the keys are the fields of `records.shop.BlockSize`."""

    name: Name
    length_mm: Positive
    width_mm: Positive
    height_mm: Positive


class SheetTable(_Table):
    """`[[sheet]]` of labels.toml; the keys are the fields of `records.shop.LabelSheet`."""

    name: Name
    title: Name
    page_width_mm: Positive
    page_height_mm: Positive
    columns: Count
    rows: Count
    label_width_mm: Positive
    label_height_mm: Positive
    left_mm: NotNegative
    top_mm: NotNegative
    pitch_x_mm: Positive
    pitch_y_mm: Positive

    def complaints(self) -> Iterator[Complaint]:
        """Yield labels that overlap or leave the page."""
        yield from self._along("x", self.columns, self.label_width_mm, self.left_mm, self.page_width_mm)
        yield from self._along("y", self.rows, self.label_height_mm, self.top_mm, self.page_height_mm)

    def _along(self, axis: str, count: int, label: float, start: float, page: float) -> Iterator[Complaint]:
        pitch = self.pitch_x_mm if axis == "x" else self.pitch_y_mm
        side = "width" if axis == "x" else "height"
        if count > 1 and pitch < label - 1e-6:
            yield f"pitch_{axis}_mm", f"{pitch:g} mm is less than the label's {label:g} mm", "Labels must not overlap."
        end = start + (count - 1) * pitch + label
        if end > page + 1e-6:
            text = f"the labels end at {end:g} mm, the page at {page:g} mm"
            yield f"page_{side}_mm", text, "Correct the page, the margin, the pitch or the number of labels."


class MachineTable(_Table):
    """A file in machines/; the keys are the fields of `records.shop.Machine` but the name, which is the file's."""

    title: Name
    travel_mm: Positive
    lift_mm: Positive
    span_mm: Positive
    near_gap_mm: NotNegative
    table_offset_mm: NotNegative
    table_height_mm: float
    speed_mm_s: Positive
    acceleration_mm_s2: Positive
    air_speed_mm_s: Positive
    longest_wire_mm: Positive
    setup_s: NotNegative
    turn_s: NotNegative
    axes: tuple[Axis, Axis, Axis, Axis]
    decimals: Annotated[int, msgspec.Meta(ge=2, le=6)]
    header: tuple[Words, ...]
    footer: tuple[Words, ...]
    heater_on: Words
    heater_off: Words
    block_handling_s: NotNegative = 300.0  # common practice, no source, as are 60 s a piece
    piece_handling_s: NotNegative = 60.0

    def complaints(self) -> Iterator[Complaint]:
        """Yield sizes, speeds and words that cannot work together."""
        if self.near_gap_mm >= self.span_mm:
            yield "near_gap_mm", f"{self.near_gap_mm:g} mm leaves nothing of the span", "Give less than span_mm."
        if self.table_offset_mm >= self.travel_mm:
            yield "table_offset_mm", f"{self.table_offset_mm:g} mm leaves no travel", "Give less than travel_mm."
        if not 0.0 <= self.table_height_mm < self.lift_mm:
            text = f"{self.table_height_mm:g} mm leaves no lift"
            yield "table_height_mm", text, "Give the table's top above the towers' zero, less than lift_mm."
        if self.table_height_mm < _LEAST_TABLE_HEIGHT_MM:
            text = f"{self.table_height_mm:g} mm leaves no room for the wire below the part"
            yield "table_height_mm", text, f"Lay parts on slats; give their top, {_LEAST_TABLE_HEIGHT_MM:g} mm or more."
        if self.table_offset_mm < _LEAST_TABLE_OFFSET_MM:
            text = f"{self.table_offset_mm:g} mm leaves no room for the wire before the part"
            yield "table_offset_mm", text, f"Clamp parts further along; give {_LEAST_TABLE_OFFSET_MM:g} mm or more."
        if self.longest_wire_mm < self.span_mm:
            text = f"{self.longest_wire_mm:g} mm is shorter than the span of {self.span_mm:g} mm"
            yield "longest_wire_mm", text, "The wire is at least as long as the towers are apart."
        if self.air_speed_mm_s > self.speed_mm_s:
            text = f"{self.air_speed_mm_s:g} mm/s is over the axes' {self.speed_mm_s:g} mm/s"
            yield "air_speed_mm_s", text, "Give no more than speed_mm_s."
        yield from self._word_complaints()

    def _word_complaints(self) -> Iterator[Complaint]:
        if len(set(self.axes)) < len(self.axes):
            yield "axes", f"an axis stands twice in {', '.join(self.axes)}", "Give four different letters."
        words = " ".join(self.header).split()
        missing = [word for word in _NEEDED_WORDS if word not in words]
        if missing:
            remedy = "Programs are written in mm (G21), absolute (G90), and must follow the path exactly (G61)."
            yield "header", f"{', '.join(missing)} is missing", remedy
        if "{power}" not in self.heater_on:
            yield "heater_on", "has no {power}", 'Say where the power in W goes, such as "M3 S{power}".'
        if "{" in self.heater_on.replace("{power}", ""):
            yield "heater_on", "has a brace that is not {power}", 'Write it like "M3 S{power}".'
        if not self.footer or self.footer[-1] not in _ENDS:
            yield "footer", "does not end the program", f"Let its last word be one of {', '.join(_ENDS)}."
        yield from self._code_complaints()

    def _code_complaints(self) -> Iterator[Complaint]:
        """Yield words that would move the wire, let it stand hot, change the units or end the program too early."""
        heater_on = self.heater_on.replace("{power}", "100.0")
        lines = [("header", line) for line in self.header] + [("footer", line) for line in self.footer]
        for key, line in [*lines, ("heater_on", heater_on), ("heater_off", self.heater_off)]:
            if _WORDS_OF_CODE.fullmatch(line) is None:
                yield key, f'"{line}" is not made of words of a letter and a number', 'Write it like "M3 S100".'
                continue
            codes = re.findall(r"([A-Z])0*([0-9.]+)", line)
            for letter, number in codes:
                if letter == "G" and (key != "header" or number not in _ALLOWED_CODES):
                    yield key, f"G{number} has no place there", "The program itself moves the wire and sets its modes."
                if letter in self.axes or (letter == "M" and number in {"0", "1"}):
                    yield key, f"{letter}{number} moves or stops the machine", "The program itself does that."
                if letter == "M" and number in {"2", "30"} and (key, line) != ("footer", self.footer_end):
                    yield key, f"{letter}{number} ends the program there", "Put the end word last in the footer."
        heating = re.escape(self.heater_on).replace(re.escape("{power}"), "([0-9.]*[1-9][0-9.]*)")
        if re.fullmatch(heating, self.heater_off):
            yield "heater_off", f'"{self.heater_off}" heats the wire', "Give the word that switches the heat off."

    @property
    def footer_end(self) -> str:
        """The word that ends the program; a percent sign may follow it."""
        words = [word for word in self.footer if word != "%"]
        return words[-1] if words else "%"


class CalibrationTable(_Table):
    """A file in calibrations/; the keys are the fields of `records.shop.Calibration` but the name, the file's own."""

    wire: Name
    alloy: Name
    diameter_mm: Annotated[float, msgspec.Meta(ge=0.05, le=5.0)]
    machine: Name
    date: Annotated[str, msgspec.Meta(pattern=r"^\d{4}-\d{2}-\d{2}$")]
    least_kerf_mm: Annotated[float, msgspec.Meta(ge=-5.0, le=5.0)]
    heat_kj_kg: Annotated[float, msgspec.Meta(ge=LEAST_HEAT_J_KG * 1e-3, le=LARGEST_HEAT_J_KG * 1e-3)]
    threshold_w_m: Annotated[float, msgspec.Meta(gt=-500.0, lt=500.0)]
    covariance: tuple[_Row, _Row, _Row]
    degrees_of_freedom: Annotated[int, msgspec.Meta(ge=1)]
    n_coupons: Annotated[int, msgspec.Meta(ge=3)]
    chi_square: NotNegative
    density_kg_m3: tuple[Density, Density]
    power_w_m: tuple[Positive, Positive]
    speed_mm_s: tuple[Positive, Positive]
    grade: Annotated[str, msgspec.Meta(max_length=60)] = ""
    clearance_mm: Annotated[float, msgspec.Meta(ge=0.0, le=2.0)] | None = None
    doubts: tuple[str, ...] = ()

    def complaints(self) -> Iterator[Complaint]:
        """Yield a covariance that is none, ranges the wrong way round, and a date that is no day."""
        for key in ("density_kg_m3", "power_w_m", "speed_mm_s"):
            low, high = getattr(self, key)
            if low > high:
                yield key, f"{low:g} is above {high:g}", "Give the least and then the most of the test cuts."
        try:
            date.fromisoformat(self.date)
        except ValueError:
            yield "date", f"{self.date} is no day of the calendar", "Write year-month-day, such as 2026-03-02."
        if not _is_covariance(self.covariance):
            yield "covariance", "is not the covariance of three numbers", "Fit the coupons again."


class GradesFile(_Table):
    """grades.toml."""

    grade: tuple[GradeTable, ...] = ()


class WiresFile(_Table):
    """wires.toml."""

    wire: tuple[WireTable, ...] = ()


class BlocksFile(_Table):
    """blocks.toml."""

    block: tuple[BlockTable, ...] = ()


class LabelsFile(_Table):
    """labels.toml."""

    sheet: tuple[SheetTable, ...] = ()


def _is_covariance(rows: tuple[_Row, _Row, _Row]) -> bool:
    """Return whether a matrix is symmetric and, to rounding, has no negative direction once scaled to its diagonal."""
    matrix = np.array(rows)
    sizes = np.sqrt(np.maximum(np.diag(matrix), 0.0))
    if not (sizes > 0.0).all():
        return False
    scaled = matrix / np.outer(sizes, sizes)
    return bool(np.allclose(scaled, scaled.T, atol=1e-6) and np.linalg.eigvalsh(scaled).min() > -1e-6)
