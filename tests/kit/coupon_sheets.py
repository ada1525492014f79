"""Sheets of test cuts as CSV text."""

import numpy as np
from kit.coupons import design, linear_kerfs

HEAD = "coupon,kind,power W/m,speed mm/min,density kg/m3,kerf mm,wire,machine,grade,date"
SCATTER_MM = 0.05 * np.array([0.3, -0.8, 0.5, 1.1, -0.6, 0.2, -1.0, 0.7, 0.1, -0.4, 0.6])


def sheet_text(scatter_mm=SCATTER_MM, n_cuts=11, onset_mm_s=None, wire="NiCr80 0.40"):
    powers, speeds, densities = design()
    kerfs = linear_kerfs(powers, speeds, densities) * 1e3 + scatter_mm
    tail = f"{wire},four-axis-2600,EPS 100,2026-03-02"
    lines = [HEAD]
    for number in range(n_cuts):
        speed, kerf = float(6e4 * speeds[number]), float(kerfs[number])
        lines.append(f"C{number + 1:02d},cut,{powers[number]:g},{speed!r},{densities[number]:g},{kerf!r},{tail}")
    if onset_mm_s is not None:
        lines.append(f"C12,onset,60,{60 * onset_mm_s!r},20,,{tail}")
    return "\n".join(lines) + "\n"
