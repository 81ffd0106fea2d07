"""The keeper: every act is on the disk before it is shown, whatever disk, other windows or a kill do."""

import os
import re
import shutil
import signal
import sqlite3
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import pytest

from plumbwell.files import keeper as module
from plumbwell.files.dossier_file import APPLICATION_ID, SCHEMA, connected
from plumbwell.files.folder import read_survey
from plumbwell.files.keeper import Keeper
from plumbwell.files.user_folders import data_folder
from plumbwell.study.acts import ActRefused, AddRecipe, ChooseRecipe, DropTare, Exclude, NamePoint, Note, SetRecipe
from plumbwell.survey.errors import DossierError
from reduced_surveys import CHECKOUT
from small_folder import READINGS, TOML

TARE = '[[tare]]\nrun = "1"\ntime = "2026-05-04T09:30:00Z"\n'
LIES = """
import os, sys, time
from pathlib import Path
from plumbwell.files.folder import read_survey
from plumbwell.files.keeper import Keeper
from plumbwell.study.acts import Exclude
folder = Path(sys.argv[1])
keeper = Keeper.open(folder, read_survey(folder), home=Path(sys.argv[2]), who="ben")
keeper.act(Exclude(rows=(1,), reason="pump"))
print("kept", flush=True)
time.sleep(60)
"""


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """A small survey folder."""
    place = tmp_path / "hollow fell"
    place.mkdir()
    (place / "survey.toml").write_text(TOML + TARE, "utf-8")
    (place / "readings.csv").write_text(READINGS, "utf-8")
    return place


@pytest.fixture
def home(tmp_path: Path) -> Path:
    """A data folder that is not there yet."""
    return tmp_path / "home"


def opened(folder, home, who="anna"):
    return Keeper.open(folder, read_survey(folder), home=home, who=who)


def out(*rows):
    return Exclude(rows=rows, reason="pump")


def rows(keeper):
    return [one.row for one in keeper.history.case(keeper.survey).overlay.rows]


ACTS = (
    out(1),
    Note(rows=(0,), text="a note, “quoted”"),
    AddRecipe(name="b", based_on="as surveyed"),
    SetRecipe(name="b", key="free_air", value={"gradient": 0.31, "sd": 0.001}),
    ChooseRecipe(name="b"),
    NamePoint(name="calm"),
)


def test_acts_come_back_from_the_file_and_give_an_equal_case(folder, home):
    with opened(folder, home) as keeper:
        for act in ACTS:
            keeper.act(act)
        keeper.undo()
        kept = keeper.history
    with opened(folder, home, who="ben") as again:
        assert again.history == kept and again.history.cursor == 5 and again.history.can_redo
        assert again.notices == ()
        one, other = kept.case(keeper.survey), again.history.case(again.survey)
        assert (one.overlay, one.recipe, one.recipes, one.chosen_name) == (
            other.overlay, other.recipe, other.recipes, other.chosen_name
        )  # fmt: skip
        again.redo()
        assert again.history.point.name == "calm" and again.history.point.who == "anna"
        again.act(out(0))
        assert again.history.point.who == "ben"
        again.go_to(1)
    with opened(folder, home) as third:
        assert third.history.cursor == 1 and [one.number for one in third.history.line()] == list(range(8))


def test_looking_alone_leaves_no_dossier_and_no_lock(folder, home):
    with opened(folder, home) as keeper:
        assert keeper.history.cursor == 0
        assert [one.name for one in keeper.path.parent.iterdir()] == [f"{keeper.path.name}.lock"]
    assert list(keeper.path.parent.iterdir()) == []


def test_the_dossier_is_found_by_the_folder_or_its_survey_toml(folder, home):
    with opened(folder, home) as keeper:
        keeper.act(out(1))
    survey = read_survey(folder)
    (folder.parent / "link").symlink_to(folder, target_is_directory=True)
    for name in (folder / "survey.toml", folder / ".", folder.parent / "link"):
        with Keeper.open(name, survey, home=home) as again:
            assert rows(again) == [1]
    shutil.copytree(folder, folder.parent / "other")
    with opened(folder.parent / "other", home) as other:
        assert rows(other) == []


def test_other_readings_begin_a_new_dossier_and_the_earlier_acts_are_told(folder, home):
    with opened(folder, home) as keeper:
        keeper.act(out(1))
        keeper.act(out(2))
    earlier = keeper.path
    before = earlier.read_bytes()
    (folder / "readings.csv").write_text(READINGS + "2026-05-04T10:00:00Z,A,100.0,4000.030\n", "utf-8")
    with opened(folder, home) as again:
        assert again.path != earlier and rows(again) == []
        assert again.earlier is not None
        assert re.fullmatch(
            r"2 acts were made on earlier readings of this folder, the last on \d+ \w+ 20\d\d\. "
            r"They are kept and not applied, since the readings are others now\.",
            again.earlier,
        )
        assert again.notices == (again.earlier,)
        again.act(out(3))
    assert earlier.read_bytes() == before
    (folder / "readings.csv").write_text(READINGS, "utf-8")
    with opened(folder, home) as third:
        assert rows(third) == [1, 2]
        assert third.earlier is not None and third.earlier.startswith("1 act was made")


def test_a_changed_survey_toml_keeps_what_still_applies_and_tells_the_rest(folder, home):
    with opened(folder, home) as keeper:
        keeper.act(out(1))
        keeper.act(DropTare(run="1", time=keeper.survey.tares[0].time))
        keeper.act(out(2))
    (folder / "survey.toml").write_text(TOML, "utf-8")
    with opened(folder, home) as again:
        assert again.history.cursor == 1 and len(again.history.points) == 4 and rows(again) == [1]
        (told,) = again.notices
        assert "cannot be applied any more: Left the tare in run 1 at 09:30 UTC on 4 May 2026 out of account." in told
        assert "This act and the 1 after it stay in the history" in told
        with pytest.raises(ActRefused):
            again.redo()
        assert again.history.cursor == 1
        again.act(out(0))
    (folder / "survey.toml").write_text(TOML + TARE, "utf-8")
    with opened(folder, home) as third:
        third.go_to(3)
        assert rows(third) == [1, 2] and len(third.history.points) == 5


def test_a_second_window_looks_and_makes_no_acts(folder, home):
    with opened(folder, home) as first:
        first.act(out(1))
        with opened(folder, home) as second:
            assert rows(second) == [1]
            assert second.read_only is not None and second.notices == (second.read_only,)
            assert second.read_only.startswith("This survey is open in another window (")
            assert f"process {os.getpid()})" in second.read_only
            with pytest.raises(DossierError, match="another window"):
                second.act(out(2))
            assert rows(second) == [1]
        first.act(out(2))
    with opened(folder, home) as third:
        assert third.read_only is None and rows(third) == [1, 2]


@pytest.mark.skipif(os.name != "posix", reason="only POSIX systems have SIGKILL")
def test_a_kill_right_after_an_act_loses_nothing_and_its_lock_is_taken_over(folder, home):
    environment = {**os.environ, "PYTHONPATH": str(CHECKOUT / "src")}
    command = [sys.executable, "-c", LIES, str(folder), str(home)]
    with subprocess.Popen(command, stdout=subprocess.PIPE, env=environment, text=True) as process:
        assert process.stdout is not None and process.stdout.readline() == "kept\n"
        with opened(folder, home) as meanwhile:
            assert f"process {process.pid})" in str(meanwhile.read_only)
        process.send_signal(signal.SIGKILL)
        process.wait()
    with opened(folder, home) as keeper:
        assert keeper.read_only is None
        assert rows(keeper) == [1] and keeper.history.point.who == "ben"


def test_a_full_disk_leaves_case_and_file_as_they_were(folder, home):
    with opened(folder, home) as keeper:
        keeper.act(out(1))
        before = keeper.history
        connection = keeper._connection
        pages = connection.execute("PRAGMA page_count").fetchone()[0]
        connection.execute(f"PRAGMA max_page_count={pages}")
        with pytest.raises(DossierError, match="^The act cannot be kept, so it was not made: the disk is full.$"):
            keeper.act(Note(rows=(0,), text="x" * 2000))
            for number in range(20):
                keeper.act(Note(rows=(0,), text="y" * 1900 + str(number)))
        full = keeper.history
        assert full.points[: len(before.points)] == before.points
        connection.execute("PRAGMA max_page_count=100000")
        keeper.act(out(2))
    with opened(folder, home) as again:
        assert rows(again) == [1, 2] and again.history.points[: len(full.points)] == full.points


def test_a_disk_that_refuses_the_first_act_leaves_no_file(folder, home, monkeypatch):
    def refuse(*_):
        raise PermissionError(13, "Permission denied")

    with opened(folder, home) as keeper:
        with monkeypatch.context() as patch:
            patch.setattr(module.os, "replace", refuse)
            with pytest.raises(DossierError, match="so it was not made: Permission denied."):
                keeper.act(out(1))
        assert rows(keeper) == [] and len(keeper.history.points) == 1
        assert not keeper.path.exists() and len(list(keeper.path.parent.iterdir())) == 1
        keeper.act(out(1))
        assert rows(keeper) == [1]


@pytest.mark.skipif(os.name != "posix", reason="files cannot be replaced while they are open")
def test_a_dossier_that_was_replaced_meanwhile_is_not_written_to(folder, home):
    with opened(folder, home) as keeper:
        keeper.act(out(1))
        other = keeper.path.with_name("copy")
        shutil.copy(keeper.path, other)
        os.replace(other, keeper.path)
        with pytest.raises(DossierError, match="was moved or replaced"):
            keeper.act(out(2))
        assert rows(keeper) == [1]


def test_a_dossier_that_another_program_wrote_to_meanwhile_takes_nothing_half(folder, home):
    with opened(folder, home) as keeper:
        keeper.act(out(1))
        altered(keeper.path, "UPDATE state SET revision = 50")
        with pytest.raises(DossierError, match="was changed by another program meanwhile"):
            keeper.act(out(2))
        assert rows(keeper) == [1]
    with opened(folder, home) as again:
        assert rows(again) == [1] and len(again.history.points) == 2


def test_a_data_folder_that_cannot_be_made_leaves_the_survey_to_look_at(folder, tmp_path):
    (tmp_path / "home").write_text("a file")
    with opened(folder, tmp_path / "home") as keeper:
        assert keeper.read_only is not None and "cannot be written to" in keeper.read_only
        with pytest.raises(DossierError, match="Acts cannot be kept"):
            keeper.act(out(1))
        assert rows(keeper) == []


def test_a_history_of_elsewhere_is_not_kept(folder, home):
    with opened(folder, home) as keeper:
        keeper.act(out(1))
        first = replace(keeper.history.points[0], who="ben")
        with pytest.raises(DossierError, match="does not go on"):
            keeper.keep(replace(keeper.history, points=(first, *keeper.history.points[1:])))


def test_a_closed_keeper_takes_no_acts(folder, home):
    keeper = opened(folder, home)
    keeper.close()
    keeper.close()
    with pytest.raises(DossierError, match="closed"):
        keeper.act(out(1))


def altered(path, *statements):
    """Change a dossier behind the program's back."""
    connection = sqlite3.connect(path)
    for statement in statements:
        connection.execute(statement)
    connection.commit()
    connection.close()


@pytest.mark.parametrize(
    ("spoil", "told"),
    [
        (lambda path: path.write_bytes(b""), "is damaged, or no dossier at all"),
        (lambda path: path.write_bytes(b"PK\x03\x04" + b"x" * 500), "is damaged, or no dossier at all"),
        (lambda path: path.write_bytes(path.read_bytes()[:5000]), "is damaged"),
        (lambda path: altered(path, "PRAGMA application_id=7"), "is a database of another program"),
        (lambda path: altered(path, "PRAGMA user_version=2"), "was written by a newer version of the program"),
        (lambda path: altered(path, "PRAGMA journal_mode=WAL"), "was changed by another program"),
        (lambda path: altered(path, "CREATE TABLE more(x)"), "holds tables that the program did not make"),
        (lambda path: altered(path, "DROP TRIGGER point_fixed"), "holds tables that the program did not make"),
        (lambda path: altered(path, "UPDATE state SET cursor = 0, tip = 0"), "the place in its history is lost"),
        (
            lambda path: altered(
                path, "DROP TRIGGER point_fixed", "UPDATE point SET act = replace(act, 'pump', 'wind')", SCHEMA[-2]
            ),
            "is damaged. The history is damaged at its point 1",
        ),
        (
            lambda path: altered(
                path, "DROP TRIGGER point_fixed", "UPDATE point SET act = '{\"act\":1}' WHERE number = 1", SCHEMA[-2]
            ),
            "cannot be read whole",
        ),
        (
            lambda path: altered(
                path, "DROP TRIGGER point_fixed", "UPDATE point SET act = replace(act, ',', ', ')", SCHEMA[-2]
            ),
            "cannot be read whole",
        ),
        (
            lambda path: altered(
                path, "DROP TRIGGER point_fixed", "UPDATE point SET act = '[[[' WHERE number = 1", SCHEMA[-2]
            ),
            "cannot be read whole",
        ),
    ],
)
def test_a_damaged_or_foreign_dossier_is_refused_and_never_written_to(folder, home, spoil, told):
    with opened(folder, home) as keeper:
        keeper.act(out(1))
    spoil(keeper.path)
    before = keeper.path.read_bytes()
    with pytest.raises(DossierError) as caught:
        opened(folder, home)
    assert told in str(caught.value)
    assert str(caught.value).endswith("Nothing was written to it. To begin anew, move the file elsewhere.")
    assert keeper.path.read_bytes() == before
    assert [one.name for one in keeper.path.parent.iterdir()] == [keeper.path.name]
    keeper.path.rename(home / "elsewhere")
    with opened(folder, home) as anew:
        assert rows(anew) == []


def test_every_flipped_byte_is_seen_or_harmless(folder, home):
    with opened(folder, home) as keeper:
        for act in ACTS:
            keeper.act(act)
    whole, points = keeper.path.read_bytes(), keeper.history.points
    refused = 0
    for place in range(0, len(whole), 67):
        spoilt = bytearray(whole)
        spoilt[place] ^= 0x55
        keeper.path.write_bytes(bytes(spoilt))
        try:
            with opened(folder, home) as again:
                assert again.history.points == points
        except DossierError:
            refused += 1
        for left in keeper.path.parent.glob("*-journal"):
            left.unlink()
    assert refused > 20


def test_points_are_never_changed_or_deleted(folder, home):
    with opened(folder, home) as keeper:
        keeper.act(out(1))
        connection = keeper._connection
        for statement in (
            "UPDATE point SET who = 'ben'",
            "DELETE FROM point WHERE number = 1",
            "INSERT OR REPLACE INTO point SELECT * FROM point WHERE number = 1",
            "UPDATE meta SET value = 'x'",
            "DELETE FROM meta",
            "DELETE FROM state",
        ):
            with pytest.raises(sqlite3.IntegrityError):
                connection.execute(statement)


def test_a_connection_has_all_that_keeps_a_dossier_safe(tmp_path):
    connection = connected(tmp_path / "x")
    try:
        for pragma, value in (
            ("trusted_schema", 0), ("cell_size_check", 1), ("mmap_size", 0), ("foreign_keys", 1),
            ("recursive_triggers", 1), ("journal_mode", "delete"), ("synchronous", 3), ("busy_timeout", 2000),
        ):  # fmt: skip
            assert (connection.execute(f"PRAGMA {pragma}").fetchone() or (0,))[0] == value, pragma
        assert connection.getlimit(sqlite3.SQLITE_LIMIT_ATTACHED) == 0
        assert connection.isolation_level is None
    finally:
        connection.close()
    assert APPLICATION_ID.to_bytes(4, "big") == b"PLMB"


def test_only_one_place_connects():
    sources = (CHECKOUT / "src").rglob("*.py")
    assert [one.name for one in sources if "sqlite3.connect(" in one.read_text("utf-8")] == ["dossier_file.py"]


def test_the_users_data_folder(monkeypatch, tmp_path):
    home = Path("/home/anna")
    assert data_folder({}, platform="linux", home=home) == home / ".local" / "share" / "Plumbwell"
    assert data_folder({"XDG_DATA_HOME": "/data"}, platform="linux", home=home) == Path("/data/Plumbwell")
    assert data_folder({"XDG_DATA_HOME": "data"}, platform="linux", home=home) == home / ".local/share/Plumbwell"
    assert data_folder({}, platform="darwin", home=home) == home / "Library" / "Application Support" / "Plumbwell"
    assert data_folder({"LOCALAPPDATA": "/local"}, platform="win32", home=home) == Path("/local/Plumbwell")
    for platform in ("linux", "darwin", "win32"):
        environment = {"PLUMBWELL_HOME": "/own", "XDG_DATA_HOME": "/data", "LOCALAPPDATA": "/local"}
        assert data_folder(environment, platform=platform, home=home) == Path("/own")
    monkeypatch.setenv("PLUMBWELL_HOME", str(tmp_path))
    assert data_folder() == tmp_path
