"""The inner loops compiled by numba, where it is installed and the work is long enough to pay for its start."""

import importlib.util
import sys
from functools import cache
from types import ModuleType
from typing import Any

from cutblock.packing import kernels
from cutblock.packing.sequences import Make

# In the order they call each other; numba looks a called function up by its name when the caller is compiled.
_COMPILED = (
    "find_place",
    "choose_order",
    "set_rests",
    "set_least",
    "open_block",
    "put",
    "fill",
    "draw",
    "choose_blocks",
    "take_out",
    "disturb",
    "offer_kinds",
    "weigh",
    "keep",
    "is_kept",
    "one",
    "search",
)
_COPY = "cutblock.packing.kernels_compiled"


class Inner(Make):
    """The inner loops with the kind of sequence they take.

    Attributes:
        loops: The module of `kernels`, or its compiled copy.
    """

    def __init__(self, loops: ModuleType, is_compiled: bool) -> None:
        super().__init__(is_compiled)
        self.loops: Any = loops


def plain() -> Inner:
    """Return the inner loops as they stand."""
    return Inner(kernels, is_compiled=False)


@cache
def compiled() -> Inner | None:
    """Return the inner loops compiled by numba; None where it is not installed."""
    if importlib.util.find_spec("numba") is None:
        return None
    numba: Any = importlib.import_module("numba")
    spec = importlib.util.spec_from_file_location(_COPY, kernels.__file__)
    if spec is None or spec.loader is None:
        return None
    copy = importlib.util.module_from_spec(spec)
    sys.modules[_COPY] = copy
    spec.loader.exec_module(copy)
    for name in _COMPILED:
        setattr(copy, name, numba.njit(cache=True, nogil=True)(getattr(copy, name)))
    return Inner(copy, is_compiled=True)
