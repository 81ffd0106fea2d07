"""survey.toml: site, instruments, runs, names of tables, logs and recipe, checked and turned to SI."""

from __future__ import annotations

import math
from dataclasses import replace
from datetime import date, datetime, time, tzinfo
from typing import Any

from plumbwell.earth.constants import MILLIGAL
from plumbwell.files.collected import Collected
from plumbwell.files.grids import apart, geodetic_position
from plumbwell.files.label_texts import unfit_label
from plumbwell.files.statements import LogStatement, NamedFile, Statements, TareStatement
from plumbwell.files.times import EXPECTED, ZoneUnknown, times_of, zone
from plumbwell.files.toml_tables import TomlTable, finite, parse_toml, written
from plumbwell.survey.errors import shown
from plumbwell.survey.instrument import Instrument, Run
from plumbwell.survey.recipe import (
    KEYS,
    Recipe,
    available_of,
    expected_of,
    from_written,
    is_unavailable,
    nearest_key,
)
from plumbwell.survey.site import Site

FILE = "survey.toml"
FORMAT = "plumbwell-survey/1"
NEAR_ENOUGH = 5.0  # m, between map coordinates and latitude and longitude
MILLIGAL_PER_HOUR = MILLIGAL / 3600.0
DAY = 86400.0  # s; a clock farther off is a wrong date
LONGEST_NAME = 1000  # characters of the path of a file
LOWEST, HIGHEST = -12000.0, 9000.0  # m: deepest sea floor and hole, highest ground
TABLES = ("readings", "places", "ties", "path", "markers", "tide", "ocean_loading")
NOT_APPLIED = ("openings", "bodies", "gradients")
APPLIED = ("tide", "tilt", "temperature", "pressure", "drift")


def read_statements(data: bytes, collected: Collected) -> Statements | None:
    """All that survey.toml states, or None when it cannot be parsed; wrong keys become problems."""
    parsed = parse_toml(data, file=FILE, collected=collected)
    if parsed is None:
        return None
    top = TomlTable(parsed[0], "", (), file=FILE, lines=parsed[1], collected=collected)
    _check_format(top)
    place = top.table("site")
    site = _site(place)
    instruments, calibrations = _instruments(top)
    runs = _runs(top, {one.name for one in instruments} if calibrations is not None else None)
    named = top.table("data")
    tables = {key: file for key in TABLES if (file := _named_file(named, key)) is not None}
    unread = {key: file for key in NOT_APPLIED if (file := _named_file(named, key)) is not None}
    if not named.values:
        top.missing(
            "data",
            "a table [data] that names the readings",
            'write [data] and under it readings = "readings.csv"',
        )
    elif "readings" not in tables and "gradients" not in unread and "readings" not in named.values:
        named.missing("readings", "the name of the table of readings", 'write readings = "readings.csv"')
    not_applied = [(key, f"[data] {key}") for key in unread]
    local = _zone(named)
    logs = _logs(top, named, site)
    barometer: float | str | None
    if named.values.get("barometer_elevation") == "station":
        named.has("barometer_elevation")
        barometer = "station"
    else:
        barometer = named.number("barometer_elevation", unit='m or "station"', least=LOWEST, most=HIGHEST)
    tares = _tares(top, local)
    grids, masses = _terrain_and_water(top, site)
    recipe_table = top.table("recipe")
    recipe, given = _recipe(recipe_table)
    named.tell_unknown()
    top.tell_unknown(also=("rock",))
    return Statements(
        site=site,
        north_stated=place.has("north"),
        instruments=instruments,
        instruments_written=calibrations is not None,
        calibrations=calibrations or {},
        runs=runs,
        tares=tares,
        tables=tables,
        unread=(*unread.values(), *grids),
        logs=logs,
        zone=local,
        barometer_elevation=barometer,
        recipe=recipe,
        recipe_given=given,
        recipe_rows={key: recipe_table.row(key) for key in given},
        not_applied=(*not_applied, *masses),
    )


def _check_format(top: TomlTable) -> None:
    if not top.has("format"):
        top.missing("format", f'"{FORMAT}"', f'write format = "{FORMAT}" as the first line')
    elif top.values["format"] != FORMAT:
        top.problem(
            "format",
            found=written(top.values["format"]),
            expected=f'"{FORMAT}"',
            mend="read this survey with the version of the program that wrote it, or bring it to this format",
        )


def _check_position(
    table: TomlTable, carried: dict[str, str], latitude: float | None, longitude: float | None
) -> None:
    """Compare map coordinates with latitude and longitude, when all are there."""
    if not {"horizontal_crs", "easting", "northing"} <= set(carried) or latitude is None or longitude is None:
        return
    system = carried["horizontal_crs"]
    place = f"{FILE}, [site] easting, northing"
    try:
        other = geodetic_position(
            system, easting=float(carried["easting"]), northing=float(carried["northing"])
        )
    except ValueError as error:
        table.problem(
            "horizontal_crs",
            found=f"{shown(system)}, in which easting and northing have no position ({shown(error)})",
            expected='a coordinate reference system such as "EPSG:32630" that holds easting and northing',
            mend="correct it, or remove horizontal_crs, easting and northing",
        )
        return
    distance = apart(
        latitude=math.radians(latitude), longitude=math.radians(longitude),
        other_latitude=other[0], other_longitude=other[1],
    )
    if distance > NEAR_ENOUGH:
        table.collected.note(
            "position_differs",
            "look",
            place,
            f"In {shown(system)} easting and northing lie {distance:.0f} m from latitude and longitude"
            f" (at {math.degrees(other[0]):.6f}, {math.degrees(other[1]):.6f} deg).",
            "Correct one of the two; the reduction uses latitude and longitude.",
        )


def _site(table: TomlTable) -> Site | None:
    """The site, None when latitude, longitude or ground elevation is missing or wrong."""
    latitude = table.number("latitude", unit="deg", least=-90.0, most=90.0, mend=_exchanged(table.values))
    longitude = table.number("longitude", unit="deg", least=-180.0, most=360.0)
    ground = table.number("ground_elevation", unit="m", least=LOWEST, most=HIGHEST)
    for key, expected, example in (
        ("latitude", "the geodetic latitude of the collar in deg, north positive", "54.4612"),
        ("longitude", "the longitude of the collar in deg, east positive", "-3.0871"),
        ("ground_elevation", "the ground above the collar in m above sea level", "182.35"),
    ):
        if not table.has(key):
            table.missing(key, expected, f"write it under [site], for example {key} = {example}")
    collar = table.number("collar_elevation", ground, unit="m", least=LOWEST, most=HIGHEST)
    north = table.text("north", "true", choices=("true", "grid", "magnetic")) or "true"
    correction = table.number("north_correction", unit="deg", least=-360.0, most=360.0)
    if north != "true" and not table.has("north_correction"):
        table.missing(
            "north_correction",
            f"the angle in deg that is added to {north} azimuths to make them true",
            "write north_correction = 1.5 with the angle of the site, or give true azimuths",
        )
    if north == "true" and correction:
        table.collected.note(
            "north_correction_unused",
            "look",
            f"{FILE}, [site] north_correction",
            'north_correction has no effect, because north is "true"',
            'write north = "grid" or "magnetic", or remove it',
        )
    values: dict[str, Any] = {
        "depth_datum_height": table.number("depth_datum_height", 0.0, unit="m", least=LOWEST, most=HIGHEST),
        "geoid_height": table.number("geoid_height", 0.0, unit="m", least=-200.0, most=200.0),
        "water_depth": table.number("water_depth", 0.0, unit="m", least=0.0, most=-LOWEST),
        "far_elevation": table.number("far_elevation", unit="m", least=LOWEST, most=HIGHEST),
    }
    carried = [
        (key, text) for key in ("vertical_datum", "horizontal_crs") if (text := table.text(key)) is not None
    ]
    carried += [
        (key, f"{value:.12g}") for key in ("easting", "northing") if (value := table.number(key)) is not None
    ]
    _check_position(table, dict(carried), latitude, longitude)
    name = table.text("name", "")
    table.tell_unknown()
    if latitude is None or longitude is None or ground is None or collar is None:
        return None
    return Site(
        name=name or "",
        latitude=math.radians(latitude),
        ground_elevation=ground,
        collar_elevation=collar,
        north=north,
        longitude=math.radians(longitude - 360.0 if longitude > 180.0 else longitude),
        north_correction=math.radians(correction or 0.0) if north != "true" else 0.0,
        carried=tuple(carried),
        **values,
    )


def _exchanged(values: dict[str, Any]) -> str:
    """How to mend a latitude: the longitude may stand in its place."""
    longitude = finite(values.get("longitude"))
    if finite(values.get("latitude")) is not None and longitude is not None and abs(longitude) <= 90.0:
        return "correct the value; perhaps latitude and longitude are exchanged"
    return "correct the value"


def _instruments(top: TomlTable) -> tuple[tuple[Instrument, ...], dict[str, NamedFile] | None]:
    """The instruments and their calibration files; None for these when there is no [instrument.*]."""
    if not top.has("instrument"):
        return (Instrument(name="1"),), None
    under = top.table("instrument")
    if not under.values or not all(isinstance(value, dict) for value in under.values.values()):
        top.problem(
            "instrument",
            found="keys straight under [instrument]",
            expected="a table for each instrument",
            mend="write [instrument.A] with the instrument's label in place of A",
        )
        return (Instrument(name="1"),), None
    instruments, calibrations = [], {}
    for name in under.values:
        table = under.table(name)
        if (wrong := unfit_label(name)) is not None:
            under.problem(shown(name), found=wrong.found, expected=wrong.expected, mend=wrong.mend)
        kind = table.text("kind", "gravimeter", choices=("gravimeter", "gradiometer")) or "gravimeter"
        if (file := _named_file(table, "calibration")) is not None:
            calibrations[name] = file
        numbers: dict[str, Any] = {
            "scale": table.number("scale", 1.0, least=0.0, most=1e6, above=True),
            "scale_sd": table.number("scale_sd", 0.0, least=0.0),
            "clock_ahead": table.number("clock_ahead", 0.0, unit="s", least=-DAY, most=DAY),
        }
        for key, factor, least in (
            ("reading_floor", MILLIGAL, True),
            ("reseating_sd", MILLIGAL, False),
            ("station_floor", MILLIGAL, False),
            ("drift_rate_sd", MILLIGAL_PER_HOUR, True),
        ):
            unit = "mGal" if factor == MILLIGAL else "mGal/h"
            if (number := table.number(key, unit=unit, least=0.0, above=least)) is not None:
                numbers[key] = number * factor
        if (number := table.number("drift_rate", unit="mGal/h")) is not None:
            numbers["drift_rate"] = number * MILLIGAL_PER_HOUR
        applied = table.texts("applied", choices=APPLIED)
        table.tell_unknown()
        instruments.append(Instrument(name=name, kind=kind, applied=applied, **numbers))
    return tuple(instruments), calibrations


def _runs(top: TomlTable, instruments: set[str] | None) -> tuple[Run, ...]:
    runs: dict[str, Run] = {}
    for table in top.tables("run"):
        name = table.text("name")
        if not table.has("name"):
            table.missing("name", "the label of the run as in readings.csv", 'write name = "1"')
        instrument = table.text("instrument")
        if instrument is not None and instruments is not None and instrument not in instruments:
            table.problem(
                "instrument",
                found=written(instrument),
                expected="one of " + ", ".join(f'"{one}"' for one in sorted(instruments)),
                mend=f"correct the label, or describe the instrument in [instrument.{instrument}]",
            )
        shift = table.number("depth_shift", 0.0, unit="m", least=LOWEST, most=-LOWEST)
        shift_sd = table.number("depth_shift_sd", 0.0, unit="m", least=0.0)
        order: int | str | None = None
        if table.has("drift_order"):
            try:
                order = from_written("drift_order", table.values["drift_order"])
            except ValueError as error:
                table.wrong("drift_order", str(error))
        table.tell_unknown()
        if name is None:
            continue
        if name in runs:
            table.problem(
                "name",
                found=f"the run {written(name)} twice",
                expected="one [[run]] a run",
                mend="make one table of the two",
            )
        runs[name] = Run(
            name=name,
            instrument=instrument,
            depth_shift=shift or 0.0,
            depth_shift_sd=shift_sd or 0.0,
            drift_order=order,
        )
    return tuple(runs.values())


def _tares(top: TomlTable, local: tzinfo | None) -> tuple[TareStatement, ...]:
    tares = []
    for table in top.tables("tare"):
        run = table.text("run", None if table.has("run") else "1")
        at = None
        if not table.has("time"):
            table.missing("time", EXPECTED, "write the time from which the jump counts")
        else:
            value = table.values["time"]
            text = value.isoformat() if isinstance(value, (datetime, date, time)) else str(value)
            times = times_of([text.strip()], local=local)
            if times.bad:
                table.problem("time", found=times.bad[0].found, expected=EXPECTED, mend=times.bad[0].mend)
            elif math.isnan(times.values[0]):
                table.wrong("time", EXPECTED)
            else:
                at = float(times.values[0])
        size, size_sd = (
            table.number("size", unit="mGal"),
            table.number("size_sd", unit="mGal", least=0.0, above=True),
        )
        if size is None and size_sd is not None:
            table.missing(
                "size", "the size that size_sd belongs to, in mGal", "write size, or remove size_sd"
            )
        table.tell_unknown()
        if run is not None and at is not None:
            tares.append(
                TareStatement(
                    run=run,
                    time=at,
                    size=None if size is None else size * MILLIGAL,
                    size_sd=None if size_sd is None else size_sd * MILLIGAL,
                    row=table.row("run"),
                )
            )
    return tuple(tares)


def _named_file(table: TomlTable, key: str) -> NamedFile | None:
    name = table.text(key, longest=LONGEST_NAME)
    return None if name is None else NamedFile(key=table.place(key), name=name, row=table.row(key))


def _zone(named: TomlTable) -> tzinfo | None:
    name = named.text("time_zone")
    if name is None:
        return None
    try:
        return zone(name)
    except ZoneUnknown:
        named.problem(
            "time_zone",
            found=written(name),
            expected='an IANA name such as "Europe/Oslo", or an offset such as "+02:00"',
            mend="correct the name; abbreviations such as CET are not told apart everywhere",
        )
        return None


def _logs(top: TomlTable, named: TomlTable, site: Site | None) -> tuple[LogStatement, ...]:
    datum = site.depth_datum_height if site is not None else 0.0
    logs = [
        LogStatement(
            file=NamedFile(key=named.place("logs"), name=name.strip(), row=named.row("logs")),
            datum_height=datum,
        )
        for name in named.texts("logs")
    ]
    for table in top.tables("log"):
        file = _named_file(table, "file")
        if not table.has("file"):
            table.missing("file", "the name of a LAS or CSV file", 'write file = "open_hole.las"')
        height = table.number("datum_height", datum, unit="m", least=LOWEST, most=HIGHEST)
        shift = table.number("depth_shift", 0.0, unit="m", least=LOWEST, most=-LOWEST)
        coverage = table.number("minimum_coverage", 0.8, least=0.0, most=1.0)
        curves = {key: table.text(key) for key in ("density", "caliper", "correction")}
        table.tell_unknown()
        if file is not None and height is not None and shift is not None and coverage is not None:
            logs.append(
                LogStatement(
                    file=file, datum_height=height, depth_shift=shift, minimum_coverage=coverage, **curves
                )
            )
    return tuple(logs)


def _terrain_and_water(top: TomlTable, site: Site | None) -> tuple[list[NamedFile], list[tuple[str, str]]]:
    """Grids that are named, and what of terrain and water is not taken into account: (what, where)."""
    grids, masses = [], []
    for table in top.tables("terrain"):
        file = _named_file(table, "file")
        if not table.has("file"):
            table.missing("file", "the name of a grid", 'write file = "terrain.asc"')
        if file is not None:
            grids.append(file)
            masses.append(("terrain", f"[[terrain]] {file.name}"))
    masses += [("water", "[[water]]") for _ in top.tables("water")]
    if site is not None and site.water_depth:
        masses.append(("water", "[site] water_depth"))
    if site is not None and site.far_elevation is not None and site.far_elevation != site.ground_elevation:
        masses.append(("terrain", "[site] far_elevation"))
    return grids, masses


def _recipe(table: TomlTable) -> tuple[Recipe, frozenset[str]]:
    """The recipe and the keys that are written; an unknown key or a wrong value is a problem."""
    changed: dict[str, Any] = {}
    for key, value in table.values.items():
        if key not in KEYS:
            near = nearest_key(key)
            table.problem(
                key,
                found="an unknown key of the recipe",
                expected="one of the keys of [recipe]",
                mend=f'write "{near}", if that is meant, or remove the key' if near else "remove the key",
            )
            continue
        wrong = unfit_label(value) if isinstance(value, str) else None
        if wrong is not None:
            table.problem(key, found=wrong.found, expected=wrong.expected, mend=wrong.mend)
            continue
        try:
            changed[key] = from_written(key, value)
        except ValueError:
            table.wrong(key, expected_of(key))
            continue
        if is_unavailable(key, value):
            del changed[key]
            table.problem(
                key,
                found=f"{written(value)}, which this version cannot do",
                expected=available_of(key),
                mend="write one of these, or remove the key",
            )
    return replace(Recipe(), **changed), frozenset(changed)
