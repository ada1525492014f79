"""How long to search, and how much of that is spent."""

import time

_LONG = 1 << 60


class Effort:
    """Moves and seconds that may be spent; everything that improves a plan counts in moves.

    Args:
        moves: So many moves, or None for no such limit.
        seconds: So long, or None for no such limit.

    Attributes:
        n_moves: Moves made so far.
    """

    def __init__(self, moves: int | None, seconds: float | None) -> None:
        self.moves, self.seconds = moves, seconds
        self.n_moves = 0
        self.began = time.monotonic()

    def spend(self, moves: int) -> None:
        """Count moves as made."""
        self.n_moves += moves

    @property
    def left(self) -> int:
        """Moves that may still be made."""
        return _LONG if self.moves is None else self.moves - self.n_moves

    @property
    def is_spent(self) -> bool:
        """Whether nothing more should be begun."""
        return self.left <= 0 or (self.seconds is not None and self.elapsed >= self.seconds)

    @property
    def elapsed(self) -> float:
        """Seconds since the beginning."""
        return time.monotonic() - self.began

    @property
    def fraction(self) -> float:
        """How much of it is spent, 0 to 1."""
        shares = [0.0]
        if self.moves:
            shares.append(self.n_moves / self.moves)
        if self.seconds:
            shares.append(self.elapsed / self.seconds)
        return min(1.0, max(shares))
