"""The inner loops compiled by numba, where it is installed and the work is long enough to pay for their start.

They are compiled in a thread while the work goes on with the loops as they stand; both give the same numbers, so it
does not matter when the one takes over from the other.
"""

import importlib.util
import sys
import threading
import zlib
from collections.abc import Callable
from itertools import product
from pathlib import Path
from types import ModuleType
from typing import Any

from cutblock.packing import cover, kernels, moves, recursion
from cutblock.packing.sequences import Make

# In the order they call each other; numba looks a called function up by its name when the caller is compiled.
_COMPILED = {
    kernels: (
        "suit", "find_place", "choose_order", "set_rests", "set_least", "open_block", "put", "begin", "prune", "fill",
    ),
    moves: (
        "draw", "choose_blocks", "take_out", "disturb", "offer_kinds", "weigh", "keep", "find_key", "remember",
        "is_kept", "one", "search",
    ),
    recursion: ("best_cut", "decide", "recur"),
    cover: ("reprice", "score_of", "choose"),
}  # fmt: skip
_OWNING = frozenset({"prune", "fill", "one", "search"})  # make arrays, or call what does
_WAIT = 0.02  # s between two looks at the compiling thread


class Inner(Make):
    """The inner loops with the kind of sequence they take.

    Attributes:
        fill: `kernels.fill`, or its compiled copy.
        begin: `kernels.begin` likewise.
        search: `moves.search` likewise.
        recur: `recursion.recur` likewise.
        reprice: `cover.reprice` likewise.
        choose: `cover.choose` likewise.
    """

    def __init__(self, modules: tuple[ModuleType, ...], is_compiled: bool) -> None:
        super().__init__(is_compiled)
        filling, moving, laying, covering = modules
        self.fill: Any = filling.fill
        self.begin: Any = filling.begin
        self.search: Any = moving.search
        self.recur: Any = laying.recur
        self.reprice: Any = covering.reprice
        self.choose: Any = covering.choose


class Gear:
    """Which inner loops are at work: given ones, or the best there are at the time.

    Args:
        fixed: The loops to use throughout, or None.
    """

    def __init__(self, fixed: Inner | None = None) -> None:
        self.fixed = fixed

    def inner(self) -> Inner:
        """Return the loops to go on with."""
        return self.fixed or _WORKSHOP.ready or _PLAIN

    def ask_for(self) -> None:
        """Begin to compile the loops in a thread, where numba is installed and that was not begun before."""
        if self.fixed is None:
            _WORKSHOP.start()

    def wait_for(self, tell: Callable[[], None]) -> None:
        """Wait for the compiled loops, telling now and then."""
        self.ask_for()
        if self.fixed is None:
            _WORKSHOP.wait(tell)


class _Workshop:
    """Where the compiled loops are made, once in a process."""

    def __init__(self) -> None:
        self.lock = threading.Lock()
        self.thread: threading.Thread | None = None
        self.ready: Inner | None = None

    def start(self) -> None:
        """Begin to compile in a thread, if that was not done before."""
        with self.lock:
            if self.thread is None and importlib.util.find_spec("numba") is not None:
                self.thread = threading.Thread(target=self.make, name="compile the packing")
                self.thread.start()

    def make(self) -> None:
        """Compile every function by running a small task; where nothing can be compiled the plain loops stay in use."""
        from cutblock.packing.rehearsal import rehearse

        numba: Any = importlib.import_module("numba")
        # No folder to keep compiled code in; an option numba does not know; code it cannot compile.
        failures = (RuntimeError, KeyError, numba.errors.NumbaError)
        for is_lean, is_cached in product((True, False), (True, False)):
            try:
                inner = _copies(numba, is_cached, is_lean)
                rehearse(inner)
            except failures:
                continue
            self.ready = inner
            return

    def wait(self, tell: Callable[[], None]) -> None:
        """Wait until they are ready, telling now and then."""
        while self.thread is not None and self.thread.is_alive():
            self.thread.join(_WAIT)
            tell()


_PLAIN = Inner((kernels, moves, recursion, cover), is_compiled=False)
_WORKSHOP = _Workshop()


def plain() -> Inner:
    """Return the inner loops as they stand."""
    return _PLAIN


def compiled() -> Inner | None:
    """Return the compiled loops when they are ready; None where numba is not installed."""
    _WORKSHOP.start()
    _WORKSHOP.wait(lambda: None)
    return _WORKSHOP.ready


def _copies(numba: Any, is_cached: bool, is_lean: bool) -> Inner:  # noqa: ANN401 - a module without types
    """Return copies of the modules, each function of which is compiled at its first call.

    Lean functions do not count the references to the arrays in their tuples, which takes longer than their work.
    """
    digest = f"{_digest()}_{is_lean:d}"
    made: dict[str, Any] = {}
    copies: list[ModuleType] = []
    for module, names in _COMPILED.items():
        copy = _copy(module)
        vars(copy).update({name: function for name, function in made.items() if hasattr(copy, name)})
        for name in names:
            function = getattr(copy, name)
            function.__qualname__ = f"{name}_{digest}"
            options = {} if name in _OWNING or not is_lean else {"_nrt": False}
            made[name] = numba.njit(cache=is_cached, nogil=True, error_model="numpy", **options)(function)
            setattr(copy, name, made[name])
        copies.append(copy)
    return Inner(tuple(copies), is_compiled=True)


def _digest() -> str:
    """Return a digest of all loops; numba keeps what it compiles by name and would miss a change in another module."""
    sources = [Path(str(module.__file__)).read_bytes() for module in _COMPILED]
    return format(zlib.crc32(b"".join(sources)), "08x")


def _copy(module: ModuleType) -> ModuleType:
    name = f"{module.__name__}_compiled"
    spec = importlib.util.spec_from_file_location(name, module.__file__)
    if spec is None or spec.loader is None:
        raise ImportError(f"{module.__name__} has no file")
    copy = importlib.util.module_from_spec(spec)
    sys.modules[name] = copy
    spec.loader.exec_module(copy)
    return copy
