"""Times of a table: to UTC seconds since 2000-01-01, exactly, and what they need to be told about."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

import pytest
from hypothesis import given
from hypothesis import strategies as st

from plumbwell.files.times import ZoneUnknown, iso, times_of, zone

EPOCH = datetime(2000, 1, 1, tzinfo=UTC)


@pytest.mark.parametrize(
    ("cell", "seconds"),
    [
        ("2000-01-01T00:00:00Z", 0.0),
        ("2026-05-04T09:13:20Z", 831201200.0),
        ("2026-05-04 11:13:20+02:00", 831201200.0),
        ("2026-05-04T11:13:20.250+0200", 831201200.25),
        ("2026-05-04T05:43:20-03:30", 831201200.0),
        ("1999-12-31T23:59Z", -60.0),
        ("2016-12-31T23:59:60Z", 536544000.0),
        ("2017-01-01T01:59:60+02:00", 536544000.0),
        ("2026-05-04T24:00:00Z", 831254400.0),
    ],
)
def test_time(cell: str, seconds: float) -> None:
    times = times_of([cell])
    assert not times.bad and times.values[0] == seconds


@pytest.mark.parametrize(
    "cell",
    [
        "2026-02-29T00:00:00Z",
        "2026-13-01T00:00:00Z",
        "1949-12-31T23:59:59Z",
        "2101-01-01T00:00:00Z",
        "2026-05-04T24:00:01Z",
        "2026-05-04T12:30:60Z",
        "2026-05-04T12:60:00Z",
        "2026-05-04T12:30:00+25:00",
        "26-05-04T12:30:00Z",
        "2026-05-04",
        "45000.5",
        "２０２６-05-04T12:30:00Z",
        "2026-05-04T12:30:00Z;",
    ],
)
def test_what_is_no_time_is_bad(cell: str) -> None:
    times = times_of([cell, "2026-05-04T09:13:20Z"])
    assert [bad.row for bad in times.bad] == [0]
    assert times.values[1] == 831201200.0


def test_local_times_follow_the_zone_through_the_year() -> None:
    times = times_of(["2026-01-04T12:00:00", "2026-07-04T12:00:00"], local=zone("Europe/Oslo"))
    assert [iso(value) for value in times.values] == ["2026-01-04T11:00:00Z", "2026-07-04T10:00:00Z"]
    assert iso(times_of(["2026-01-04T12:00:00"], local=zone("-03:30")).values[0]) == "2026-01-04T15:30:00Z"


@pytest.mark.parametrize(
    "name", ["", "Hollow/Fell", "../../etc/passwd", "+99:00", "a" * 500, "Europe/../Oslo"]
)
def test_zone_that_nobody_knows(name: str) -> None:
    with pytest.raises(ZoneUnknown):
        zone(name)


moments = st.datetimes(datetime(1950, 1, 2), datetime(2100, 12, 30)).map(lambda one: one.replace(tzinfo=UTC))


@given(moments)
def test_every_way_of_writing_a_moment_means_it_to_a_microsecond(moment: datetime) -> None:
    seconds = (moment - EPOCH) / timedelta(seconds=1)
    east = (moment + timedelta(hours=5, minutes=45)).replace(tzinfo=None)
    times = times_of([f"{moment:%Y-%m-%dT%H:%M:%S.%f}Z", f"{east:%Y-%m-%d %H:%M:%S.%f}+05:45"])
    assert not times.bad
    assert abs(times.values - seconds).max() < 1e-6


@given(st.lists(moments.map(lambda one: one.replace(microsecond=0)), min_size=1, max_size=20))
def test_all_at_once_is_the_same_as_one_by_one(written: list[datetime]) -> None:
    cells = [f"{moment:%Y-%m-%dT%H:%M:%S}Z" for moment in written]
    together = times_of(cells)
    alone = times_of([*cells, "2026-05-04T11:13:20.5+02:00"])
    assert together.values.tolist() == alone.values[:-1].tolist()
    assert [iso(value) for value in together.values] == cells
