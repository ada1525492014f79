"""What must hold of every sweep before it is cut: one list of checks, each with its limit, value, ruling and place.

Everything is linear along a ruling, so the tests are exact for polyline rails: the sheet folds in plan just where a
wire end goes back, and heights over the billet are extreme where rulings end or pass over the billet's ends. How
unevenly the wire's ends run belongs to the speeds and is told with them.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Bools, Floats
from cutblock.base.units import length_text, place_text
from cutblock.geometry.ruled import fold_places, sheet_normals, twist_angles
from cutblock.geometry.sheet import sheet_heights
from cutblock.records.panel import Panel
from cutblock.records.plan import Finding
from cutblock.records.shop import Machine
from cutblock.records.sweep import Sweep
from cutblock.records.words import Severity

STEEPEST_WIRE_DEG = 45.0
SHARPEST_EDGE_DEG = 30.0
# Common practice, no source: a cut 1 m wide is then 38 degrees steep at its sides, and the wire's middle still follows.
MOST_TWIST_DEG_M = 90.0
CLEAR_MM = 10.0  # the wire starts and ends at least this and half the kerf away from the billet
BACKLASH_MM = 0.5  # common practice, no source: a tower that goes back less than its backlash hardly shows
_ROUNDING_MM = 1e-3
_N_EDGE_POINTS = 41


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Check:
    """One thing that was tested, with its worst place."""

    code: str
    severity: Severity  # if it does not hold
    text: str  # with a gap for the value
    unit: str  # "mm", or what stands behind the number
    value: float
    limit: float
    is_floor: bool  # the value must be at least the limit, else at most
    ruling: int  # from 1
    point_mm: Floats  # (3,) in the billet
    remedy: str

    @property
    def holds(self) -> bool:
        """Whether the value keeps the limit."""
        return self.value >= self.limit if self.is_floor else self.value <= self.limit


def check_sweep(sweep: Sweep, wall_mm: float, machine: Machine) -> tuple[Check, ...]:
    """Return every check of a sweep, those that hold too; the fold first, as nothing else means much behind it.

    Args:
        sweep: Its rails need not rise.
        wall_mm: Foam to be kept behind a mould face.
        machine: The distance of its towers and the longest wire between them.
    """
    fold = _fold(sweep)
    if not fold.holds:
        return (fold,)
    return (
        fold,
        *_walls(sweep, wall_mm),
        _run_in(sweep),
        _wire_length(sweep, machine),
        _lean(sweep),
        _twist(sweep),
        _sharpness(sweep),
        _reversal(sweep, machine),
    )


def findings_of(checks: Sequence[Check], sweep: Sweep, panel: Panel, units: str) -> tuple[Finding, ...]:
    """Return a finding for every check that does not hold, its place in the coordinates of the form.

    Args:
        checks: Of `sweep`.
        sweep: Its first half serves `panel`.
        panel: For the way from the billet to the form.
        units: The unit people read.
    """
    findings = []
    for check in checks:
        if check.holds:
            continue
        place = place_text(place_in_form(check.point_mm, sweep, panel), units)
        value, limit = (_measure_text(number, check.unit, units) for number in (check.value, check.limit))
        text = (
            f"{check.text.format(value)} at ruling {check.ruling} ({place}); "
            f"{'at least' if check.is_floor else 'at most'} {limit}. {check.remedy}"
        )
        findings.append(Finding(severity=check.severity, code=check.code, subject=sweep.id, text=text))
    return tuple(findings)


def place_in_form(point_mm: Floats, sweep: Sweep, panel: Panel) -> Floats:
    """Return where a point of the billet lies in the form, by the sweep's first half."""
    serving = sweep.serving[0]
    place: Floats = panel.origin_mm + (serving.rotation @ point_mm + serving.shift_mm) @ panel.axes
    return place


def _measure_text(value: float, unit: str, units: str) -> str:
    return length_text(value, units, 2) if unit == "mm" else f"{value:.1f} {unit}"


def _fold(sweep: Sweep) -> Check:
    """Tell whether a wire end goes back: just then neighbouring rulings cross between the billet's faces."""
    steps = np.stack([np.diff(sweep.near[:, 0]), np.diff(sweep.far[:, 0])])
    least = steps.min(axis=0)
    over = _over_billet(sweep)
    # A fold in the billet is told before a worse one in the air before or behind it.
    inside = np.where(over[:-1] | over[1:], least, np.inf)
    index = int(np.argmin(inside if inside.min() <= 0.0 else least))
    place = float(fold_places(sweep.near, sweep.far)[index])
    return Check(
        code="fold",
        severity=Severity.ERROR,
        text="The cut folds over itself: a wire end moves on by {}",
        unit="mm",
        value=float(least[index]),
        limit=1e-6,
        is_floor=True,
        ruling=index + 1,
        point_mm=_on_ruling(sweep, index, min(max(place, 0.0), 1.0) if np.isfinite(place) else 0.5),
        remedy="Make the cells smaller, or lay the wire the other way.",
    )


def _walls(sweep: Sweep, wall_mm: float) -> tuple[Check, Check]:
    """Return what foam is left under and over the cut, from the rails and the points over the billet's ends."""
    points, rulings = _extreme_points(sweep)
    half_kerf = max(sweep.kerf_mm) / 2.0
    low, high = int(np.argmin(points[:, 2])), int(np.argmax(points[:, 2]))
    remedy = "Use a higher billet, or a smaller wall."

    def wall(side: str, index: int, left: float) -> Check:
        return Check(
            code="thin-wall",
            severity=Severity.ERROR,
            text=f"The foam {side} the cut is only {{}} thick",
            unit="mm",
            value=left,
            limit=wall_mm - _ROUNDING_MM,
            is_floor=True,
            ruling=int(rulings[index]) + 1,
            point_mm=points[index],
            remedy=remedy,
        )

    under = float(points[low, 2]) - half_kerf
    over = sweep.height_mm - float(points[high, 2]) - half_kerf
    return wall("under", low, under), wall("over", high, over)


def _run_in(sweep: Sweep) -> Check:
    before = -np.array([sweep.near[0, 0], sweep.far[0, 0]])
    behind = np.array([sweep.near[-1, 0], sweep.far[-1, 0]]) - sweep.length_mm
    ways = np.concatenate([before, behind])
    worst = int(np.argmin(ways))
    index = 0 if worst < 2 else len(sweep.near) - 1
    return Check(
        code="short-run-in",
        severity=Severity.ERROR,
        text="The wire starts or ends only {} from the billet",
        unit="mm",
        value=float(ways[worst]),
        limit=CLEAR_MM + max(sweep.kerf_mm) / 2.0 - _ROUNDING_MM,
        is_floor=True,
        ruling=index + 1,
        point_mm=_on_ruling(sweep, index, float(worst % 2)),
        remedy="Plan the sweep again.",
    )


def _wire_length(sweep: Sweep, machine: Machine) -> Check:
    """Return the longest wire between the towers' planes while its middle is in foam; rulings go straight on to them.

    The way in and out over a corner is tried with the program on the machine.
    """
    lengths = np.hypot(sweep.width_mm, np.hypot(*(sweep.far - sweep.near).T)) * (machine.span_mm / sweep.width_mm)
    middle = 0.5 * (sweep.near[:, 0] + sweep.far[:, 0])
    index = int(np.argmax(np.where((middle >= 0.0) & (middle <= sweep.length_mm), lengths, 0.0)))
    return Check(
        code="long-wire",
        severity=Severity.ERROR,
        text="The wire between the towers would be {} long",
        unit="mm",
        value=float(lengths[index]),
        limit=machine.longest_wire_mm + _ROUNDING_MM,
        is_floor=False,
        ruling=index + 1,
        point_mm=_on_ruling(sweep, index, 0.5),
        remedy="Make the cells smaller, or give the springs more travel.",
    )


def _lean(sweep: Sweep) -> Check:
    span = sweep.far - sweep.near
    leans = np.degrees(np.arctan2(np.hypot(span[:, 0], span[:, 1]), sweep.width_mm))
    index = int(np.argmax(np.where(_over_billet(sweep), leans, -1.0)))
    return Check(
        code="leaning-wire",
        severity=Severity.WARNING,
        text="The wire leans {} from square, so that it bows and its springs give",
        unit="degrees",
        value=float(leans[index]),
        limit=STEEPEST_WIRE_DEG + 1e-6,
        is_floor=False,
        ruling=index + 1,
        point_mm=_on_ruling(sweep, index, 0.5),
        remedy="Turn or divide the panel.",
    )


def _twist(sweep: Sweep) -> Check:
    """Return the largest turn of the wire by the way of its middle."""
    ways = 0.5 * np.hypot(*(np.diff(sweep.near, axis=0) + np.diff(sweep.far, axis=0)).T)
    twists = np.degrees(twist_angles(sweep.near, sweep.far, sweep.width_mm)) / ways * 1000.0
    over = _over_billet(sweep)
    index = int(np.argmax(np.where(over[:-1] & over[1:], twists, -1.0)))
    return Check(
        code="twisting-wire",
        severity=Severity.WARNING,
        text="The wire turns by {} of travel, so that its middle lags behind",
        unit="degrees per m",
        value=float(twists[index]),
        limit=MOST_TWIST_DEG_M,
        is_floor=False,
        ruling=index + 1,
        point_mm=_on_ruling(sweep, index, 0.5),
        remedy="Make the cells shorter across the wire, or cut slower.",
    )


def _sharpness(sweep: Sweep) -> Check:
    """Return the least angle between the cut and a side face of the billet, in either half."""
    along = np.linspace(0.0, sweep.length_mm, _N_EDGE_POINTS)
    across = np.linspace(0.0, sweep.width_mm, _N_EDGE_POINTS)
    low, full = np.zeros(_N_EDGE_POINTS), np.ones(_N_EDGE_POINTS)
    x = np.concatenate([along, along, low, full * sweep.length_mm])
    y = np.concatenate([low, full * sweep.width_mm, across, across])
    heights, normals = sheet_normals(sweep.near, sweep.far, sweep.width_mm, x, y)
    # What counts is the slope towards the side: along y at the billet's faces, along x at its ends.
    part = np.where(np.arange(len(x)) < 2 * _N_EDGE_POINTS, normals[:, 1], normals[:, 0])
    slopes = np.abs(part / normals[:, 2])
    worst = int(np.argmax(slopes))
    point = np.array([x[worst], y[worst], heights[worst]])
    return Check(
        code="feather-edge",
        severity=Severity.WARNING,
        text="The edge of a half is only {} sharp and breaks off easily",
        unit="degrees",
        value=float(90.0 - np.degrees(np.arctan(slopes[worst]))),
        limit=SHARPEST_EDGE_DEG,
        is_floor=True,
        ruling=_ruling_at(sweep, point) + 1,
        point_mm=point,
        remedy="Add a margin or divide the panel.",
    )


def _reversal(sweep: Sweep, machine: Machine) -> Check:
    """Return how far a tower goes back with the wire in foam: rulings cross in the air beside the billet, unharmed."""
    rulings = np.flatnonzero(_over_billet(sweep))
    near, far = sweep.near[rulings, 0], sweep.far[rulings, 0]
    slopes = (far - near) / sweep.width_mm
    at_near = near - machine.near_gap_mm * slopes
    towers = np.stack([at_near, at_near + machine.span_mm * slopes])
    back = np.maximum.accumulate(towers, axis=1) - towers
    tower, index = divmod(int(np.argmax(back)), len(rulings))
    return Check(
        code="tower-reverses",
        severity=Severity.WARNING,
        text=f"The {('near', 'far')[tower]} tower goes back by {{}} in the cut and shows its backlash",
        unit="mm",
        value=float(back[tower, index]),
        limit=BACKLASH_MM,
        is_floor=False,
        ruling=int(rulings[index]) + 1,
        point_mm=_on_ruling(sweep, int(rulings[index]), float(tower)),
        remedy="Take up the backlash, or lay the wire the other way.",
    )


def _over_billet(sweep: Sweep) -> Bools:
    """Tell of each ruling whether any of it lies over the billet."""
    result: Bools = np.maximum(sweep.near[:, 0], sweep.far[:, 0]) >= 0.0
    result &= np.minimum(sweep.near[:, 0], sweep.far[:, 0]) <= sweep.length_mm
    return result


def _on_ruling(sweep: Sweep, index: int, place: float) -> Floats:
    """Return the point at a fraction of a ruling, moved to the billet along the travel."""
    x, z = (1.0 - place) * sweep.near[index] + place * sweep.far[index]
    return np.array([min(max(x, 0.0), sweep.length_mm), place * sweep.width_mm, z])


def _extreme_points(sweep: Sweep) -> tuple[Floats, Floats]:
    """Return the points (k, 3) of the sheet over the billet that can be its lowest or highest, and their rulings."""
    near, far = sweep.near, sweep.far
    skew = far[:, 0] - near[:, 0]
    is_askew = np.abs(skew) > 1e-9
    divisor = np.where(is_askew, skew, 1.0)
    ends = np.sort(np.stack([-near[:, 0] / divisor, (sweep.length_mm - near[:, 0]) / divisor]), axis=0)
    first = np.where(is_askew, ends[0], 0.0).clip(0.0, 1.0)
    last = np.where(is_askew, ends[1], 1.0).clip(0.0, 1.0)
    middle = near[:, 0] + 0.5 * (first + last) * skew
    is_over = (first <= last) & (middle >= -1e-9) & (middle <= sweep.length_mm + 1e-9)
    places = np.concatenate([first[is_over], last[is_over]])
    rulings = np.tile(np.flatnonzero(is_over), 2)
    on = near[rulings] + places[:, None] * (far - near)[rulings]
    points = np.stack([on[:, 0], places * sweep.width_mm, on[:, 1]], axis=1)
    x = np.array([0.0, sweep.length_mm, 0.0, sweep.length_mm])
    y = np.array([0.0, 0.0, sweep.width_mm, sweep.width_mm])
    corners = np.stack([x, y, sheet_heights(near, far, sweep.width_mm, x, y)], axis=1)
    at = [_ruling_at(sweep, corner) for corner in corners]
    return np.concatenate([points, corners]), np.concatenate([rulings, at])


def _ruling_at(sweep: Sweep, point: Floats) -> int:
    """Return the index of the ruling before a plan point."""
    share = point[1] / sweep.width_mm
    crossings = (1.0 - share) * sweep.near[:, 0] + share * sweep.far[:, 0]
    return min(max(int(np.searchsorted(crossings, point[0], side="right")) - 1, 0), len(crossings) - 2)
