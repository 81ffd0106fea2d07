"""What the window remembers from one start to the next: look, columns, sizes, recent surveys.

Kept in one INI file in the user's data folder; nothing of a survey's content is in it.
"""

from __future__ import annotations

import json
from collections.abc import Iterator, MutableMapping
from pathlib import Path

from PySide6.QtCore import QSettings

MOST_RECENT = 10
RECENT = "recent"


class Settings(MutableMapping[str, object]):
    """A mapping of names to plain values (texts, numbers, lists, dicts of such), kept as JSON in an INI file.

    Parameters
    ----------
    folder : Path
        The user's data folder; made when something is first kept.
    """

    def __init__(self, folder: Path) -> None:
        self._file = QSettings(str(folder / "settings.ini"), QSettings.Format.IniFormat)

    def __getitem__(self, key: str) -> object:
        text = self._file.value(key, None)
        if not isinstance(text, str):
            raise KeyError(key)
        try:
            return json.loads(text)
        except ValueError:
            # A file that was edited by hand or cut short: what cannot be read is as if never kept.
            raise KeyError(key) from None

    def __setitem__(self, key: str, value: object) -> None:
        self._file.setValue(key, json.dumps(value))

    def __delitem__(self, key: str) -> None:
        self._file.remove(key)

    def __iter__(self) -> Iterator[str]:
        return iter(self._file.allKeys())

    def __len__(self) -> int:
        return len(self._file.allKeys())

    def text(self, key: str, otherwise: str) -> str:
        """The text kept under a name, or another where there is none."""
        value = self.get(key)
        return value if isinstance(value, str) else otherwise

    def number(self, key: str, otherwise: float) -> float:
        """The number kept under a name, or another where there is none."""
        value = self.get(key)
        return float(value) if isinstance(value, int | float) and not isinstance(value, bool) else otherwise

    def texts(self, key: str) -> list[str]:
        """The list of texts kept under a name; empty where there is none."""
        value = self.get(key)
        return [one for one in value if isinstance(one, str)] if isinstance(value, list) else []

    def numbers(self, key: str) -> list[int]:
        """The list of whole numbers kept under a name; empty where there is none."""
        value = self.get(key)
        return [one for one in value if type(one) is int] if isinstance(value, list) else []

    def add_recent(self, path: str) -> None:
        """Put a survey at the head of the recent ones."""
        self[RECENT] = [path, *(one for one in self.texts(RECENT) if one != path)][:MOST_RECENT]

    def write(self) -> None:
        """Write what was kept to the disk."""
        self._file.sync()
