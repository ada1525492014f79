"""Array types and the checks every array passes when it enters a record."""

from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from cutblock.base.errors import GeometryError

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


def floats(values: ArrayLike, shape: tuple[int | None, ...], name: str) -> Floats:
    """Return `values` as finite float64 of the given shape.

    Args:
        values: Anything numpy takes.
        shape: Wanted shape; None stands for any length.
        name: What the values are, for the message.

    Raises:
        GeometryError: They are no real numbers, the shape is another or a value is not finite.
    """
    array = as_floats(values, name)
    _check_shape(array, shape, name)
    if not np.isfinite(array).all():
        row = int(np.argwhere(~np.isfinite(array))[0][0])
        raise GeometryError(f"{name} has a value that is not a finite number", f"row {row + 1}", "Give plain numbers.")
    return array


def as_floats(values: ArrayLike, name: str) -> Floats:
    """Return `values` as float64 of whatever shape.

    Args:
        values: Anything numpy takes.
        name: What the values are, for the message.

    Raises:
        GeometryError: They are text, complex or rows of unequal length.
    """
    try:
        array = np.asarray(values)
        if array.dtype.kind in "cSUMm":
            raise TypeError(array.dtype)
        return np.asarray(array, dtype=np.float64)
    except (TypeError, ValueError) as error:
        raise GeometryError(f"{name} is no array of numbers", name, "Give plain numbers.") from error


def one_number(value: ArrayLike, name: str) -> float:
    """Return one number as a float, which may be any; raises like `as_floats`, and where it is not one number."""
    array = as_floats(value, name)
    if array.size != 1:
        raise GeometryError(f"{name} is {array.size} numbers, wanted one", name, "Give one plain number.")
    return float(array.ravel()[0])


def frozen_floats(values: ArrayLike, shape: tuple[int | None, ...], name: str) -> Floats:
    """Return a read-only copy of `values` as finite float64 of the given shape; raises like `floats`.

    An array that came out of here before is returned as it is, so that records made of one another share it.
    """
    array = floats(values, shape, name)
    if array is values and array.base is None and not array.flags.writeable:
        return array
    array = array.copy()
    array.flags.writeable = False
    return array


def frozen_integers(values: ArrayLike, shape: tuple[int | None, ...], name: str) -> Ints:
    """Return a read-only copy of `values` as int64 of the given shape.

    Raises:
        GeometryError: The shape is another.
    """
    array: Ints = np.array(values, dtype=np.int64)
    _check_shape(array, shape, name)
    array.flags.writeable = False
    return array


def _check_shape(array: NDArray[Any], shape: tuple[int | None, ...], name: str) -> None:
    if array.ndim != len(shape) or any(w is not None and w != n for w, n in zip(shape, array.shape, strict=True)):
        wanted = " x ".join("n" if n is None else str(n) for n in shape)
        raise GeometryError(f"{name} has shape {array.shape}, wanted {wanted}", name)
