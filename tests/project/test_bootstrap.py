"""bootstrap.py: what it refuses, cleans, remembers and finds. pip is never started here."""

import ast
import importlib.util
import json
import os
import re
import subprocess
import sys
from pathlib import Path
from types import ModuleType

import pytest

CHECKOUT = Path(__file__).resolve().parents[2]
BOOTSTRAP = CHECKOUT / "bootstrap.py"
PYENV = Path(os.environ.get("PYENV_ROOT") or Path("~/.pyenv").expanduser()) / "versions"
OLD_PYTHONS = [
    found
    for series in ("2.7", "3.6", "3.8", "3.10")
    for found in sorted(PYENV.glob(f"{series}.*/bin/python"))[:1]
]

PROJECT = """
[build-system]
requires = ["hatchling"]

[project]
name = "plumbwell"
dependencies = ["numpy>=2.4"]

[tool.ruff]
line-length = 110
"""


@pytest.fixture
def bootstrap() -> ModuleType:
    """bootstrap.py as a module of its own."""
    spec = importlib.util.spec_from_file_location("bootstrap", BOOTSTRAP)
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture
def set_up(bootstrap, tmp_path, monkeypatch) -> ModuleType:
    """A small project in a folder of its own whose .venv is complete for the tests."""
    (tmp_path / "pyproject.toml").write_text(PROJECT)
    monkeypatch.setattr(bootstrap, "ROOT", str(tmp_path))
    monkeypatch.setattr(bootstrap, "VENV", str(tmp_path / ".venv"))
    for name in ("python", "plumbwell"):
        program = Path(bootstrap.venv_program(name))
        program.parent.mkdir(parents=True, exist_ok=True)
        program.touch()
    bootstrap.write_note("base", json.dumps(bootstrap.base()))
    bootstrap.write_note("stamp", bootstrap.stamp(tmp_path / "pyproject.toml", "test", bootstrap.base()))
    return bootstrap


@pytest.fixture
def commands(set_up, monkeypatch) -> list[list[str]]:
    """What would have been started; each command succeeds, and making .venv makes its folder."""
    started = []

    def run(command, environment, **options):
        started.append([os.path.basename(command[0]), *command[1:]])
        if "venv" in command:
            for name in ("python", "plumbwell"):
                program = Path(set_up.venv_program(name))
                program.parent.mkdir(parents=True, exist_ok=True)
                program.touch()
        return 0

    monkeypatch.setattr(set_up, "run", run)
    return started


# --- other Pythons ---


@pytest.mark.parametrize("version", [(2, 7, 18), (3, 6, 15), (3, 10, 13), (3, 14, 0), (4, 0, 0)])
def test_another_python_is_refused_by_name(bootstrap, version):
    assert bootstrap.refusal(version, "/opt/old/python") == (
        f"Plumbwell needs Python 3.11, 3.12 or 3.13, and this is Python {version[0]}.{version[1]} "
        "(/opt/old/python). Please start bootstrap.py with one of those, for example: "
        "python3.13 bootstrap.py app"
    )


@pytest.mark.parametrize("version", [(3, 11, 0), (3, 12, 1), (3, 13, 9)])
def test_a_supported_python_is_let_in(bootstrap, version):
    assert bootstrap.refusal(version, "python") is None


def test_old_parsers_can_read_the_whole_file():
    text = BOOTSTRAP.read_text("ascii")
    tree = ast.parse(text, feature_version=(3, 6))
    newer_than_2 = ast.JoinedStr | ast.AnnAssign | ast.Nonlocal | ast.AsyncFunctionDef | ast.YieldFrom
    for node in ast.walk(tree):
        assert not isinstance(node, newer_than_2), f"line {node.lineno}"
        if isinstance(node, ast.FunctionDef | ast.Lambda):
            arguments = node.args
            assert not arguments.kwonlyargs and not arguments.posonlyargs, f"line {node.lineno}"
            annotated = [argument for argument in arguments.args if argument.annotation]
            assert not annotated and not getattr(node, "returns", None), f"line {node.lineno}"
        if isinstance(node, ast.Raise):
            assert node.cause is None, f"line {node.lineno}"
        if isinstance(node, ast.ClassDef):
            assert not node.keywords, f"line {node.lineno}"
    assert not re.search(r"\d_\d", text)


@pytest.mark.parametrize("python", OLD_PYTHONS, ids=lambda path: path.parents[1].name)
def test_old_pythons_print_the_sentence_and_nothing_else(python):
    environment = {**os.environ, "PYTHONDONTWRITEBYTECODE": "1"}
    result = subprocess.run(
        [python, BOOTSTRAP, "app"], env=environment, capture_output=True, text=True, check=False
    )
    assert result.returncode == 2 and result.stdout == ""
    assert re.fullmatch(r"Plumbwell needs Python 3\.11, 3\.12 or 3\.13, and this is .*\n", result.stderr)


# --- the environment ---


def test_what_would_mislead_is_dropped_and_where_packages_come_from_is_kept(bootstrap):
    kept = {
        "PIP_INDEX_URL": "https://packages.invalid/simple",
        "PIP_EXTRA_INDEX_URL": "a",
        "PIP_FIND_LINKS": "b",
        "PIP_NO_INDEX": "1",
        "PIP_CERT": "c",
        "PIP_CONFIG_FILE": "d",
        "HTTPS_PROXY": "e",
        "PATH": "f",
        "DISPLAY": ":0",
        "PYTHONUTF8": "1",
    }
    dropped = (
        "PYTHONPATH PYTHONHOME PYTHONOPTIMIZE PYTHONWARNINGS PYTHONUSERBASE VIRTUAL_ENV PIP_USER PIP_TARGET"
        " PIP_PREFIX PIP_ROOT PIP_NO_DEPS PIP_DRY_RUN PIP_REQUIRE_VIRTUALENV PIP_NO_BUILD_ISOLATION"
        " QT_PLUGIN_PATH PYTEST_ADDOPTS"
    ).split()
    assert bootstrap.clean_environment({**kept, **dict.fromkeys(dropped, "1")}) == kept


@pytest.mark.parametrize(
    ("system", "environment", "shown"),
    [
        ("linux", {}, False),
        ("linux", {"DISPLAY": ""}, False),
        ("linux", {"DISPLAY": ":0"}, True),
        ("linux", {"WAYLAND_DISPLAY": "wayland-0"}, True),
        ("linux", {"DISPLAY": ":0", "QT_QPA_PLATFORM": "offscreen"}, False),
        ("linux", {"DISPLAY": ":0", "QT_QPA_PLATFORM": "minimal:enable_fonts"}, False),
        ("linux", {"DISPLAY": ":0", "QT_QPA_PLATFORM": "xcb"}, True),
        ("win32", {}, True),
        ("darwin", {}, True),
        ("darwin", {"QT_QPA_PLATFORM": "offscreen"}, False),
    ],
)
def test_a_display_is_where_a_window_could_be_shown(bootstrap, system, environment, shown):
    assert bootstrap.has_display(environment, system) is shown


# --- the stamp ---


def test_the_stamp_changes_with_all_that_decides_what_is_installed(bootstrap, tmp_path):
    project = tmp_path / "pyproject.toml"
    project.write_text(PROJECT)
    foundation = ["3.11.7", "/usr", "/home/a/plumbwell"]
    stamps = [bootstrap.stamp(project, "", foundation), bootstrap.stamp(project, "test", foundation)]
    for index in range(3):
        other = [*foundation]
        other[index] += "1"
        stamps.append(bootstrap.stamp(project, "", other))
    for old, new in (("numpy>=2.4", "numpy>=2.5"), ('["hatchling"]', '["hatchling>=1.27"]')):
        project.write_text(PROJECT.replace(old, new))
        stamps.append(bootstrap.stamp(project, "", foundation))
    assert len(set(stamps)) == 7
    assert all(re.fullmatch("[0-9a-f]{64}", stamp) for stamp in stamps)


def test_the_stamp_does_not_change_with_settings_of_tools_or_comments(bootstrap, tmp_path):
    project = tmp_path / "pyproject.toml"
    project.write_text(PROJECT)
    before = bootstrap.stamp(project, "", ["3.11.7", "/usr", "/a"])
    project.write_text("# a comment\n" + PROJECT.replace("110", "100"))
    assert bootstrap.stamp(project, "", ["3.11.7", "/usr", "/a"]) == before


@pytest.mark.parametrize("extra", ["", "test"])
def test_nothing_is_started_when_the_stamp_fits(set_up, commands, extra):
    assert set_up.install(extra, {}) == 0
    assert commands == []


def test_what_was_installed_for_the_program_is_not_enough_for_the_tests(set_up, commands):
    project = os.path.join(set_up.ROOT, "pyproject.toml")
    set_up.write_note("stamp", set_up.stamp(project, "", set_up.base()))
    assert set_up.install("test", {}) == 0
    assert [command[-1] for command in commands] == [".[test]"]
    assert set_up.read_note("stamp") == set_up.stamp(project, "test", set_up.base())


def test_a_changed_project_is_installed_into_the_same_venv_through_python_m_pip(set_up, commands):
    project = Path(set_up.ROOT, "pyproject.toml")
    project.write_text(PROJECT.replace("numpy>=2.4", "numpy>=2.5"))
    assert set_up.install("", {}) == 0
    (command,) = commands
    assert command[:4] == [os.path.basename(set_up.venv_program("python")), "-m", "pip", "install"]
    assert command[-2:] == ["--editable", "."]


@pytest.mark.parametrize("part", [0, 1, 2])
def test_another_python_prefix_or_path_makes_the_venv_anew(set_up, commands, monkeypatch, part):
    other = set_up.base()
    other[part] += "1"
    monkeypatch.setattr(set_up, "base", lambda: other)
    relic = Path(set_up.VENV, "relic")
    relic.touch()
    assert set_up.install("", {}) == 0
    assert [command[1:3] for command in commands] == [["-m", "venv"], ["-m", "pip"]]
    assert not relic.exists()
    assert set_up.installed("")


def test_an_installation_that_fails_is_tried_again(set_up, monkeypatch, capsys):
    set_up.write_note("stamp", "of another project file")
    monkeypatch.setattr(set_up, "run", lambda command, environment: 1)
    assert set_up.install("", {}) == 1
    assert not set_up.installed("")
    assert "README.md" in capsys.readouterr().err


def test_a_venv_that_cannot_be_removed_is_said_in_words(set_up, monkeypatch, capsys):
    for note in ("base", "stamp"):
        set_up.write_note(note, "")

    def rmtree(path):
        raise PermissionError(13, "Permission denied", path)

    monkeypatch.setattr(set_up.shutil, "rmtree", rmtree)
    assert set_up.install("", {}) == 1
    assert "Cannot remove the old .venv" in capsys.readouterr().err


def test_a_python_that_cannot_make_environments_names_the_package(set_up, monkeypatch, capsys):
    for note in ("base", "stamp"):
        set_up.write_note(note, "")
    asked = []
    monkeypatch.setattr(importlib.util, "find_spec", lambda name: None)
    monkeypatch.setattr(set_up, "apt_install", lambda packages, environment: asked.extend(packages))
    assert set_up.install("", {}) == 1
    assert asked == [f"python3.{sys.version_info[1]}-venv"]
    assert "ensurepip is missing" in capsys.readouterr().out


def test_a_venv_without_the_command_is_installed_again(set_up, commands):
    os.remove(set_up.venv_program("plumbwell"))
    assert set_up.install("", {}) == 0
    assert len(commands) == 1


# --- Qt's libraries ---


def test_libraries_that_ldd_misses_are_named_once(bootstrap):
    report = """
/a/libqxcb.so:
\tlinux-vdso.so.1 (0x00007ffd)
\tlibxcb-cursor.so.0 => not found
\tlibQt6Gui.so.6 => /a/../lib/libQt6Gui.so.6 (0x00007f5c)
\tlibEGL.so.1 => not found
/a/QtGui.abi3.so:
\tlibEGL.so.1 => not found
\t/lib64/ld-linux-x86-64.so.2 (0x00007f5d)
"""
    assert bootstrap.missing_libraries(report) == ["libxcb-cursor.so.0", "libEGL.so.1"]
    assert bootstrap.missing_libraries("\tstatically linked\n") == []


def test_who_is_not_root_is_told_the_exact_command(bootstrap, monkeypatch, capsys):
    monkeypatch.setattr(bootstrap.os, "geteuid", lambda: 1000, raising=False)
    monkeypatch.setattr(bootstrap, "run", lambda *_, **__: pytest.fail("nothing is started"))
    assert bootstrap.apt_install(["libegl1", "libgl1"], {}) is False
    command = "sudo apt-get install -y --no-install-recommends --no-upgrade libegl1 libgl1\n"
    assert command in capsys.readouterr().out


# --- the two commands ---


def test_the_first_sample_is_shown_or_else_the_next(bootstrap, tmp_path, monkeypatch):
    monkeypatch.setattr(bootstrap, "ROOT", str(tmp_path))
    assert bootstrap.sample_survey() is None
    for name in ("notes", "bell_shaft", "arden_well"):
        (tmp_path / "sample_surveys" / name).mkdir(parents=True)
    for name in ("bell_shaft", "arden_well"):
        (tmp_path / "sample_surveys" / name / "survey.toml").touch()
    assert bootstrap.sample_survey() == os.path.join("sample_surveys", "arden_well")
    (tmp_path / "sample_surveys" / bootstrap.SAMPLE).mkdir()
    (tmp_path / "sample_surveys" / bootstrap.SAMPLE / "survey.toml").touch()
    assert bootstrap.sample_survey() == os.path.join("sample_surveys", bootstrap.SAMPLE)


@pytest.mark.parametrize(("status", "ends"), [(0, 0), (3, 0), (1, 1)])
def test_app_says_where_tables_and_figure_are(set_up, tmp_path, monkeypatch, capsys, status, ends):
    sample = tmp_path / "sample_surveys" / "arden_well"
    sample.mkdir(parents=True)
    (sample / "survey.toml").touch()
    output = tmp_path / "plumbwell_output"
    output.mkdir()
    (output / "figure.png").write_text("of an earlier run")
    started = []

    def run(command, environment):
        started.append(command[1:])
        (output / "figure.svg").touch()
        return status

    monkeypatch.setattr(set_up, "OUTPUT", str(output))
    monkeypatch.setattr(set_up, "check_qt_libraries", lambda environment: True)
    monkeypatch.setattr(set_up, "run", run)
    assert set_up.app({"QT_QPA_PLATFORM": "offscreen"}) == ends
    assert started == [["reduce", os.path.join("sample_surveys", "arden_well"), "--out", "plumbwell_output"]]
    shown = capsys.readouterr().out
    assert not (output / "figure.png").exists()
    if ends == 0:
        assert f"Tables: {output}\nFigure: {output / 'figure.svg'}\n" in shown
        assert ("status 3" in shown) == (status == 3)
    else:
        assert "Tables:" not in shown


@pytest.mark.parametrize(("lacking", "does"), [(set(), "open"), ({"libxcb-cursor.so.0"}, "reduce")])
def test_app_opens_the_window_where_one_can_be_shown(set_up, tmp_path, monkeypatch, lacking, does):
    sample = tmp_path / "sample_surveys" / "arden_well"
    sample.mkdir(parents=True)
    (sample / "survey.toml").touch()
    started = []
    monkeypatch.setattr(set_up, "OUTPUT", str(tmp_path / "plumbwell_output"))
    monkeypatch.setattr(set_up, "check_qt_libraries", lambda environment: True)
    monkeypatch.setattr(set_up, "has_display", lambda environment: True)
    monkeypatch.setattr(set_up, "qt_misses", lambda for_windows, environment: lacking if for_windows else set())
    monkeypatch.setattr(set_up, "run", lambda command, environment: started.append(command[1:]) or 0)
    assert set_up.app({}) == 0
    assert started[0][:2] == [does, os.path.join("sample_surveys", "arden_well")] and len(started) == 1


@pytest.mark.parametrize("arguments", [[], ["run"], ["app", "more"]])
def test_anything_else_shows_the_two_commands(bootstrap, capsys, arguments):
    assert bootstrap.main(arguments) == 2
    assert "bootstrap.py app" in capsys.readouterr().err
