"""Every action of the window with its menu and shortcut."""

from typing import TYPE_CHECKING

from PySide6.QtGui import QAction, QActionGroup, QKeySequence
from PySide6.QtWidgets import QMenu

from cutblock.window.desks import Desks
from cutblock.window.theme import DARK, LIGHT, SYSTEM

if TYPE_CHECKING:
    from cutblock.window.frame import MainWindow

_THEME_TITLES = {SYSTEM: "As the &system", LIGHT: "&Light", DARK: "&Dark"}


class Menus:
    """The actions, made once; `show_state` enables what can be done now."""

    def __init__(self, window: "MainWindow") -> None:
        self._window = window
        key = QKeySequence.StandardKey
        self.open = self._action("&Open job…", key.Open)
        self.open_folder = self._action("Open &plan folder…", "Ctrl+Shift+O")
        self.again = self._action("Plan &again", "F5")
        self.compare = self._action("&Compare options", "F6")
        self.save = self._action("&Save plan folder…", key.Save)
        self.tags = self._action("&Export tags…", "Ctrl+P")
        self.quit = self._action("&Quit", "Ctrl+Q")
        self.cancel = self._action("Cancel", "Esc")
        self.larger = self._action("&Larger text", "Ctrl++")
        self.larger.setShortcuts([QKeySequence("Ctrl++"), QKeySequence("Ctrl+=")])
        self.smaller = self._action("&Smaller text", "Ctrl+-")
        self.usual = self._action("&Usual text size", "Ctrl+0")
        self.cautions = self._action("&Cautions", "F1")
        self.about = self._action("&About cutblock", "Shift+F1")
        self.desks = [self._action(f"&{n} {title}", f"Ctrl+{n}") for n, title in enumerate(Desks.TITLES, start=1)]
        self.themes = self._theme_actions()
        self.recent = QMenu("Open &recent", window)
        self._lay_out()

    def show_state(self, *, has_plan: bool, has_job: bool, is_busy: bool) -> None:
        """Enable what can be done now."""
        for action in (self.open, self.open_folder):
            action.setEnabled(not is_busy)
        self.recent.setEnabled(not is_busy and not self.recent.isEmpty())
        for action in (self.again, self.compare):
            action.setEnabled(has_job and not is_busy)
        for action in (self.save, self.tags):
            action.setEnabled(has_plan and not is_busy)
        for action in self.desks:
            action.setEnabled(has_plan)
        self.cancel.setEnabled(is_busy)

    def show_recent(self, paths: list[str]) -> None:
        """Replace the recent jobs."""
        self.recent.clear()
        for number, path in enumerate(paths, start=1):
            action = self.recent.addAction(f"&{number % 10} {path.replace('&', '&&')}")
            action.setData(path)
        self.recent.setEnabled(bool(paths))

    def _action(self, text: str, shortcut: QKeySequence.StandardKey | str) -> QAction:
        action = QAction(text, self._window)
        action.setShortcut(QKeySequence(shortcut))
        self._window.addAction(action)
        return action

    def _theme_actions(self) -> dict[str, QAction]:
        group = QActionGroup(self._window)
        actions = {}
        for number, (choice, title) in enumerate(_THEME_TITLES.items(), start=1):
            action = self._action(title, f"Ctrl+Alt+{number}")
            action.setCheckable(True)
            action.setData(choice)
            group.addAction(action)
            actions[choice] = action
        return actions

    def _lay_out(self) -> None:
        bar = self._window.menuBar()
        file = bar.addMenu("&File")
        file.addAction(self.open)
        file.addMenu(self.recent)
        file.addAction(self.open_folder)
        file.addSeparator()
        file.addActions([self.again, self.compare, self.cancel])
        file.addSeparator()
        file.addActions([self.save, self.tags])
        file.addSeparator()
        file.addAction(self.quit)
        edit = bar.addMenu("&Edit")
        edit.addActions([self._window.undo_action, self._window.redo_action])
        view = bar.addMenu("&View")
        view.addActions(self.desks)
        view.addSeparator()
        theme = view.addMenu("&Theme")
        theme.addActions(list(self.themes.values()))
        view.addActions([self.larger, self.smaller, self.usual])
        about = bar.addMenu("&Help")
        about.addActions([self.cautions, self.about])
