"""Round values for the marks of an axis."""

import math


def round_marks(low: float, high: float, n_wanted: int) -> list[float]:
    """Return about `n_wanted` values between `low` and `high`, a step of 1, 2 or 5 times a power of ten apart."""
    if not high > low:
        return [low]
    rough = (high - low) / max(n_wanted, 1)
    power = 10.0 ** math.floor(math.log10(rough))
    step = power * next(factor for factor in (1.0, 2.0, 5.0, 10.0) if factor * power >= rough * (1 - 1e-9))
    first = math.ceil(low / step - 1e-9)
    last = math.floor(high / step + 1e-9)
    return [number * step for number in range(first, last + 1)]
