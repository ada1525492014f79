"""Which test cuts to make, and the sheet to fill in."""

from dataclasses import dataclass
from pathlib import Path

from cutblock.base.errors import InputError
from cutblock.catalog import load as catalog
from cutblock.flow.folder import replace_file
from cutblock.records.record import Record
from cutblock.records.shop import EPS_DENSITY_KG_M3, Machine, Wire
from cutblock.reports.coupon_sheet import coupon_csv, coupon_html
from cutblock.wire.coupons import CouponCut, design_coupons

SHEET_CSV, SHEET_HTML = "coupons.csv", "coupons.html"

_OTHER_DENSITY_KG_M3 = 5.0  # heavier, where nothing else is asked for
_POWER_W_M = (25.0, 150.0)
_MM = 1e3


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class CouponPlan(Record):
    """The cuts to make, with the sheet to fill in."""

    wire: Wire
    machine: Machine
    cuts: tuple[CouponCut, ...]
    csv: str
    html: str


def plan_coupons(
    wire_name: str,
    machine_name: str,
    power_w_m: float,
    density_kg_m3: float | None = None,
    grade_name: str | None = None,
    other_density_kg_m3: float | None = None,
) -> CouponPlan:
    """Return the test cuts to make for a wire, a machine and a foam.

    Args:
        wire_name: Of the catalogue.
        machine_name: Likewise, or a TOML file.
        power_w_m: Of the work to come.
        density_kg_m3: Of the foam, where no grade is named.
        grade_name: Of the catalogue.
        other_density_kg_m3: Of the one coupon of other foam; None: 5 kg/m3 more.

    Raises:
        InputError: A name is not in the catalogue, or a number out of range.
    """
    wire, machine = catalog.wire(wire_name), catalog.machine(machine_name)
    grade = "" if grade_name is None else catalog.grade(grade_name).name
    density = catalog.grade(grade).density_kg_m3 if grade else density_kg_m3
    if density is None:
        raise InputError("no foam is given", "density", "Give --density KG_M3 or --grade NAME.")
    other = density + _OTHER_DENSITY_KG_M3 if other_density_kg_m3 is None else other_density_kg_m3
    low, high = EPS_DENSITY_KG_M3
    for value, least, most, name, unit in (
        (density, low, high, "density", "kg/m3"),
        (other, low, high, "other density", "kg/m3"),
        (power_w_m, *_POWER_W_M, "power", "W/m"),
    ):
        if not least <= value <= most:
            raise InputError(f"{name} {value:g} {unit} is outside {least:g} to {most:g} {unit}", name, "Correct it.")
    cuts = design_coupons(wire.diameter_mm / _MM, density, other, power_w_m, wire.clearance_mm / _MM)
    return CouponPlan(
        wire=wire,
        machine=machine,
        cuts=cuts,
        csv=coupon_csv(cuts, wire, machine, grade),
        html=coupon_html(cuts, wire, machine, grade),
    )


def write_coupon_sheet(plan: CouponPlan, folder: str | Path) -> tuple[Path, Path]:
    """Write the sheet as CSV and as a page to print; raises InputError where that fails or a sheet is there."""
    target = made_folder(folder)
    paths = target / SHEET_CSV, target / SHEET_HTML
    if paths[0].exists():
        raise InputError("is there already, perhaps filled in.", str(paths[0]), "Choose another folder, or move it.")
    for path, text in zip(paths, (plan.csv, plan.html), strict=True):
        replace_file(path, text.encode())
    return paths


def made_folder(folder: str | Path) -> Path:
    """Return a folder, made where it was not; raises InputError where that fails."""
    target = Path(folder)
    try:
        target.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        reason = error.strerror or type(error).__name__
        raise InputError(f"cannot be made a folder ({reason}).", str(target), "Choose another place.") from error
    return target
