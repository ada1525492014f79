"""What the window remembers from one start to the next; read with types, because an INI file holds only text."""

from PySide6.QtCore import QByteArray, QSettings

from cutblock.window.theme import SYSTEM, THEMES, ZOOMS

_MOST_RECENT = 10


class WindowSettings:
    """Typed access to the settings file."""

    def __init__(self, path: str) -> None:
        self._store = QSettings(path, QSettings.Format.IniFormat)

    @property
    def theme(self) -> str:
        """One of the themes."""
        found = str(self._store.value("theme", SYSTEM, str))
        return found if found in THEMES else SYSTEM

    @theme.setter
    def theme(self, choice: str) -> None:
        self._store.setValue("theme", choice)

    @property
    def zoom(self) -> float:
        """One of the zooms."""
        found = self._store.value("zoom", 1.0, float)
        return min(ZOOMS, key=lambda zoom: abs(zoom - float(found if isinstance(found, int | float) else 1.0)))

    @zoom.setter
    def zoom(self, factor: float) -> None:
        self._store.setValue("zoom", factor)

    @property
    def recent(self) -> list[str]:
        """Job files opened, the last one first."""
        found = self._store.value("recent", [], list)
        return [str(path) for path in found] if isinstance(found, list) else []

    def add_recent(self, path: str) -> None:
        """Put a job file first."""
        self._store.setValue("recent", [path, *(other for other in self.recent if other != path)][:_MOST_RECENT])

    @property
    def geometry(self) -> QByteArray:
        """The window's place and size; empty at the first start."""
        found = self._store.value("geometry", QByteArray())
        return found if isinstance(found, QByteArray) else QByteArray()

    @geometry.setter
    def geometry(self, geometry: QByteArray) -> None:
        self._store.setValue("geometry", geometry)

    def save(self) -> None:
        """Write the file now."""
        self._store.sync()
