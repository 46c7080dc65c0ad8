"""Every command of the window in one table: menu, words, key, icon, when it can be used."""

from collections.abc import Callable, Mapping
from typing import NamedTuple

from PySide6.QtGui import QAction, QKeySequence
from PySide6.QtWidgets import QMainWindow, QMenu

from studio.resources import icon
from studio.theme import Theme
from studio.views.strip import KEYS, SEGMENT_KINDS, VESSEL_KINDS
from studio.words import kind_words

ALWAYS, SELECTED, SAVABLE, ROLLED = "always", "selected", "savable", "rolled"
"""When a command can be used."""
SEPARATOR = ""


class Spec(NamedTuple):
    """One command."""

    name: str
    words: str
    keys: tuple[str, ...] = ()
    needs: str = ALWAYS
    picture: str = ""
    checkable: bool = False


ADD = tuple(Spec(f"add_{kind}", kind_words(kind), (KEYS[kind],), ALWAYS, kind) for kind in SEGMENT_KINDS + VESSEL_KINDS)
RULE = Spec(SEPARATOR, "")

MENUS: Mapping[str, tuple[Spec, ...]] = {
    "&File": (
        Spec("new", "&New", ("Ctrl+N",)),
        Spec("open", "&Open …", ("Ctrl+O",)),
        Spec("recent", "Open &recent"),
        Spec("demonstration", "Open the &demonstration"),
        RULE,
        Spec("save", "&Save", ("Ctrl+S",)),
        Spec("save_as", "Save &as …", ("Ctrl+Shift+S",)),
        RULE,
        Spec("export_parts", "&Export parts …", ("Ctrl+E",), SAVABLE),
        RULE,
        Spec("quit", "&Quit", ("Ctrl+Q",)),
    ),
    "&Edit": (
        Spec("undo", "&Undo", ("Ctrl+Z",), "undo", "undo"),
        Spec("redo", "&Redo", ("Ctrl+Shift+Z", "Ctrl+Y"), "redo", "redo"),
        RULE,
        Spec("duplicate", "D&uplicate", ("Ctrl+D",), SELECTED, "duplicate"),
        Spec("delete", "&Delete", ("Del", "Backspace"), SELECTED, "delete"),
        Spec("earlier", "Move &earlier", ("Alt+Left",), SELECTED, "earlier"),
        Spec("later", "Move &later", ("Alt+Right",), SELECTED, "later"),
        RULE,
        Spec("select_before", "Select the one &before", ("Ctrl+[",), SAVABLE),
        Spec("select_after", "Select the one a&fter", ("Ctrl+]",), SAVABLE),
        Spec("select_all", "Select &all", ("Ctrl+A",), SAVABLE),
        Spec("select_none", "Select the &run", ("Escape",)),
        Spec("numbers", "Go to the &numbers", ("F2",)),
        Spec("add_site", "Add a s&ite", (), "siteless"),
    ),
    "&Add": (*ADD[: len(SEGMENT_KINDS)], RULE, *ADD[len(SEGMENT_KINDS) :]),
    "&View": (
        Spec("theme_system", "Theme of the &system", (), ALWAYS, "", True),
        Spec("theme_light", "&Light theme", (), ALWAYS, "", True),
        Spec("theme_dark", "&Dark theme", (), ALWAYS, "", True),
        RULE,
        Spec("fit", "&Fit", ("F",), ALWAYS, "fit"),
        RULE,
        Spec("pane_plan", "&Plan", ("F5",), ALWAYS, "", True),
        Spec("pane_view3d", "&3D view", ("F6",), ALWAYS, "", True),
        Spec("pane_elevation", "&Elevation", ("F7",), ALWAYS, "", True),
        Spec("pane_playback", "Pla&yback", ("F8",), ALWAYS, "", True),
        Spec("pane_inspector", "&Inspector", ("F9",), ALWAYS, "", True),
        Spec("pane_findings", "Fi&ndings", ("F10",), ALWAYS, "", True),
        Spec("usual_panes", "&Usual panes"),
    ),
    "&Play": (
        Spec("play", "&Play or pause", ("P",), ROLLED, "play"),
        Spec("to_start", "To the &release", ("Ctrl+Home",), ROLLED, "start"),
        Spec("step_back", "Step &back", (",",), ROLLED, "back"),
        Spec("step_on", "Step &on", (".",), ROLLED, "forward"),
        Spec("slower", "&Slower", ("-",), ROLLED),
        Spec("faster", "&Faster", ("+",), ROLLED),
        Spec("next_finding", "&Next finding", ("N",), ROLLED),
        Spec("take_cure", "&Take its cure", ("C",), ROLLED),
    ),
    "&Help": (
        Spec("keys", "&Keys", ("F1",)),
        Spec("cautions", "&Cautions"),
        Spec("about", "&About Trundle"),
    ),
}


def build_menus(
    window: QMainWindow, theme: Theme, slots: Mapping[str, Callable[[], object]], recent: QMenu
) -> dict[str, QAction]:
    """Make the menus of a window; return the actions by name.

    `slots` says what each command does, by its name; `recent` is the menu of the recent files.
    """
    made: dict[str, QAction] = {}
    for title, specs in MENUS.items():
        menu = window.menuBar().addMenu(title)
        for spec in specs:
            if spec.name == SEPARATOR:
                menu.addSeparator()
            elif spec.name == "recent":
                recent.setTitle(spec.words)
                menu.addMenu(recent)
            else:
                made[spec.name] = _action(window, spec, slots[spec.name])
                menu.addAction(made[spec.name])
    draw_icons(made, theme)
    return made


def _action(window: QMainWindow, spec: Spec, slot: Callable[[], object]) -> QAction:
    """One action."""
    action = QAction(spec.words, window)
    action.setObjectName(spec.name)
    action.setShortcuts([QKeySequence(keys) for keys in spec.keys])
    action.setCheckable(spec.checkable)
    action.triggered.connect(lambda _checked=False: slot())
    return action


def draw_icons(actions: Mapping[str, QAction], theme: Theme) -> None:
    """Icons in the ink of the theme."""
    for specs in MENUS.values():
        for spec in specs:
            if spec.picture and spec.name in actions:
                actions[spec.name].setIcon(icon(spec.picture, theme.colour("ink")))


def needs_of(name: str) -> str:
    """When a command can be used."""
    return next(spec.needs for specs in MENUS.values() for spec in specs if spec.name == name)


def key_rows() -> list[tuple[str, str]]:
    """Commands that have a key, with their keys, for the page of keys."""
    rows = []
    for title, specs in MENUS.items():
        place = title.replace("&", "")
        for spec in specs:
            if spec.keys:
                rows.append((f"{place}: {spec.words.replace('&', '').removesuffix(' …')}", " or ".join(spec.keys)))
    return rows
