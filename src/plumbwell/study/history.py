"""The history of a case: an append-only tree of acts, and the point of it that is shown.

A point's case is what its acts, from the root on, make of the survey. Undo goes to the parent, redo goes on along
the line last walked, a new act after undo makes a branch; nothing is ever cut off. Points are chained by hashes,
which shows damage; it is no proof against a forger.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from typing import Any

from plumbwell.study.act_wording import clock, day
from plumbwell.study.acts import Act, ActRefused, NamePoint
from plumbwell.study.case import Case
from plumbwell.survey.errors import DossierError, SurveyError
from plumbwell.survey.survey import Survey

BEGINNING = "plumbwell-history/1"
HELD = 256
"""Cases of points that are held; others are worked out anew."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Point:
    """One point of a history.

    Parameters
    ----------
    number : int
        0 is the root, the survey as it was read.
    parent : int or None
        None for the root.
    act : Act or None
        What leads here from the parent; None for the root.
    who : str
    when : float
        UTC, s since 2000-01-01.
    hash : str
        SHA-256 over the parent's hash and the point's own text, in hexadecimal digits.
    """

    number: int
    parent: int | None
    act: Act | None
    who: str
    when: float
    hash: str

    @property
    def name(self) -> str:
        """The name that a person gave the point; empty without one."""
        return self.act.name if isinstance(self.act, NamePoint) else ""


def act_text(act: Act | None) -> str:
    """An act as the one text that stands for it, in the file and under the hash."""
    return json.dumps(
        None if act is None else act.to_data(),
        ensure_ascii=False, sort_keys=True, separators=(",", ":"), allow_nan=False,
    )  # fmt: skip


def point_hash(before: str, *, number: int, parent: int | None, act: str, who: str, when: float) -> str:
    """The hash of a point.

    Parameters
    ----------
    before : str
        Hash of the parent; for the root what the history is of.
    number, parent, who, when
        As in `Point`.
    act : str
        From `act_text`.
    """
    own = json.dumps([number, parent, who, when, act], ensure_ascii=False, separators=(",", ":"), allow_nan=False)
    return hashlib.sha256(f"{before}\n{own}".encode()).hexdigest()


class _Replayed:
    """Cases of points by their hash, for one survey at a time; shared by all histories that grow from one."""

    def __init__(self) -> None:
        self.survey: Survey | None = None
        self.cases: dict[str, Case] = {}

    def of(self, survey: Survey) -> dict[str, Case]:
        if self.survey is not survey:
            self.survey, self.cases = survey, {}
        return self.cases

    def hold(self, hash_: str, case: Case) -> Case:
        self.cases[hash_] = case
        while len(self.cases) > HELD:
            del self.cases[next(iter(self.cases))]
        return case


@dataclass(frozen=True, slots=True, kw_only=True)
class History:
    """All points, and which one is shown. Compares by value.

    Parameters
    ----------
    of : str
        What it is the history of: the SHA-256 of the readings' file.
    points : tuple of Point
        By number, the root first.
    cursor : int
        Number of the point that is shown.
    tip : int
        Number of the last point of the line on which the cursor stands; it has no child.
    """

    of: str
    points: tuple[Point, ...]
    cursor: int = 0
    tip: int = 0
    _replayed: _Replayed = field(default_factory=_Replayed, compare=False, repr=False)

    @classmethod
    def begun(cls, of: str, *, who: str, when: float) -> History:
        """A history without acts."""
        seen: dict[str, Any] = {"number": 0, "parent": None, "who": who, "when": float(when)}
        root = point_hash(f"{BEGINNING}\n{of}", act=act_text(None), **seen)
        return cls(of=of, points=(Point(act=None, hash=root, **seen),))

    @property
    def point(self) -> Point:
        """The point that is shown."""
        return self.points[self.cursor]

    @property
    def can_undo(self) -> bool:
        """True when the cursor has a parent."""
        return self.cursor != 0

    @property
    def can_redo(self) -> bool:
        """True when the line goes on beyond the cursor."""
        return self.cursor != self.tip

    def with_act(self, act: Act, *, survey: Survey, who: str, when: float) -> History:
        """The history with one more point, from the cursor on, and the cursor there.

        Raises
        ------
        ActRefused
            When the case at the cursor cannot take the act; nothing has changed then.
        """
        after = act.apply(self.case(survey))
        number = len(self.points)
        seen: dict[str, Any] = {"number": number, "parent": self.cursor, "who": who, "when": float(when)}
        point = Point(act=act, hash=point_hash(self.point.hash, act=act_text(act), **seen), **seen)
        self._replayed.of(survey)
        self._replayed.hold(point.hash, after)
        return replace(self, points=(*self.points, point), cursor=number, tip=number)

    def undo(self) -> History:
        """The history with the cursor on the parent; at the root the same."""
        parent = self.point.parent
        return self if parent is None else replace(self, cursor=parent)

    def redo(self) -> History:
        """The history with the cursor one point on along its line; at the line's end the same."""
        if not self.can_redo:
            return self
        at = self.tip
        while (parent := self.points[at].parent) != self.cursor and parent is not None:
            at = parent
        return replace(self, cursor=at)

    def go_to(self, number: int) -> History:
        """The history with the cursor on any point; its line is the same when the point lies on it.

        Raises
        ------
        IndexError
            When there is no such point.
        """
        if not 0 <= number < len(self.points):
            raise IndexError(f"the history has no point {number}")
        on_line = number in self._way_to(self.tip)
        return replace(self, cursor=number, tip=self.tip if on_line else self._latest_from(number))

    def line(self) -> tuple[Point, ...]:
        """The points from the root to the cursor and on to the end of its line."""
        return tuple(self.points[number] for number in reversed(self._way_to(self.tip)))

    def children(self, number: int) -> tuple[Point, ...]:
        """The points that a point leads to, the earliest first."""
        return tuple(one for one in self.points if one.parent == number)

    def _way_to(self, number: int) -> list[int]:
        """The numbers from a point up to the root."""
        return list(self._upward(number))

    def _upward(self, number: int) -> Iterator[int]:
        at: int | None = number
        while at is not None:
            yield at
            at = self.points[at].parent

    def _latest_from(self, number: int) -> int:
        """The end of the line that goes on from a point by the latest child each time."""
        latest = {one.parent: one.number for one in self.points}
        while number in latest:
            number = latest[number]
        return number

    def case(self, survey: Survey) -> Case:
        """The case at the cursor; the same object as before while the survey is the same.

        Raises
        ------
        ActRefused
            When an act on the way cannot be applied to this survey.
        """
        return self.case_at(self.cursor, survey)

    def case_at(self, number: int, survey: Survey) -> Case:
        """The case at any point; see `case`."""
        held = self._replayed.of(survey)
        way = []
        for at in self._upward(number):
            if self.points[at].hash in held:
                case = held[self.points[at].hash]
                break
            way.append(at)
        else:
            case = self._replayed.hold(self.points[way.pop()].hash, Case(survey=survey))
        for at in reversed(way):
            act = self.points[at].act
            if act is not None:
                case = self._replayed.hold(self.points[at].hash, act.apply(case))
        return case

    def standing(self, survey: Survey) -> tuple[History, str | None]:
        """The history with the cursor where its acts still apply to a survey, and a sentence when that is earlier.

        Needed when the survey folder has changed since the acts were made. Nothing is taken out of the history.
        """
        standing = replace(self, cursor=0)
        for number in reversed(self._way_to(self.cursor)):
            try:
                self.case_at(number, survey)
            except (ActRefused, SurveyError) as refused:
                left = len(self._way_to(self.cursor)) - len(standing._way_to(standing.cursor))
                return standing, _left_words(self.points[number], self.sentence(number, survey), str(refused), left)
            standing = replace(standing, cursor=number)
        return standing, None

    def sentence(self, number: int, survey: Survey) -> str:
        """What led to a point, as the history tells it."""
        point = self.points[number]
        if point.act is None or point.parent is None:
            return "The survey as it was read"
        try:
            before = self.case_at(point.parent, survey)
        except (ActRefused, SurveyError):
            before = Case(survey=survey)
        return point.act.sentence(before)

    def verify(self) -> None:
        """Check that every point is what it was when it was made.

        Raises
        ------
        DossierError
            Naming the first point that is not.
        """
        for number, point in enumerate(self.points):
            root = number == 0
            sound = point.number == number and (point.act is None) == root and (point.parent is None) == root
            if sound and not root:
                sound = point.parent is not None and 0 <= point.parent < number
            if sound:
                before = f"{BEGINNING}\n{self.of}" if point.parent is None else self.points[point.parent].hash
                sound = point.hash == point_hash(
                    before, number=number, parent=point.parent, act=act_text(point.act), who=point.who, when=point.when
                )
            if not sound:
                raise DossierError(f"The history is damaged at its point {number}: it is not what was once written.")


def _left_words(point: Point, told: str, why: str, left: int) -> str:
    what = "This act" if left == 1 else f"This act and the {left - 1} after it"
    return (
        f"An act of {day(point.when)}, {clock(point.when)} UTC, cannot be applied any more: {told}. {why} "
        f"{what} stay{'s' if left == 1 else ''} in the history; the survey is shown as it was before."
    )
