"""What to do about it: enters a room, its target and a catalogue, leaves options and lists.

The catalogue says what can be bought, the optimiser which of it meets the target for least money,
the placement where it goes, the shopping list what to order.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

_PLACE = {
    "Catalogue": "catalogue",
    "Cover": "covers",
    "Option": "option",
    "OptionItem": "option",
    "Product": "catalogue",
    "ShoppingList": "shopping",
    "Suggestion": "suggestion",
    "builtin_catalogue": "catalogue",
    "front": "alternatives",
    "option_to_toml": "option",
    "read_catalogue": "catalogue",
    "read_option": "option",
    "shopping_list": "shopping",
    "second_best": "alternatives",
    "suggest": "optimise",
    "task_for": "task",
    "to_csv": "shopping",
    "to_text": "shopping",
    "treated": "option",
    "write_option": "option",
}

__all__ = sorted(_PLACE)


def __getattr__(name: str) -> Any:
    """Public things, loaded when they are first asked for."""
    if name not in _PLACE:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(f"{__name__}.{_PLACE[name]}"), name)
