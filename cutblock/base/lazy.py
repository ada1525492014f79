"""Names of a package that are imported when first asked for, so that start-up stays light (PEP 562)."""

import importlib
from collections.abc import Callable, Mapping
from typing import Any


def lazy_names(package: str, homes: Mapping[str, str]) -> Callable[[str], Any]:
    """Return a module `__getattr__` for `package`.

    Args:
        package: The package's `__name__`.
        homes: For each public name the module that defines it; a name that is itself a module stands for itself.
    """

    def get(name: str) -> Any:  # noqa: ANN401 - a module attribute can be anything
        home = homes.get(name)
        if home is None:
            raise AttributeError(f"module {package!r} has no attribute {name!r}")
        module = importlib.import_module(home)
        return module if home == f"{package}.{name}" else getattr(module, name)

    return get
