"""What the chain has worked out before: the last four results of each step, found again by their inputs.

A step is found again when every input is the same frozen object, or an equal setting. `Kept` belongs to a
document or a call; nothing here is global.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import fields, is_dataclass
from typing import Any, TypeVar

import numpy as np

T = TypeVar("T")
HELD = 4
SCALARS = (str, int, float, bool, type(None), frozenset)


def same(one: Any, other: Any) -> bool:
    """True when two inputs hold the same: one object, equal scalars, or tuples of such.

    Values that compare by content (frozen settings) are equal when they say so; values that hold arrays are the
    same only when they are one object.
    """
    if one is other:
        return True
    if type(one) is not type(other):
        return False
    if isinstance(one, SCALARS):
        return bool(one == other)
    if isinstance(one, tuple):
        return len(one) == len(other) and all(a is b or same(a, b) for a, b in zip(one, other, strict=True))
    return type(one).__eq__ is not object.__eq__ and not hasattr(one, "__array__") and bool(one == other)


def alike(one: Any, other: Any) -> bool:
    """True when two results hold the same, arrays compared number by number (NaN equals NaN)."""
    if one is other:
        return True
    if type(one) is not type(other):
        return False
    if isinstance(one, np.ndarray):
        return one.shape == other.shape and bool(np.array_equal(one, other, equal_nan=one.dtype.kind == "f"))
    if isinstance(one, tuple):
        return len(one) == len(other) and all(alike(a, b) for a, b in zip(one, other, strict=True))
    if is_dataclass(one) and type(one).__eq__ is object.__eq__:
        return all(alike(getattr(one, part.name), getattr(other, part.name)) for part in fields(one))
    return bool(one == other)


class Kept:
    """The last results of every step. Calling it runs a step, or returns what the step gave before."""

    def __init__(self) -> None:
        self._held: dict[Callable[..., Any], list[tuple[tuple[Any, ...], Any]]] = {}

    def __call__(self, step: Callable[..., T], *inputs: Any, **settings: Any) -> T:
        """The result of `step(*inputs, **settings)`."""
        key = (tuple(settings), *inputs, *settings.values())
        held = self._held.setdefault(step, [])
        for place, (inputs_before, result) in enumerate(held):
            if same(inputs_before, key):
                held.insert(0, held.pop(place))
                return result  # type: ignore[no-any-return]
        result = step(*inputs, **settings)
        held.insert(0, (key, result))
        del held[HELD:]
        return result

    def settled(self, step: Callable[..., T], *inputs: Any, **settings: Any) -> T:
        """As a call, but a result that holds the same as one before is that earlier object.

        For steps that end in few numbers (which rows are a station, which stations an interval): a setting that
        changes none of them then leaves all that follows as it was.
        """
        before = [result for _, result in self._held.get(step, ())]
        result = self(step, *inputs, **settings)
        for one in before:
            if one is not result and alike(one, result):
                key, _ = self._held[step][0]
                self._held[step][0] = (key, one)
                return one  # type: ignore[no-any-return]
        return result
