"""QR symbols (ISO/IEC 18004) as rows of modules."""

from functools import lru_cache

LEVELS = ("Q", "M")  # a quarter, then a seventh of the symbol may be lost
QUIET_MODULES = 4  # ISO/IEC 18004: four light modules on every side


@lru_cache(maxsize=4096)  # the window asks again for the tags of every plan it shows
def qr_rows(code: str, most_modules: int) -> tuple[str, ...]:
    """Return the modules of a QR symbol, without the quiet zone.

    Args:
        code: Letters, digits and $%*+-./: only, so that the symbol stays small.
        most_modules: The stronger error correction (Q, then M) is taken whose symbol is no wider than this; where
            neither is, M.

    Returns:
        One text a row, "1" dark and "0" light.
    """
    import segno

    for level in LEVELS:
        symbol = segno.make_qr(code, error=level, boost_error=False)
        if symbol.symbol_size(border=0)[0] <= most_modules:
            break
    return tuple("".join("1" if module else "0" for module in row) for row in symbol.matrix)
