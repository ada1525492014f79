"""What a wire does in foam, outside any job."""

from dataclasses import dataclass

from cutblock.base.errors import InputError
from cutblock.catalog import load as catalog
from cutblock.flow.weighing import block_density
from cutblock.records.record import Record
from cutblock.schedule.wire_report import WireReport, wire_report, wire_report_values

__all__ = ["WireQuestion", "WireReport", "report_wire", "wire_report", "wire_report_values"]


@dataclass(frozen=True, slots=True, kw_only=True)
class WireQuestion(Record):
    """What someone asks about a wire: names are of the catalogue, None stands for what was not said."""

    power_w_m: float
    density_kg_m3: float | None = None
    mass_kg: float | None = None  # of the block on the table, with `size_mm`: instead of the density
    size_mm: tuple[float, float, float] | None = None
    diameter_mm: float | None = None  # else by `wire` or by the calibration
    wire: str | None = None
    speed_mm_s: float | None = None
    calibration: str | None = None
    machine: str | None = None  # gives the length of the wire
    length_mm: float | None = None
    tension_n: float | None = None


def report_wire(question: WireQuestion) -> WireReport:
    """Return the answer to a question about a wire.

    Raises:
        InputError: Something is missing, said twice, not in the catalogue or out of range.
    """
    calibration = None if question.calibration is None else catalog.calibration(question.calibration)
    machine = None if question.machine is None else catalog.machine(question.machine)
    named = None if question.wire is None else catalog.wire(question.wire)
    if named is not None and question.diameter_mm is not None and named.diameter_mm != question.diameter_mm:
        text = f'wire "{named.name}" is {named.diameter_mm:g} mm thick, not {question.diameter_mm:g} mm'
        raise InputError(text, "wire", "Give the wire's name or a diameter.")
    alloy, diameter_mm = "NiCr80", question.diameter_mm
    if named is not None:
        alloy, diameter_mm = named.alloy, named.diameter_mm
    elif diameter_mm is None and calibration is not None:
        alloy, diameter_mm = calibration.alloy, calibration.diameter_mm
    if diameter_mm is None:
        raise InputError("no wire is given", "wire", "Give --diameter MM, --wire NAME or --calibration NAME.")
    span_mm = question.length_mm if machine is None or question.length_mm is not None else machine.span_mm
    clearance = {} if named is None else {"clearance_mm": named.clearance_mm}
    return wire_report(
        _density(question),
        question.power_w_m,
        diameter_mm,
        question.speed_mm_s,
        alloy,
        span_mm,
        calibration=calibration,
        tension_n=question.tension_n,
        machine="" if machine is None else machine.name,
        **clearance,
    )


def _density(question: WireQuestion) -> float:
    is_weighed = question.mass_kg is not None or question.size_mm is not None
    if is_weighed and question.density_kg_m3 is not None:
        raise InputError("both a density and a weighed block are given", "density", "Give one of the two.")
    if question.mass_kg is not None and question.size_mm is not None:
        return block_density(question.mass_kg, question.size_mm)
    if is_weighed:
        missing = "--size L W H in mm" if question.size_mm is None else "--mass KG"
        raise InputError("a weighed block takes its mass and its size", "density", f"Add {missing}.")
    if question.density_kg_m3 is None:
        raise InputError("no density is given", "density", "Give --density KG_M3, or --mass KG --size L W H.")
    return question.density_kg_m3
