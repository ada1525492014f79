"""Reads large amounts of numbers written as text."""

import warnings
from collections.abc import Sequence

import numpy as np

from cutblock.base.arrays import Floats


def all_numbers(text: str) -> Floats | None:
    """Return the numbers of a text that holds nothing else but blanks between them, or None."""
    with warnings.catch_warnings():
        # numpy only warns when it stops at something that is no number.
        warnings.simplefilter("error")
        try:
            values: Floats = np.fromstring(text, dtype=np.float64, sep=" ")
        except (DeprecationWarning, ValueError):
            return None
    return values


def number_rows(rows: Sequence[str]) -> Floats | None:
    """Return (n, k) numbers, or None where a row holds something else or another count than the first."""
    if not rows:
        return None
    width = len(rows[0].split())
    values = all_numbers(" nan ".join(rows) + " nan ")
    if values is None or len(values) != len(rows) * (width + 1):
        return None
    table = values.reshape(len(rows), width + 1)
    # The mark behind each row is where it belongs only if every row has the same count.
    if not np.isnan(table[:, width]).all():
        return None
    return table[:, :width]
