"""Steps of deviation against the tolerance, each with a letter, a colour and a hatch."""

from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.records.panel import Panel
from cutblock.records.sweep import Serving, Sweep


class Step(NamedTuple):
    """One step of the legend."""

    letter: str
    colour: str
    hatch: str
    share: float  # largest deviation of the step as a share of the tolerance; infinite above it
    is_within: bool


# A sequence from pale to deep blue within the tolerance, vermillion and hatched above it.
STEPS = (
    Step("A", "#e3f1fa", "", 0.25, is_within=True),
    Step("B", "#a9d8f3", "", 0.5, is_within=True),
    Step("C", "#56B4E9", "", 0.75, is_within=True),
    Step("D", "#0072B2", "", 1.0, is_within=True),
    Step("E", "#D55E00", "/", float("inf"), is_within=False),
)
NOT_CUT = Step("N", "#b0b5bb", "x", float("nan"), is_within=False)


def step_of(deviation_mm: float, tolerance_mm: float) -> Step:
    """Return the step a deviation falls in; exactly the tolerance is within."""
    return next(step for step in STEPS if abs(deviation_mm) <= step.share * tolerance_mm)


def legend_text(step: Step, tolerance_mm: float) -> str:
    """Return what the legend says of a step, e.g. "0.50 to 1.00 mm"."""
    if step is NOT_CUT:
        return "no sweep yet"
    if not step.is_within:
        return f"over {tolerance_mm:.2f} mm"
    return f"{(step.share - 0.25) * tolerance_mm:.2f} to {step.share * tolerance_mm:.2f} mm"


def servings_by_panel(sweeps: tuple[Sweep, ...], is_mould: bool = True) -> dict[str, list[tuple[Sweep, Serving]]]:
    """Return for every panel the halves that mould it, or that close it by a sweep of their own, strip by strip."""
    found: dict[str, list[tuple[Sweep, Serving]]] = {}
    for sweep in sweeps:
        for serving in sweep.serving:
            if serving.is_mould == is_mould:
                found.setdefault(serving.panel, []).append((sweep, serving))
    for halves in found.values():
        halves.sort(key=lambda half: half[1].strip)
    return found


def worst_by_panel(panels: tuple[Panel, ...], sweeps: tuple[Sweep, ...]) -> dict[str, float | None]:
    """Return for every panel the largest deviation of its finished mould face, mm; None where nothing moulds it."""
    halves = servings_by_panel(sweeps)
    return {
        panel.id: max((serving.max_mm for _, serving in halves.get(panel.id, [])), default=None) for panel in panels
    }


class SignedStep(NamedTuple):
    """One step of the map of a single panel; shares of the tolerance, foam above the form counting positive."""

    colour: str
    low_share: float
    high_share: float


# From deep blue (foam too low) over near white to vermillion (foam too high): told apart with any colour vision.
SIGNED_STEPS = (
    SignedStep("#003a63", -float("inf"), -1.0),
    SignedStep("#0072B2", -1.0, -0.5),
    SignedStep("#8cc4e6", -0.5, -0.1),
    SignedStep("#f4f4f2", -0.1, 0.1),
    SignedStep("#f6c88f", 0.1, 0.5),
    SignedStep("#E69F00", 0.5, 1.0),
    SignedStep("#b13a00", 1.0, float("inf")),
)


def signed_steps_of(deviations_mm: Floats, tolerance_mm: float) -> Ints:
    """Return for each deviation the index of its step in `SIGNED_STEPS`; exactly the tolerance is within."""
    shares = np.asarray(deviations_mm) / tolerance_mm
    low = np.array([step.high_share for step in SIGNED_STEPS[:3]])
    high = np.array([step.high_share for step in SIGNED_STEPS[3:-1]])
    index = np.searchsorted(low, shares, side="right") + np.searchsorted(high, shares, side="left")
    return index.astype(np.int64)


def signed_text(step: SignedStep, tolerance_mm: float) -> str:
    """Return what the legend of one panel says of a step, e.g. "0.20 to 1.00 mm"."""
    low, high = step.low_share * tolerance_mm, step.high_share * tolerance_mm
    if step.low_share == -float("inf"):
        return f"under {high:.2f} mm"
    if step.high_share == float("inf"):
        return f"over {low:.2f} mm"
    return f"{low:.2f} to {high:.2f} mm"
