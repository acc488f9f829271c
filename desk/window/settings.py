"""What the window remembers from one start to the next, each with its type."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from PySide6.QtCore import QByteArray, QSettings

__all__ = ["Settings"]

_LAYOUT_VERSION = 1
"""Rises when a remembered geometry no longer suits the window."""


class Settings:
    """A typed face on one INI file.

    Attributes
    ----------
    path : Path
        Of the file.
    """

    def __init__(self, path: Path | None = None) -> None:
        """Use the file at `path`; by default the one of the application's name."""
        if path is None:
            self._store = QSettings(
                QSettings.Format.IniFormat, QSettings.Scope.UserScope, "Gapwright", "Gapwright"
            )
        else:
            self._store = QSettings(str(path), QSettings.Format.IniFormat)
        self.path = Path(self._store.fileName())

    def flush(self) -> None:
        """Write what has changed."""
        self._store.sync()

    @property
    def theme_mode(self) -> str:
        """``system``, ``light`` or ``dark``."""
        mode = self._text("look/theme", "system")
        return mode if mode in ("system", "light", "dark") else "system"

    @theme_mode.setter
    def theme_mode(self, mode: str) -> None:
        self._store.setValue("look/theme", mode)

    @property
    def geometry(self) -> QByteArray:
        """Of the window, as Qt packs it; empty where there is none."""
        if self._whole("window/layout_version", 0) != _LAYOUT_VERSION:
            return QByteArray()
        value: Any = self._store.value("window/geometry", QByteArray())
        return value if isinstance(value, QByteArray) else QByteArray()

    @geometry.setter
    def geometry(self, geometry: QByteArray) -> None:
        self._store.setValue("window/layout_version", _LAYOUT_VERSION)
        self._store.setValue("window/geometry", geometry)

    @property
    def station(self) -> str:
        """Key of the station shown last."""
        return self._text("window/station", "")

    @station.setter
    def station(self, key: str) -> None:
        self._store.setValue("window/station", key)

    @property
    def recent(self) -> tuple[Path, ...]:
        """Books opened, the latest first."""
        try:
            found = json.loads(self._text("books/recent", "[]"))
        except ValueError:
            return ()
        if not isinstance(found, list):
            return ()
        return tuple(Path(entry) for entry in found if isinstance(entry, str) and entry)

    @recent.setter
    def recent(self, paths: Sequence[Path]) -> None:
        self._store.setValue("books/recent", json.dumps([str(path) for path in paths]))

    @property
    def book_folder(self) -> Path | None:
        """Where a book was opened or saved last."""
        return self._folder("books/folder")

    @book_folder.setter
    def book_folder(self, folder: Path) -> None:
        self._store.setValue("books/folder", str(folder))

    @property
    def report_folder(self) -> Path | None:
        """Where a report was written last."""
        return self._folder("reports/folder")

    @report_folder.setter
    def report_folder(self, folder: Path) -> None:
        self._store.setValue("reports/folder", str(folder))

    def sizes(self, station: str) -> dict[str, list[int]]:
        """How the reader has shared the room of a station, by the name of the splitter [px]."""
        try:
            found = json.loads(self._text(f"sizes/{station}", "{}"))
        except ValueError:
            return {}
        if not isinstance(found, dict):
            return {}
        return {
            str(name): [int(size) for size in sizes]
            for name, sizes in found.items()
            if isinstance(sizes, list) and all(isinstance(size, int) and size >= 0 for size in sizes)
        }

    def set_sizes(self, station: str, sizes: Mapping[str, Sequence[int]]) -> None:
        """Remember them."""
        self._store.setValue(
            f"sizes/{station}", json.dumps({name: list(size) for name, size in sizes.items()})
        )

    # The types are given each time: in a new process an INI file holds nothing but text.

    def _text(self, key: str, default: str) -> str:
        return str(self._store.value(key, default, type=str))

    def _whole(self, key: str, default: int) -> int:
        try:
            value: Any = self._store.value(key, default, type=int)
        except (TypeError, ValueError):
            return default
        return value if isinstance(value, int) else default

    def _folder(self, key: str) -> Path | None:
        text = self._text(key, "")
        return Path(text) if text else None
