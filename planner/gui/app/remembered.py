"""What the program remembers between runs: window, recent files, last folder, colours."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import QByteArray, QSettings

_RECENT = 8


class Remembered:
    """A small door to QSettings, in its default format (an ini file in tests)."""

    def __init__(self) -> None:
        self._settings = QSettings(
            QSettings.defaultFormat(), QSettings.Scope.UserScope, "Rangewright", "Rangewright"
        )

    def recent(self) -> list[str]:
        """Paths opened lately that still exist, newest first."""
        kept = self._settings.value("recent", [])
        paths = kept if isinstance(kept, list) else [kept]
        return [str(path) for path in paths if path and Path(str(path)).exists()]

    def add_recent(self, path: Path) -> None:
        """Put ``path`` first."""
        text = str(path.resolve())
        self._settings.setValue("recent", [text, *(p for p in self.recent() if p != text)][:_RECENT])

    def clear_recent(self) -> None:
        """Forget the list."""
        self._settings.remove("recent")

    def folder(self) -> str:
        """The folder file dialogs start in."""
        kept = str(self._settings.value("folder", "") or "")
        return kept if kept and Path(kept).is_dir() else str(Path.home())

    def set_folder(self, folder: Path) -> None:
        """Remember where the user chose a file."""
        self._settings.setValue("folder", str(folder))

    def bytes_of(self, key: str) -> QByteArray:
        """A saved geometry or state; empty when there is none."""
        kept = self._settings.value(key)
        return kept if isinstance(kept, QByteArray) else QByteArray()

    def set_bytes(self, key: str, state: QByteArray) -> None:
        """Save a geometry or state."""
        self._settings.setValue(key, state)

    def word(self, key: str, default: str) -> str:
        """A choice among words."""
        return str(self._settings.value(key, default) or default)

    def set_word(self, key: str, word: str) -> None:
        """Save a choice."""
        self._settings.setValue(key, word)

    def flush(self) -> None:
        """Write to disk now."""
        self._settings.sync()
