"""Changes theme and text size at once and remembers them."""

from PySide6.QtCore import QObject, Slot
from PySide6.QtGui import QAction

from cutblock.window.settings import WindowSettings
from cutblock.window.theme import ZOOMS, Theme


class Appearance(QObject):
    """The theme and the text size chosen; applied from the beginning."""

    def __init__(self, settings: WindowSettings, theme: Theme, parent: QObject) -> None:
        super().__init__(parent)
        self._settings = settings
        self._theme = theme
        self._apply()

    @Slot()
    def set_theme(self) -> None:
        """Take the theme that is the data of the action which asks."""
        sender = self.sender()
        assert isinstance(sender, QAction)
        self._settings.theme = str(sender.data())
        self._apply()

    @Slot()
    def zoom_in(self) -> None:
        """Make text one step larger."""
        self._set_zoom(1)

    @Slot()
    def zoom_out(self) -> None:
        """Make text one step smaller."""
        self._set_zoom(-1)

    @Slot()
    def zoom_usual(self) -> None:
        """Give text its usual size again."""
        self._settings.zoom = 1.0
        self._apply()

    def _set_zoom(self, step: int) -> None:
        at = ZOOMS.index(self._settings.zoom) + step
        if 0 <= at < len(ZOOMS):
            self._settings.zoom = ZOOMS[at]
            self._apply()

    def _apply(self) -> None:
        self._theme.apply(self._settings.theme, self._settings.zoom)
