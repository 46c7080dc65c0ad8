"""What the window remembers between sessions: theme, sizes of panes, recent files. Kept in one ini file per user."""

from pathlib import Path
from typing import Literal, get_args

from PySide6.QtCore import QByteArray, QSettings

from studio.resources import state_folder

ThemeChoice = Literal["system", "light", "dark"]
MOST_RECENT = 8


class Settings:
    """Typed access to the user's settings; anything unreadable falls back to its default."""

    def __init__(self, path: Path | None = None) -> None:
        where = path if path is not None else state_folder() / "window.ini"
        self._store = QSettings(str(where), QSettings.Format.IniFormat)

    @property
    def theme(self) -> ThemeChoice:
        """Chosen theme."""
        value = str(self._store.value("theme", "system"))
        return next((choice for choice in get_args(ThemeChoice) if choice == value), "system")

    @theme.setter
    def theme(self, value: ThemeChoice) -> None:
        self._store.setValue("theme", value)

    @property
    def folder(self) -> Path:
        """Folder of the last file dialog."""
        return Path(str(self._store.value("folder", str(Path.home()))))

    @folder.setter
    def folder(self, value: Path) -> None:
        self._store.setValue("folder", str(value))

    @property
    def recent(self) -> list[Path]:
        """Files opened last, the latest first; those that are gone are left out."""
        value = self._store.value("recent", "")
        entries = value.split("\n") if isinstance(value, str) else []
        return [path for path in map(Path, filter(None, entries)) if path.exists()]

    def remember(self, path: Path) -> None:
        """Put a file at the top of the recent ones."""
        whole = path.resolve()
        entries = [whole, *(entry for entry in self.recent if entry != whole)][:MOST_RECENT]
        self._store.setValue("recent", "\n".join(str(entry) for entry in entries))
        self.folder = whole.parent

    def forget_recent(self) -> None:
        """Empty the list of recent files."""
        self._store.remove("recent")

    def shape(self, name: str) -> QByteArray | None:
        """Stored shape of a window or of a row of panes."""
        value = self._store.value(f"shape/{name}")
        return value if isinstance(value, QByteArray) and not value.isEmpty() else None

    def keep_shape(self, name: str, value: QByteArray) -> None:
        """Store the shape of a window or of a row of panes."""
        self._store.setValue(f"shape/{name}", value)

    def forget_shapes(self) -> None:
        """Go back to the usual shape of the window."""
        self._store.remove("shape")

    def write(self) -> None:
        """Write everything to the file now."""
        self._store.sync()
