"""The base of every record."""

from dataclasses import fields
from typing import Any


def _rebuild(kind: type["Record"], values: dict[str, Any]) -> "Record":
    return kind(**values)


class Record:
    """A frozen dataclass with slots and keyword-only fields.

    Pickling rebuilds through the constructor, because numpy forgets an array's read-only mark when it is pickled.
    """

    __slots__ = ()

    def __reduce__(self) -> tuple[Any, ...]:
        return _rebuild, (type(self), {field.name: getattr(self, field.name) for field in fields(self)})  # type: ignore[arg-type]
