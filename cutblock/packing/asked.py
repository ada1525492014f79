"""What a job asks of its billets by name: which stay unturned, and which stay together in one block."""

from collections.abc import Iterable, Sequence
from difflib import get_close_matches

import numpy as np

from cutblock.base.arrays import Bools
from cutblock.base.errors import InputError
from cutblock.records.job import Job, Pin
from cutblock.records.sweep import Sweep


def names_of(sweep: Sweep, faces: Iterable[str]) -> set[str]:
    """Return every name a billet goes by: its sweep, its panels and their faces, as they are written in ids."""
    names = {sweep.id, *sweep.panels}
    for panel in sweep.panels:
        whole = panel.rpartition("-")[0]
        names |= {face for face in faces if whole == face or whole.rstrip("0123456789") == face}
    return names


def locked(job: Job, sweeps: Sequence[Sweep]) -> Bools:
    """Return which billets keep their length along the block, (n,).

    Raises:
        InputError: `cutting.no_turn` names nothing of the job.
    """
    faces = [_as_in_ids(face.name) for face in job.faces]
    wanted = {_as_in_ids(name): name for name in job.no_turn}
    names = [names_of(sweep, faces) for sweep in sweeps]
    known = set().union(*names) if names else set()
    for key, name in wanted.items():
        if key not in known:
            raise InputError(
                f'"{name}" in cutting.no_turn is no face, panel or sweep that is cut',
                "cutting.no_turn",
                _near(name, known),
            )
    return np.array([not wanted.keys().isdisjoint(own) for own in names], dtype=np.bool_)


def pinned(job: Job, sweeps: Sequence[Sweep]) -> tuple[tuple[Pin, list[int]], ...]:
    """Return each pin with the places of its sweeps.

    Raises:
        InputError: A pin names a sweep the plan has not.
    """
    places = {sweep.id: place for place, sweep in enumerate(sweeps)}
    for pin in job.pins:
        for name in pin.sweeps:
            if name not in places:
                raise InputError(
                    f'the pin of {pin.block} names the sweep "{name}", which this plan has not',
                    pin.place,
                    _near(name, places),
                )
    return tuple((pin, [places[name] for name in pin.sweeps]) for pin in job.pins)


def _as_in_ids(name: str) -> str:
    return name.upper().replace(" ", "-").replace("_", "-")


def _near(name: str, known: Iterable[str]) -> str:
    found = get_close_matches(_as_in_ids(name), sorted(known), n=3, cutoff=0.5)
    return f"Perhaps {' or '.join(found)}; or take it out." if found else "Take it out."
