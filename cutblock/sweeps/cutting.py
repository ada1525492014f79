"""Ruled sheets for strips of panels: fitted, laid out as rails, measured as finished faces."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.geometry.deviation import deviation_measures, face_deviation
from cutblock.geometry.fit import fit_patches
from cutblock.geometry.rails import SheetFit, polyline_rails
from cutblock.geometry.ruled import end_slowness
from cutblock.sweeps.aim import Aim
from cutblock.sweeps.lie import Lie, Strip
from cutblock.wire.motion import kerf_gain

SAG_MM = 0.002
FAR_OFF = 1.5  # times the room of the fit: such strips are not measured, they cannot do
REPORT_EVERY = 16
CLEAR_MM = 10.0  # the wire starts and ends at least this and the kerf away from the billet


@dataclass(frozen=True, slots=True, eq=False)
class CutStrip:
    """A strip with the rails that cut it, z still the panel's, and how well the finished face fits."""

    strip: Strip
    sheet: SheetFit
    near: Floats
    far: Floats
    max_mm: float
    rms_mm: float
    p95_mm: float
    fit_max_mm: float
    fit_rms_mm: float

    @property
    def skew_mm(self) -> float:
        """Largest size of x far - x near."""
        return float(np.abs(self.far[:, 0] - self.near[:, 0]).max())


@dataclass(frozen=True, slots=True, eq=False)
class CutPanel:
    """All strips of a panel in one wire direction."""

    strips: tuple[CutStrip, ...]

    @property
    def max_mm(self) -> float:
        """Largest deviation of all strips."""
        return max(strip.max_mm for strip in self.strips)

    @property
    def skew_mm(self) -> float:
        """Largest skew of all strips."""
        return max(strip.skew_mm for strip in self.strips)

    @property
    def wire_along(self) -> str:
        """The panel axis the wire lies along."""
        return self.strips[0].strip.lie.wire_along


def cut_panels(
    lies: Sequence[tuple[Lie, int]],
    aim: Aim,
    *,
    is_polished: bool = False,
    tried: Sequence[CutPanel] | None = None,
    joints_mm: Sequence[tuple[float, ...]] = (),
    report: Callable[[], None] = lambda: None,
) -> list[CutPanel]:
    """Return every given lie cut in the given number of strips, whether it meets the tolerance or not.

    Args:
        lies: Lies, each with a number of strips.
        aim: What is fitted for.
        is_polished: Whether sheets that just miss are fitted for the least largest deviation, which takes longer.
        joints_mm: Where the strips of each lie meet; empty: all about equally wide.
        tried: The same lies cut by least squares before, to start from.
        report: Called every now and then.
    """
    places = joints_mm if joints_mm else [()] * len(lies)
    strips = [
        Strip(lie, number, count, place)
        for (lie, count), place in zip(lies, places, strict=True)
        for number in range(1, count + 1)
    ]
    starts = None
    if tried is not None:
        strips = [cut.strip for panel in tried for cut in panel.strips]
        starts = [cut.sheet for panel in tried for cut in panel.strips]
    sheets = fit_patches(
        [strip.patch(aim.stretch) for strip in strips],
        aim.room_mm,
        is_polished=is_polished,
        squareness=aim.squareness,
        starts=starts,
        report=report,
    )
    cuts = []
    for number, (strip, sheet) in enumerate(zip(strips, sheets, strict=True)):
        cuts.append(_cut_strip(strip, sheet, aim))
        if number % REPORT_EVERY == 0:
            report()
    panels, first = [], 0
    for _, count in lies:
        panels.append(CutPanel(tuple(cuts[first : first + count])))
        first += count
    return panels


def _cut_strip(strip: Strip, sheet: SheetFit, aim: Aim) -> CutStrip:
    """Return a strip with its rails and the deviations of its finished face; those of the fit where it is far off."""
    if sheet.max_mm > FAR_OFF * aim.room_mm:
        off = sheet.max_mm + abs(aim.kerf_error_mm)
        ends = np.stack(sheet.rails_at(np.array([sheet.start_mm, sheet.end_mm])))
        return CutStrip(strip, sheet, ends[0], ends[1], off, sheet.rms_mm, off, sheet.max_mm, sheet.rms_mm)
    away = CLEAR_MM + aim.kerf_mm
    near, far = polyline_rails(sheet, -away, strip.lie.size_mm[0] + away, SAG_MM)
    return measured_cut(strip, sheet, near, far, aim)


def measured_cut(strip: Strip, sheet: SheetFit, near: Floats, far: Floats, aim: Aim) -> CutStrip:
    """Return a strip cut along rails, with the deviations of its finished face from the panel's samples.

    Args:
        strip: The strip.
        sheet: What the rails were taken from.
        near: (n, 2) x and z of the rail at y = 0.
        far: (n, 2) likewise at y = the strip's width.
        aim: Where kerf and coat leave the face.
    """
    samples, normals, areas = strip.samples()
    if not len(samples):
        return CutStrip(strip, sheet, near, far, 0.0, 0.0, 0.0, 0.0, 0.0)
    deviations = face_deviation(near, far, strip.width_mm, samples, normals, aim.face_offset_mm)
    uneven = aim.kerf_share * uneven_kerf(strip, near, far, samples[:, 1], aim)
    face = deviation_measures(deviations + uneven, areas)
    # The finished face and the surface the centreline was fitted to are parallel to sheet and form.
    fit = deviation_measures(deviations - aim.kerf_error_mm, areas)
    return CutStrip(strip, sheet, near, far, *face, *fit[:2])


def uneven_kerf(strip: Strip, near: Floats, far: Floats, y: Floats, aim: Aim) -> Floats:
    """Return what the kerf at places along the wire is over the planned one, mm.

    Mid-wire keeps to the planned speed, so an end that goes a shorter way goes slower and melts more.

    Args:
        strip: The strip.
        near: (n, 2) x and z of the rail at y = 0.
        far: (n, 2) likewise at y = the strip's width.
        y: (m,) places.
        aim: The kerf.
    """
    slowness = end_slowness(near, far, strip.width_mm, strip.lie.size_mm[0])
    places = np.clip(y / strip.width_mm, 0.0, 1.0)
    return kerf_gain(aim.kerf_mm - aim.least_kerf_mm, slowness, places)
