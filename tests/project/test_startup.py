"""What a start loads: the version and the help come from the standard library alone."""

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

import plumbwell

CHECKOUT = Path(__file__).resolve().parents[2]

# Runs the command line as __main__ does and prints the names of what was loaded by it, last of all.
PROBE = """
import json, runpy, sys
before = set(sys.modules)
sys.argv = ["plumbwell", *sys.argv[1:]]
try:
    runpy.run_module("plumbwell", run_name="__main__")
except SystemExit as stop:
    status = stop.code or 0
print()
print(json.dumps([status, sorted(set(sys.modules) - before)]))
"""


def run_python(*arguments: str, **environment: str) -> subprocess.CompletedProcess[str]:
    """A fresh Python on the checkout's sources."""
    base = {name: value for name, value in os.environ.items() if not name.startswith("OPENBLAS")}
    return subprocess.run(
        [sys.executable, *arguments],
        env={**base, "PYTHONPATH": str(CHECKOUT / "src"), **environment},
        capture_output=True,
        text=True,
        check=False,
        timeout=120,
    )


@pytest.mark.parametrize("option", ["--version", "--help"])
def test_version_and_help_load_the_standard_library_only(option):
    result = run_python("-c", PROBE, option)
    *shown, last = result.stdout.strip().splitlines()
    status, loaded = json.loads(last)
    assert status == 0 and shown
    outside = {name.split(".")[0] for name in loaded} - set(sys.stdlib_module_names) - {"plumbwell"}
    assert outside == set()
    assert not {"dataclasses", "importlib.metadata"} & set(loaded)
    rooms = {name for name in loaded if name.startswith("plumbwell.")}
    assert rooms <= {"plumbwell.cli", "plumbwell.__main__"}


def test_version_prints_the_version():
    result = run_python("-m", "plumbwell", "--version")
    assert result.returncode == 0
    assert plumbwell.__version__ in result.stdout.split()


def test_importing_the_package_loads_no_room_and_no_numpy():
    look = "import sys, plumbwell; print(*[n for n in sys.modules if n.startswith(('numpy', 'plumbwell.'))])"
    result = run_python("-c", look)
    assert result.stdout.strip() == "" and result.returncode == 0


def test_one_thread_in_the_linear_algebra_is_said_before_numpy_is_loaded():
    look = "import os, sys, plumbwell; print('numpy' in sys.modules, os.environ['OPENBLAS_NUM_THREADS'])"
    assert run_python("-c", look).stdout.split() == ["False", "1"]


def test_threads_that_the_user_asked_for_stay():
    look = "import os, plumbwell; print(os.environ['OPENBLAS_NUM_THREADS'])"
    assert run_python("-c", look, OPENBLAS_NUM_THREADS="3").stdout.strip() == "3"


@pytest.mark.parametrize("name", [name for name in plumbwell.__all__ if name != "__version__"])
def test_every_public_name_can_be_had_and_is_listed(name):
    value = getattr(plumbwell, name)
    assert callable(value) and value.__name__ == name
    assert name in dir(plumbwell)


def test_a_name_that_does_not_exist_is_refused_as_python_does():
    with pytest.raises(AttributeError, match="module 'plumbwell' has no attribute 'densities'"):
        plumbwell.densities  # noqa: B018
