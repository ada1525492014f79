"""The sheet of test cuts: CSV to fill in, and a page to print with the steps and the cautions."""

import csv
from collections.abc import Sequence
from io import StringIO

from cutblock.base.units import mm_per_minute
from cutblock.records.shop import Machine, Wire
from cutblock.reports.cautions import CAUTIONS, DEFERENCE
from cutblock.reports.markup import pairs, paragraph, safe, section, table
from cutblock.reports.style import STYLE
from cutblock.wire.coupons import CouponCut

_HEADING = (
    "coupon", "kind", "power W/m", "speed mm/min", "density kg/m3", "kerf mm", "mass loss g", "cut area cm2", "wire",
    "machine", "grade", "date", "purpose",
)  # fmt: skip
_STEPS = (
    "Cut all coupons from one delivery of foam, but the one of other density.",
    "Weigh and measure each coupon before the cut: density is mass over volume, and the grade's is easily 10 % off.",
    "Set the power by volts and amperes across the wire alone while it is hot: W/m = V x A / length of wire in m.",
    "Write down the power, speed and density that you measured, not those that were wanted.",
    "Cut straight, the wire square to the travel, at a steady speed; measure mid-wire, 100 mm or more after the entry.",
    "Measure the kerf with plug or feeler gauges in five places and write the mean, to 0.01 mm.",
    "Or weigh the coupon before and after, to 0.01 g, and write the loss and the cut area (length x width of the cut).",
    "Gauge where you can: foam that melts and sets as a skin on the faces weighs as if it were never cut.",
    "Where the wire bows or crackles it touches the foam: cut again a third slower, and write that speed down.",
    "Onset coupon: start at the speed its line names, raise it by tenths, write down where the wire begins to touch.",
    "Write the day as year-month-day. A coupon without a kerf or a mass is passed over.",
)
_EXTRA_COLUMNS = ("measured W/m", "measured mm/min", "density kg/m3", "kerf mm", "mass loss g", "cut area cm2")


def coupon_csv(cuts: Sequence[CouponCut], wire: Wire, machine: Machine, grade: str) -> str:
    """Return the sheet as CSV (RFC 4180), the unit in every heading; density and results are left to fill in."""
    stream = StringIO()
    writer = csv.writer(stream)
    writer.writerow(_HEADING)
    usual = cuts[0].density_kg_m3
    for number, cut in enumerate(cuts, start=1):
        speed = "" if cut.kind == "onset" else f"{mm_per_minute(cut.speed_m_s * 1e3):.1f}"
        power = f"{cut.power_w_m:.0f}"
        own_grade = grade if cut.density_kg_m3 == usual else ""
        row = (f"C{number:02d}", cut.kind, power, speed, "", "", "", "", wire.name, machine.name, own_grade, "")
        writer.writerow((*row, _purpose(cut)))
    return stream.getvalue()


def coupon_html(cuts: Sequence[CouponCut], wire: Wire, machine: Machine, grade: str) -> str:
    """Return the sheet as one HTML page to print, which needs no other file and no script."""
    title = "Test cuts: sheet to fill in"
    facts = (
        ("Wire", f"{wire.name} mm"),
        ("Machine", machine.title),
        ("Foam", f"{grade} {cuts[0].density_kg_m3:g} kg/m³".strip()),
        ("Day", "____________________"),
        ("Cut by", "____________________"),
    )
    steps = "".join(f"<li>{safe(step)}</li>\n" for step in _STEPS)
    cautions = "".join(f"<li><b>{safe(word)}.</b> {safe(text)}</li>\n" for word, text in CAUTIONS[:5])
    parts = [
        f"<header>\n<p>Calibration</p>\n<h1>{title}</h1>\n</header>\n",
        pairs(facts),
        section("Cautions", f"<ul>\n{cautions}</ul>\n{paragraph(DEFERENCE, 'note')}", "cautions keep"),
        section("How to", f"<ol>\n{steps}</ol>\n"),
        section("Coupons", _coupon_table(cuts), "fill"),
        section(
            "Then",
            paragraph("Type the numbers into coupons.csv, and run: cutblock coupons fit coupons.csv --name NAME"),
        ),
    ]
    return (
        f'<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n<title>{title}</title>\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f"<style>\n{STYLE}.fill td {{ border: 1px solid #888888; padding: 7px 5px; }}\n"
        f".fill td:last-child {{ white-space: normal; }}\n</style>\n</head>\n<body>\n{''.join(parts)}</body>\n</html>\n"
    )


def _coupon_table(cuts: Sequence[CouponCut]) -> str:
    heading = ("coupon", "W/m", "mm/min", "kerf expected mm", *_EXTRA_COLUMNS, "for")
    rows = [
        (
            f"C{number:02d}",
            f"{cut.power_w_m:.0f}",
            f"{mm_per_minute(cut.speed_m_s * 1e3):.1f}" if cut.kind == "cut" else "rising",
            f"{cut.kerf_m * 1e3:.2f}" if cut.kind == "cut" else "",
            *("" for _ in _EXTRA_COLUMNS),
            _purpose(cut),
        )
        for number, cut in enumerate(cuts, start=1)
    ]
    return table(heading, rows, numbers=(1, 2, 3))


def _purpose(cut: CouponCut) -> str:
    if cut.kind == "onset":
        return f"{cut.purpose}, from {mm_per_minute(cut.speed_m_s * 1e3):.0f} mm/min"
    return f"{cut.purpose} ({cut.density_kg_m3:g} kg/m3)" if "density" in cut.purpose else cut.purpose
