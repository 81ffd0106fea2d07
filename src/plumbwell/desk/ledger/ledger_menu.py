"""The menus of a ledger: sorting, filter, copy, and which columns are shown."""

from __future__ import annotations

from typing import TYPE_CHECKING

from PySide6.QtWidgets import QMenu, QWidget

from plumbwell.desk.ledger.column_choice import ColumnMenu

if TYPE_CHECKING:
    from plumbwell.desk.ledger.ledger import Ledger


def ledger_menu(ledger: Ledger, column: int) -> QMenu:
    """The context menu of a ledger, opened at a column of the view; -1 for none."""
    menu = QMenu(ledger)
    choices = [choice for choice in ledger.column_choices() if choice.shown]
    if 0 <= column < len(choices):
        key, name = choices[column].key, choices[column].name.replace("&", "&&")
        menu.addAction(f"Sort by {name}").triggered.connect(lambda: ledger.sort_by(key))
        menu.addAction(f"Sort by {name}, reversed").triggered.connect(lambda: ledger.sort_by(key, descending=True))
    menu.addAction("Order as given").triggered.connect(ledger.sort_as_given)
    menu.addSeparator()
    menu.addAction("Filter rows\tCtrl+F").triggered.connect(ledger.open_filter)
    menu.addAction("Copy rows\tCtrl+C").triggered.connect(ledger.copy)
    menu.addSeparator()
    menu.addMenu(column_menu(ledger, menu))
    menu.addAction("Fit columns to content").triggered.connect(ledger.fit_columns)
    return menu


def column_menu(ledger: Ledger, parent: QWidget) -> ColumnMenu:
    """The menu of all columns of a ledger, those that are shown checked."""
    menu = ColumnMenu(parent)
    for choice in ledger.column_choices():
        action = menu.add_choice(choice.name, choice.what, choice.shown)
        action.toggled.connect(lambda shown, key=choice.key: _show_column(ledger, key, shown))
    return menu


def _show_column(ledger: Ledger, key: str, shown: bool) -> None:
    keys = {choice.key for choice in ledger.column_choices() if choice.shown}
    ledger.choose_columns(keys | {key} if shown else keys - {key})
