"""The ruled sheet a straight wire can sweep that comes closest to a wanted surface."""

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints, as_floats, one_number
from cutblock.base.errors import GeometryError
from cutblock.geometry.deviation import deviation_measures
from cutblock.geometry.fit_lawson import polish
from cutblock.geometry.fit_minimax import DENSE_NODES, least_largest
from cutblock.geometry.fit_refine import N_CONTROLS, N_ROUNDS, N_STEPS, Fits, improve, knots_of, recentre, refine
from cutblock.geometry.fit_start import Paths, best_paths
from cutblock.geometry.fit_target import Patch, Target, make_target
from cutblock.geometry.heights import HeightField, height_field
from cutblock.geometry.rails import SheetFit, polyline_rails
from cutblock.geometry.ruled import sheet_normals

BATCH = 64
FINE_CONTROLS = 32
FINE_ROUNDS = 5
FINE_SAG_MM = 1e-4
GRIDS = (65, 129, 257)
SPLINE_ERROR_MM = 1e-5
# A least-squares fit whose largest deviation lies between these shares of the tolerance is worth polishing: the least
# largest deviation is about half to three quarters of it.
NEARLY = 0.95
SPIKY = 3.5
EVENING_TURNS = 2
CORNER_LOSS = 1.02  # times as far off at the worst place: what more control values may cost there
HOPELESS = 1.05  # times the tolerance: a lower bound above it ends a polish
SQUARENESS = 0.1
ENOUGH = 0.9
POLISH_REACH = 2.2
# What Lawson's weights leave within this many tolerances is worth linear programmes.
PROGRAMME_REACH = 1.6


@dataclass(frozen=True, slots=True, eq=False)
class RuledFit:
    """A ruled fit over [0, length] x [0, width]: row i of `near` (at y = 0) and `far` (at y = width) is ruling i.

    Deviations are distances of the sheet between the polyline rails from the surface, over a dense grid of the sheet.
    """

    near: Floats  # (n, 2) x and z, mm, x rising; starts at or before 0, ends at or behind the length
    far: Floats
    max_mm: float
    rms_mm: float
    p95_mm: float
    skew_mm: float  # largest |x far - x near|
    curves: SheetFit  # the B-spline rails the polylines were taken from


def fit_ruled(
    height: Callable[[Floats, Floats], Floats], length_mm: float, width_mm: float, tolerance_mm: float
) -> RuledFit:
    """Return the ruled sheet closest to a height field, rulings running from y = 0 to y = width.

    The rulings may lie askew in plan by up to 1.2 widths at either side. A sheet within the tolerance is not
    guaranteed: compare `max_mm`.

    Args:
        height: z of x and y, called with float64 arrays of one shape; smooth.
        length_mm: Extent along x, the travel; over 0.
        width_mm: Extent along y, the wire; over 0.
        tolerance_mm: Wanted largest normal deviation, over 0; below a tenth of it less skew counts for more than a
            closer fit.

    Raises:
        GeometryError: An extent or the tolerance is not over 0, or `height` gives another shape or no finite number.

    Example:
        >>> def saddle(x, y):
        ...     return 100.0 + 1e-4 * (x - 600.0) * (y - 500.0)
        >>> fit = fit_ruled(saddle, 1200.0, 1000.0, 2.0)
        >>> fit.max_mm < 1e-6
        True
    """
    for value, name in ((length_mm, "length"), (width_mm, "width"), (tolerance_mm, "tolerance")):
        if not (np.isfinite(one_number(value, name)) and value > 0.0):
            raise GeometryError(f"the {name} is {value:g} mm", name, "Give a number over 0.")
    if not callable(height):
        raise GeometryError("height is no function", "height", "Give a function of x and y that returns z.")
    grid, field = _sampled(height, length_mm, width_mm)
    patch = Patch(
        heights_mm=grid,
        low_x_mm=0.0,
        high_x_mm=length_mm,
        low_y_mm=0.0,
        high_y_mm=width_mm,
        width_mm=width_mm,
        strip_low_y_mm=0.0,
        strip_high_y_mm=width_mm,
    )
    x, y = np.meshgrid(np.linspace(0.0, length_mm, 97), np.linspace(0.0, width_mm, 81), indexing="ij")
    curves = fit_patches([patch], tolerance_mm, is_polished=False, n_controls=FINE_CONTROLS)[0]
    fit = _measured(curves, field, x, y)
    if fit.max_mm > NEARLY * tolerance_mm:
        for curves in _closest(patch, tolerance_mm):
            polished = _measured(curves, field, x, y)
            fit = polished if polished.max_mm < fit.max_mm else fit
            if fit.max_mm <= tolerance_mm:
                break
    return fit


def _closest(patch: Patch, tolerance_mm: float) -> Iterator[SheetFit]:
    """Yield sheets brought to the least largest deviation near by, one after the other from different starts.

    First from the least-squares sheet, then from an evened one of each family of rulings: which start ends lowest
    cannot be told before. Few control values: many would chase the nodes and stray between them, as programmes do a
    little.
    """
    starts: list[Sequence[SheetFit] | None] = [None]
    target = make_target([patch])
    for paths in _families(*best_paths(target)):
        evened = polish(target, refine(target, paths), 0.0, EVENING_TURNS)
        starts.append([_with_plane(target, evened, 0)])
    for start in starts:
        for has_programmes in (False, True):
            yield fit_patches([patch], tolerance_mm, polish_until=0.0, has_programmes=has_programmes, starts=start)[0]


def _measured(curves: SheetFit, field: HeightField, x: Floats, y: Floats) -> RuledFit:
    """Return curves with their polyline rails and the distances of the sheet above plan points from the surface."""
    near, far = polyline_rails(curves, 0.0, field.length_mm, FINE_SAG_MM, most_rulings=2001, decimals=None)
    z = sheet_normals(near, far, field.width_mm, x, y)[0]
    deviations = field.distances(np.stack([x, y, z], axis=-1).reshape(-1, 3))
    largest, rms, p95 = deviation_measures(deviations, np.ones(len(deviations)))
    skew = float(np.abs(far[:, 0] - near[:, 0]).max())
    return RuledFit(near=near, far=far, max_mm=largest, rms_mm=rms, p95_mm=p95, skew_mm=skew, curves=curves)


def _called(height: Callable[[Floats, Floats], Floats], x: Floats, y: Floats) -> Floats:
    """Return the heights at x and y, checked."""
    values = as_floats(height(x, y), "height")
    if values.shape not in ((), x.shape):
        raise GeometryError(
            f"height gave an array of shape {values.shape} for points of shape {x.shape}",
            "height",
            "It must work on whole arrays, one height for each point.",
        )
    values = np.broadcast_to(values, x.shape)
    if not np.isfinite(values).all():
        where = int(np.argmin(np.isfinite(values.ravel())))
        raise GeometryError(
            f"height is not a finite number at x = {x.ravel()[where]:g} mm, y = {y.ravel()[where]:g} mm", "height"
        )
    return values


def _sampled(
    height: Callable[[Floats, Floats], Floats], length_mm: float, width_mm: float
) -> tuple[Floats, HeightField]:
    """Return a grid of heights fine enough that its spline meets the surface between the grid points too."""
    n = GRIDS[0]
    grid, field = _grid(height, length_mm, width_mm, n)
    for finer in GRIDS[1:]:
        middle_x = (np.arange(n - 1) + 0.5) * (length_mm / (n - 1))
        middle_y = (np.arange(n - 1) + 0.5) * (width_mm / (n - 1))
        x, y = np.meshgrid(middle_x, middle_y, indexing="ij")
        if float(np.abs(field.values(x, y) - _called(height, x, y)).max()) <= SPLINE_ERROR_MM:
            break
        n = finer
        grid, field = _grid(height, length_mm, width_mm, n)
    return grid, field


def _grid(
    height: Callable[[Floats, Floats], Floats], length_mm: float, width_mm: float, n: int
) -> tuple[Floats, HeightField]:
    x, y = np.meshgrid(np.linspace(0.0, length_mm, n), np.linspace(0.0, width_mm, n), indexing="ij")
    grid = _called(height, x, y)
    return grid, height_field(grid, length_mm, width_mm)


def fit_patches(
    patches: Sequence[Patch],
    tolerance_mm: float,
    *,
    is_polished: bool = True,
    polish_until: float = ENOUGH,
    has_programmes: bool = True,
    n_controls: int = N_CONTROLS,
    squareness: float = SQUARENESS,
    starts: Sequence[SheetFit] | None = None,
    report: Callable[[], None] = lambda: None,
) -> tuple[SheetFit, ...]:
    """Return for each patch the ruled sheet closest to it.

    Both families of rulings and rulings of one constant skew are tried.

    Args:
        patches: Any number, of any sizes; those with equally many grid values are fitted together.
        tolerance_mm: Wanted largest normal deviation.
        is_polished: Whether sheets that just miss the tolerance are brought closer to the least largest deviation.
        polish_until: Share of the tolerance at which a sheet is close enough; 0: as close as it can come.
        has_programmes: Whether linear programmes take over where Lawson's weights do not reach the tolerance.
        n_controls: Control values of each rail.
        squareness: What less skew is worth: of sheets that differ by less than this share of the tolerance, the one
            with the least skew is kept. 0 always keeps the closest, a large value the squarest.
        starts: Sheets of the same patches that were fitted before; only polished.
        report: Called every now and then.
    """
    results: list[SheetFit | None] = [None] * len(patches)
    groups: dict[tuple[int, ...], list[int]] = {}
    for number, patch in enumerate(patches):
        n_weights = 1 if patch.weights is None else len(patch.weights)
        groups.setdefault((patch.heights_mm.shape[0], n_weights), []).append(number)
    for numbers in groups.values():
        for first in range(0, len(numbers), BATCH):
            batch = numbers[first : first + BATCH]
            wanted = [patches[number] for number in batch]
            target = make_target(wanted)
            if starts is None:
                # Where the closest sheet of all is asked for, none is out of reach.
                give_up_mm = np.inf if is_polished and polish_until == 0.0 else 2.0 * POLISH_REACH * tolerance_mm
                fits = _fit_batch(target, tolerance_mm, n_controls, squareness, give_up_mm)
            else:
                fits = _resumed(target, [starts[number] for number in batch])
            report()
            if is_polished:
                smooth, fits = fits, _polished(target, fits, tolerance_mm, polish_until, report)
                if has_programmes:
                    fits = _programmed(wanted, fits, smooth, tolerance_mm, polish_until, report)
            for place, number in enumerate(batch):
                results[number] = _with_plane(target, fits, place)
    return tuple(fit for fit in results if fit is not None)


def _fit_batch(target: Target, tolerance_mm: float, n_controls: int, squareness: float, give_up_mm: float) -> Fits:
    """Return the least-squares fits of a batch; those still worse than `give_up_mm` are left rough."""
    first, second, constant, straight = _families(*best_paths(target))
    is_fine = n_controls != N_CONTROLS
    if is_fine:
        give_up_mm = np.inf
    n_rounds = FINE_ROUNDS if is_fine else N_ROUNDS

    def rival(best: Fits, paths: Paths, is_worth: Bools, n_steps: int = N_STEPS) -> Fits:
        index = np.flatnonzero(is_worth)
        if not len(index):
            return best
        fits = refine(target.take(index), paths.take(index), give_up_mm, n_rounds if n_steps else 1, n_steps)
        return _better(best, index, fits, tolerance_mm, squareness)

    best = refine(target, first, give_up_mm, n_rounds)
    best = rival(best, second, _is_worth(first, second, tolerance_mm) & ~_alike(first, second))
    is_worth = (constant.rms_mm <= 2.0 * first.rms_mm) & (best.max_mm > 0.5 * tolerance_mm)
    best = rival(best, constant, is_worth & ~_alike(first, constant))
    best = rival(best, straight, best.max_mm > tolerance_mm)
    if squareness > SQUARENESS:
        # Worth enough to hold rulings square that would turn askew by themselves.
        best = rival(best, straight, best.skew_mm > 0.0, n_steps=0)
    # A least-squares sheet may leave a corner far off that a few turns of Lawson's weights bring in.
    spiky = np.flatnonzero((best.max_mm > tolerance_mm) & (best.max_mm > SPIKY * best.rms_mm))
    if len(spiky):
        evened = polish(target.take(spiky), best.take(spiky), 0.0, EVENING_TURNS)
        best = best.put(spiky, evened)
    if is_fine:
        best = recentre(target, best, n_controls)
        fine = improve(target, best, n_steps=20, precision=1e-7, floor_mm=1e-7)
        # That a sheet is closer on the whole is no gain where it strays farther at a corner, out of the tolerance.
        closer = np.flatnonzero((fine.max_mm <= tolerance_mm) | (fine.max_mm <= CORNER_LOSS * best.max_mm))
        best = best.put(closer, fine.take(closer))
    return best


def _families(first: Paths, second: Paths, constant: Paths) -> tuple[Paths, Paths, Paths, Paths]:
    """Return the paths a fit starts from: those of the table, and the rulings that are not askew at all."""
    return first, second, constant, Paths(first.stations, np.zeros_like(first.skews), first.rms_mm)


def _polished(target: Target, fits: Fits, tolerance_mm: float, until: float, report: Callable[[], None]) -> Fits:
    """Return the fits with those that miss the tolerance by little brought closer by Lawson's weights."""
    index = _missing(fits, NEARLY * tolerance_mm, POLISH_REACH * tolerance_mm, until)
    if not len(index):
        return fits
    hopeless_mm = HOPELESS * tolerance_mm if until > 0.0 else np.inf
    part = target.take(index)
    return fits.put(index, polish(part, fits.take(index), until * tolerance_mm, hopeless_mm=hopeless_mm, report=report))


def _programmed(
    patches: list[Patch], fits: Fits, smooth: Fits, tolerance_mm: float, until: float, report: Callable[[], None]
) -> Fits:
    """Return the fits with those that still miss the tolerance by little brought closer by linear programmes."""
    index = _missing(fits, until * tolerance_mm, PROGRAMME_REACH * tolerance_mm, until)
    if not len(index):
        return fits
    hopeless_mm = HOPELESS * tolerance_mm if until > 0.0 else np.inf
    dense = make_target([patches[number] for number in index], DENSE_NODES)
    enough_mm = until * tolerance_mm
    least = least_largest(dense, fits.take(index), smooth.take(index), enough_mm, hopeless_mm, report)
    return fits.put(index, least)


def _missing(fits: Fits, low_mm: float, high_mm: float, until: float) -> Ints:
    """Return which fits stray by more than one limit and less than another; nothing is out of reach of until = 0."""
    if until == 0.0:
        return np.arange(len(fits.max_mm))
    return np.flatnonzero((fits.max_mm > low_mm) & (fits.max_mm < high_mm))


def _is_worth(first: Paths, second: Paths, tolerance_mm: float) -> Bools:
    """Return which second paths may win: as close as the first, or squarer and not much farther off."""
    is_close = (second.rms_mm <= 1.5 * first.rms_mm) & (first.rms_mm > 0.05 * tolerance_mm)
    is_squarer = np.abs(second.skews).max(axis=1) < np.abs(first.skews).max(axis=1)
    is_squarer &= second.rms_mm <= 2.0 * first.rms_mm + 0.1 * tolerance_mm
    is_worth: Bools = is_close | is_squarer
    return is_worth


def _alike(paths: Paths, others: Paths) -> Bools:
    """Return which paths differ by less than a step of the skew table."""
    reach = np.abs(paths.stations[:, -1] - paths.stations[:, 0])
    result: Bools = np.abs(paths.skews - others.skews).max(axis=1) < 0.01 * reach
    return result


def _better(best: Fits, index: Ints, rivals: Fits, tolerance_mm: float, squareness: float) -> Fits:
    """Return the fits so far, those of the given indices replaced by rivals that are better.

    A squarer rival may be farther off by the squareness, but not leave the tolerance for it.
    """
    old = best.take(index)
    gain = old.max_mm - rivals.max_mm
    less_skew = rivals.skew_mm < old.skew_mm - 1e-6
    less_skew &= (rivals.max_mm <= tolerance_mm) | (old.max_mm > tolerance_mm)
    is_better = np.where(np.abs(gain) < squareness * tolerance_mm, less_skew, gain > 0.0)
    return best.put(index[is_better], rivals.take(np.flatnonzero(is_better)))


def _with_plane(target: Target, fits: Fits, place: int) -> SheetFit:
    """Return one fit of a batch with the plane taken off its target put back."""
    start, end = float(fits.start[place]), float(fits.end[place])
    controls = fits.controls[place] + _plane_controls(target, fits.controls[place, 0], start, end, place)
    return SheetFit(controls, start, end, float(fits.max_mm[place]), float(fits.rms_mm[place]))


def _resumed(target: Target, sheets: Sequence[SheetFit]) -> Fits:
    """Return sheets as the fits of a batch, the plane taken off its target taken off them too."""
    controls = [
        sheet.controls - _plane_controls(target, sheet.controls[0], sheet.start_mm, sheet.end_mm, place)
        for place, sheet in enumerate(sheets)
    ]
    columns = ([getattr(s, name) for s in sheets] for name in ("start_mm", "end_mm", "max_mm", "rms_mm"))
    return Fits(np.stack(controls), *(np.array(column) for column in columns))


def _plane_controls(target: Target, skews: Floats, start: float, end: float, place: int) -> Floats:
    """Return the control values (3, c) of the plane taken off a target, for rulings of the given skews."""
    level, slope_x, slope_y = target.planes[place]
    # A B-spline with the Greville abscissae as control values is the station itself.
    knots = knots_of(len(skews))
    greville = (knots[1:-3] + knots[2:-2] + knots[3:-1]) / 3.0
    stations = start + (end - start) * greville
    near = level + slope_x * (stations - skews / 2.0)
    far = level + slope_x * (stations + skews / 2.0) + slope_y * float(target.width[place, 0, 0])
    return np.stack([np.zeros_like(skews), near, far])
