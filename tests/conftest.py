"""What holds for every test: no screen, no user's files, no chance, no thread left behind."""

import os

# Both count only when they are said before Qt or numpy is loaded.
os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import threading
import time
from collections.abc import Iterator
from pathlib import Path

import pytest
from hypothesis import settings

from plumbwell.study.results import Results
from reduced_surveys import CHECKOUT, SHAFT, WELL, reduced

settings.register_profile("house", derandomize=True, max_examples=50, deadline=None, database=None)
settings.load_profile("house")


@pytest.fixture(scope="session")
def checkout() -> Path:
    """Top of the checkout."""
    return CHECKOUT


@pytest.fixture(scope="session", autouse=True)
def own_home(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Path]:
    """An empty home, so that no test reads or writes the user's own files."""
    home = tmp_path_factory.mktemp("home")
    with pytest.MonkeyPatch.context() as patch:
        patch.delenv("PLUMBWELL_HOME", raising=False)
        for name in ("HOME", "USERPROFILE"):
            patch.setenv(name, str(home))
        for name in ("XDG_DATA_HOME", "XDG_CONFIG_HOME", "XDG_CACHE_HOME", "APPDATA", "LOCALAPPDATA"):
            patch.setenv(name, str(home / name.lower()))
        yield home


@pytest.fixture(autouse=True)
def no_thread_left() -> Iterator[None]:
    """Fail a test whose threads still run two seconds after it."""
    before = set(threading.enumerate())
    yield
    deadline = time.monotonic() + 2.0
    while left := set(threading.enumerate()) - before:
        if time.monotonic() > deadline:
            pytest.fail(f"threads left over: {sorted(thread.name for thread in left)}")
        time.sleep(0.01)


@pytest.fixture(scope="session", autouse=True)
def one_application(qapp: object) -> object:
    """The one application of the whole run, able to hold widgets, made before any test draws."""
    return qapp


@pytest.fixture(scope="session")
def shaft() -> Results:
    """The real shaft, reduced."""
    return reduced(SHAFT)


@pytest.fixture(scope="session")
def well() -> Results:
    """The sample well, reduced."""
    return reduced(WELL)
