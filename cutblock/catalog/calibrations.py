"""Writes a calibration as a TOML file of the catalogue."""

import json

from cutblock.records.shop import Calibration

_HEAD = """\
# A calibration of cutblock: the kerf law w0 + (q' - q0) / (density H speed), fitted to test cuts.
# Name it in a job, [cutting] calibration = "{name}": from your own calibrations folder, or as a file beside the job.
"""


def calibration_toml(calibration: Calibration) -> str:
    """Return a calibration as the text of its file; reading it gives the same numbers to the last digit."""
    rows = ",\n  ".join(str(row) for row in calibration.covariance.tolist())
    lines = [
        f"wire = {_text(calibration.wire)}",
        f"alloy = {_text(calibration.alloy)}",
        f"diameter_mm = {calibration.diameter_mm!r}",
        f"machine = {_text(calibration.machine)}",
        f"grade = {_text(calibration.grade)}",
        f"date = {_text(calibration.date)}",
        f"least_kerf_mm = {calibration.least_kerf_mm!r}  # w0",
        f"heat_kj_kg = {calibration.heat_kj_kg!r}  # H",
        f"threshold_w_m = {calibration.threshold_w_m!r}  # q0",
        f"covariance = [  # of (w0 mm, H kJ/kg, q0 W/m)\n  {rows},\n]",
        f"degrees_of_freedom = {calibration.degrees_of_freedom}",
        f"n_coupons = {calibration.n_coupons}",
        f"chi_square = {calibration.chi_square!r}  # reduced",
        f"density_kg_m3 = {list(calibration.density_kg_m3)}  # least and most of the cuts",
        f"power_w_m = {list(calibration.power_w_m)}",
        f"speed_mm_s = {list(calibration.speed_mm_s)}",
    ]
    if calibration.clearance_mm is not None:
        lines.append(f"clearance_mm = {calibration.clearance_mm!r}  # on each side, where the wire began to touch")
    doubts = "".join(f"  {_text(doubt)},\n" for doubt in calibration.doubts)
    lines.append(f"doubts = [\n{doubts}]" if doubts else "doubts = []")
    return _HEAD.format(name=calibration.name) + "\n".join(lines) + "\n"


def _text(words: str) -> str:
    """Return text as a TOML basic string, whose escapes are those of JSON but for the delete character."""
    return json.dumps(words, ensure_ascii=False).replace("\x7f", "\\u007f")
