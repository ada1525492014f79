"""The cells a face is divided into, and what of each lies on the face."""

import math
from itertools import pairwise
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError, InputError
from cutblock.base.progress import Progress
from cutblock.base.units import length_text
from cutblock.geometry.outline import Area, Rings, area_of_rings, box, parts_of
from cutblock.records.form import Face
from cutblock.records.job import FaceSpec
from cutblock.records.plan import Finding
from cutblock.records.words import Severity

_THINNEST_MM = 0.01  # a sliver thinner than this is none
NARROWEST_MM = 20.0  # a narrower strip of foam is no mould
SMALLEST_SHARE = 0.01  # of a cell; less is merged with a neighbour
# A cell may be this part of the wanted one larger: float32 meshes and rounded CSV rows are that far off their sizes.
_OVER = 1e-4
_MOST_CELLS = 20_000


class Cell(NamedTuple):
    """One cell: its rectangle of (u, v) and, where the face is trimmed, the part of it on the face.

    Where the grid is turned all of it is in the grid's own coordinates: the face's, turned back by `angle_rad`.
    """

    row: int  # along v, from 1
    column: int  # along u, from 1
    u_low: float
    u_high: float
    v_low: float
    v_high: float
    area: Area | None = None  # None: the whole rectangle
    angle_rad: float = 0.0  # of the grid against the face's u

    def on_face(self, u: Floats, v: Floats) -> tuple[Floats, Floats]:
        """Return where points of the grid's coordinates lie in those of the face."""
        return _turned(u, v, self.angle_rad)

    @property
    def name(self) -> str:
        """Row letter and column number, such as "A03"."""
        return f"{row_letters(self.row)}{self.column:02d}"


def row_letters(row: int) -> str:
    """Return A to Z for rows 1 to 26, then AA, AB and so on."""
    letters = ""
    while row > 0:
        row, rest = divmod(row - 1, 26)
        letters = chr(ord("A") + rest) + letters
    return letters


def _turned(u: Floats, v: Floats, angle_rad: float) -> tuple[Floats, Floats]:
    if angle_rad == 0.0:
        return u, v
    cosine, sine = math.cos(angle_rad), math.sin(angle_rad)
    return cosine * u - sine * v, sine * u + cosine * v


def cells_of(
    face: Face, spec: FaceSpec, units: str, progress: Progress
) -> tuple[tuple[Cell, ...], tuple[Finding, ...]]:
    """Divide a face.

    Args:
        face: The face.
        spec: How it is to be divided.
        units: The unit of messages.
        progress: Called for each row of cells of a trimmed face.

    Returns:
        The cells that lie on the face, row by row, and what was done about slivers.

    Raises:
        InputError: The cuts or the cell size cannot be used.
        GeometryError: A sliver has no neighbour, or a cell falls into parts.
    """
    if spec.is_grid_set:
        return _set_grid(face, spec, units, progress)
    cuts = ((), ()) if spec.cuts_x_mm is None and spec.cuts_y_mm is None else (spec.cuts_x_mm, spec.cuts_y_mm)
    wanted: tuple[float | None, float | None] = spec.cell_mm if spec.cell_mm is not None else (None, None)
    lines_u = _lines(face.length_mm, wanted[0], cuts[0] or (), "x", face.name, spec.place, units)
    lines_v = _lines(face.width_mm, wanted[1], cuts[1] or (), "y", face.name, spec.place, units)
    _refuse_many((len(lines_u) - 1) * (len(lines_v) - 1), face.name, spec.place)
    cells = _between(lines_u, lines_v, 0.0)
    if face.outline is None:
        return tuple(cells), ()
    return _trimmed(face.name, face.outline, spec, cells, units, progress)


def _set_grid(
    face: Face, spec: FaceSpec, units: str, progress: Progress
) -> tuple[tuple[Cell, ...], tuple[Finding, ...]]:
    """Divide a face by a grid of cells of exactly the wanted size, turned and shifted as the job says."""
    if spec.cell_mm is None:
        raise InputError(
            f'face "{face.name}" has an angle or a phase but no cell size', spec.place, "Give length and width."
        )
    narrowest = min(spec.cell_mm)
    if narrowest < NARROWEST_MM:
        raise _too_narrow(face.name, narrowest, "xy"[spec.cell_mm.index(narrowest)], spec.place, units)
    angle = spec.angle_rad if spec.angle_rad is not None else 0.0
    outline = face.outline
    if outline is None:
        length, width = face.length_mm, face.width_mm
        outline = (np.array([[0.0, 0.0], [length, 0.0], [length, width], [0.0, width]]),)
    rings = tuple(np.stack(_turned(ring[:, 0], ring[:, 1], -angle), axis=1) for ring in outline)
    lines = []
    for axis, (size, phase) in enumerate(zip(spec.cell_mm, spec.phase_mm or (0.0, 0.0), strict=True)):
        low, high = float(rings[0][:, axis].min()), float(rings[0][:, axis].max())
        # The slack keeps an edge that lies on a line but for rounding from getting a row of nothing; what is wider,
        # however little, is a sliver and joins its neighbours.
        first, last = math.floor((low - phase) / size + 1e-9), math.ceil((high - phase) / size - 1e-9)
        _refuse_many(last - first, face.name, spec.place)
        lines.append([phase + size * number for number in range(first, last + 1)])
    _refuse_many((len(lines[0]) - 1) * (len(lines[1]) - 1), face.name, spec.place)
    return _trimmed(face.name, rings, spec, _between(lines[0], lines[1], angle), units, progress)


def _between(lines_u: list[float], lines_v: list[float], angle_rad: float) -> list[Cell]:
    return [
        Cell(row, column, u_low, u_high, v_low, v_high, angle_rad=angle_rad)
        for row, (v_low, v_high) in enumerate(pairwise(lines_v), 1)
        for column, (u_low, u_high) in enumerate(pairwise(lines_u), 1)
    ]


def _refuse_many(n_cells: int, face: str, place: str) -> None:
    if n_cells > _MOST_CELLS:
        raise InputError(
            f'face "{face}" would fall into {n_cells} panels; at most {_MOST_CELLS} are taken',
            place,
            "Give larger panels, or check the units.",
        )


def _too_narrow(face: str, narrowest_mm: float, axis: str, place: str, units: str) -> InputError:
    return InputError(
        f'face "{face}" would get a panel {length_text(narrowest_mm, units, 1)} wide along {axis}; '
        f"the least is {length_text(NARROWEST_MM, units)}",
        place,
        "Move the cuts or give larger panels.",
    )


def _lines(
    length: float, wanted: float | None, cuts: tuple[float, ...], axis: str, face: str, place: str, units: str
) -> list[float]:
    if wanted is not None:
        # The slack keeps a length that is a multiple of the cell but for rounding from getting one cell more.
        n = max(1, math.ceil(length / wanted - _OVER))
        lines = [length * i / n for i in range(n)] + [length]
    else:
        lines = [0.0, *cuts, length]
        for before, after in pairwise(lines):
            if after <= before:
                at = cuts[0] if before == 0.0 else before
                raise InputError(
                    f'face "{face}": the cut at {axis} {length_text(at, units)} does not lie inside the face, '
                    f"which ends at {length_text(length, units)}, or the cuts do not rise",
                    place,
                    "Give cuts in rising order between 0 and the size of the face.",
                )
    narrowest = min(after - before for before, after in pairwise(lines))
    if narrowest < NARROWEST_MM:
        raise _too_narrow(face, narrowest, axis, place, units)
    return lines


def _trimmed(
    face: str, rings: Rings, spec: FaceSpec, cells: list[Cell], units: str, progress: Progress
) -> tuple[tuple[Cell, ...], tuple[Finding, ...]]:
    import shapely

    whole = area_of_rings(rings)
    shapely.prepare(whole)
    kept: dict[int, list[Area]] = {}
    slivers: list[tuple[int, Area]] = []
    for index, cell in enumerate(cells):
        if index % 50 == 0:
            progress(index / len(cells), f"Dividing face {face}")
        rectangle = box(cell.u_low, cell.v_low, cell.u_high, cell.v_high)
        if whole.contains(rectangle):
            kept[index] = [rectangle]
            continue
        for part in parts_of(shapely.intersection(whole, rectangle)):
            if part.area < 1e-9 * rectangle.area:
                continue
            if part.area < SMALLEST_SHARE * rectangle.area or part.buffer(-NARROWEST_MM / 2.0).is_empty:
                slivers.append((index, part))
            else:
                kept.setdefault(index, []).append(part)
    findings = _merge_slivers(face, spec, cells, kept, slivers, units)
    result = []
    for index in sorted(kept):
        cell, parts = cells[index], kept[index]
        if len(parts) > 1:
            raise GeometryError(
                f"cell {cell.name} of face {face} falls into {len(parts)} separate parts",
                spec.place,
                "Move the cuts so that every panel is in one piece.",
            )
        rectangle = box(cell.u_low, cell.v_low, cell.u_high, cell.v_high)
        is_whole = shapely.symmetric_difference(parts[0], rectangle).area < 1e-9 * rectangle.area
        result.append(cell if is_whole else cell._replace(area=parts[0]))
    return tuple(result), findings


def _merge_slivers(
    face: str,
    spec: FaceSpec,
    cells: list[Cell],
    kept: dict[int, list[Area]],
    slivers: list[tuple[int, Area]],
    units: str,
) -> tuple[Finding, ...]:
    """Join every sliver to the panel it shares the longest edge with; changes `kept`.

    What is thinner than rounding leaves between a hardly turned grid and the face's edge is no foam, and is left.
    """
    import shapely

    findings = []
    solid = [item for item in slivers if item[1].area > 0.5 * _THINNEST_MM * item[1].length]
    waiting = sorted(solid, key=lambda item: (-item[1].area, item[0]))
    while waiting:
        left = []
        for index, sliver in waiting:
            cell = cells[index]
            best: tuple[float, int, int] | None = None
            for other in sorted(kept):
                near = cells[other]
                if abs(near.row - cell.row) > 1 or abs(near.column - cell.column) > 1:
                    continue
                for number, part in enumerate(kept[other]):
                    shared = shapely.intersection(shapely.boundary(sliver), shapely.boundary(part)).length
                    if shared > 1e-3 and (best is None or shared > best[0] + 1e-6):
                        best = (shared, other, number)
            joined = None if best is None else parts_of(shapely.union(sliver, kept[best[1]][best[2]]))
            if best is None or joined is None or len(joined) != 1:
                left.append((index, sliver))
                continue
            kept[best[1]][best[2]] = joined[0]
            findings.append(
                Finding(
                    severity=Severity.WARNING,
                    code="sliver-merged",
                    subject=f"{face} {cells[best[1]].name}",
                    text=f"A sliver of cell {cell.name} was joined to this panel, which is larger than its cell; "
                    "move the cuts to avoid it.",
                )
            )
        if len(left) == len(waiting):
            index, sliver = left[0]
            point = np.array(sliver.representative_point().coords)
            (u,), (v,) = cells[index].on_face(point[:, 0], point[:, 1])
            raise GeometryError(
                f"cell {cells[index].name} of face {face} is a sliver at x {length_text(float(u), units)}, "
                f"y {length_text(float(v), units)} of the face, with no panel beside it to join",
                spec.place,
                "Move the cuts or give smaller panels.",
            )
        waiting = left
    return tuple(findings)
