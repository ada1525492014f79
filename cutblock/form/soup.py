"""What every reader of a mesh file gives, and the checks all of them share."""

from pathlib import Path
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.base.errors import InputError
from cutblock.base.units import length_text
from cutblock.records.plan import Finding
from cutblock.records.words import Severity

LARGEST_BYTES = 512_000_000
MOST_TRIANGLES = 5_000_000
_SMALLEST_EXTENT_MM = 20.0
_LARGEST_EXTENT_MM = 200_000.0
_LARGEST_VALUE_MM = 1e10
_WARN_STEP_MM, _REFUSE_STEP_MM = 0.01, 1.0
_EXPORT_AGAIN = "Export the mesh again."


class Soup(NamedTuple):
    """Triangles as a file holds them; the same point may be there many times."""

    vertices: Floats  # (n, 3) in the file's unit
    triangles: Ints  # (m, 3)
    unit_mm: float | None = None  # of the file itself, where it says so
    is_single: bool = False  # coordinates were stored with 24 bits


def check_count(n_triangles: int, name: str) -> None:
    """Refuse a file without triangles or with too many.

    Raises:
        InputError: There are none, or more than five million.
    """
    if n_triangles == 0:
        raise InputError("has no triangles", name, _EXPORT_AGAIN)
    if n_triangles > MOST_TRIANGLES:
        raise InputError(
            f"has {n_triangles} triangles; at most {MOST_TRIANGLES} are taken", name, "Export a coarser mesh."
        )


def check_indices(triangles: Ints, n_vertices: int, name: str) -> None:
    """Refuse triangles that name a vertex the file does not hold.

    Raises:
        InputError: Names the first such triangle.
    """
    wrong = ((triangles < 0) | (triangles >= n_vertices)).any(axis=1)
    if wrong.any():
        number = int(np.argmax(wrong))
        raise InputError(
            f"triangle {number + 1} names a vertex that is not there; the file holds {n_vertices}", name, _EXPORT_AGAIN
        )


def checked_soup(soup: Soup, path: str, scale: float, units: str) -> tuple[Soup, tuple[Finding, ...]]:
    """Check numbers and size, and bring the vertices to mm.

    Args:
        soup: As read.
        path: The file.
        scale: mm per unit of the job, used where the file does not say its own.
        units: The job's unit.

    Returns:
        The soup in mm, and what is doubtful about it.

    Raises:
        InputError: Coordinates are not finite, the size cannot be that of a form, or too far out for 24 bits.
    """
    name = Path(path).name
    check_count(len(soup.triangles), name)
    check_indices(soup.triangles, len(soup.vertices), name)
    findings = []
    factor = scale if soup.unit_mm is None else soup.unit_mm
    if soup.unit_mm is not None and abs(soup.unit_mm - scale) > 1e-12 * scale:
        findings.append(
            _warning(
                "mesh-unit", name, f"The file gives its own unit ({soup.unit_mm:g} mm), which was used, not {units}."
            )
        )
    with np.errstate(over="ignore", invalid="ignore"):
        vertices = soup.vertices * factor
        wrong = ~(np.abs(vertices) <= _LARGEST_VALUE_MM).all(axis=1)
    if wrong.any():
        raise InputError(
            f"vertex {int(np.argmax(wrong)) + 1} (and {int(wrong.sum()) - 1} more) is not finite, or farther than "
            "10 000 km from the origin",
            name,
            _EXPORT_AGAIN,
        )
    is_used = np.zeros(len(vertices), dtype=np.bool_)
    is_used[soup.triangles] = True
    used = vertices[is_used]
    extent = float(np.ptp(used, axis=0).max())
    if not _SMALLEST_EXTENT_MM <= extent <= _LARGEST_EXTENT_MM:
        raise InputError(
            f"is {length_text(extent, units, 1)} large, which is no form: wanted "
            f"{length_text(_SMALLEST_EXTENT_MM, units)} to {length_text(_LARGEST_EXTENT_MM, units)}",
            name,
            f"Check the unit: the job reads this file in {units}.",
        )
    step = float(np.abs(used).max()) * 2.0**-23
    if soup.is_single and step > _REFUSE_STEP_MM:
        raise InputError(
            f"lies so far from its origin that its coordinates are rounded to {step:.1f} mm",
            name,
            "Move the surface to the origin before exporting it.",
        )
    if soup.is_single and step > _WARN_STEP_MM:
        findings.append(
            _warning(
                "mesh-far-out", name, f"So far from the origin the file's coordinates are rounded to {step:.2f} mm."
            )
        )
    return Soup(vertices, soup.triangles, 1.0, soup.is_single), tuple(findings)


def _warning(code: str, subject: str, text: str) -> Finding:
    return Finding(severity=Severity.WARNING, code=code, subject=subject, text=text)
