"""A wheel built from the tree runs outside the checkout, with its resources."""

import os
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

import plumbwell

CHECKOUT = Path(__file__).resolve().parents[2]


def run_python(*arguments: str, cwd: Path, path: Path | None = None) -> str:
    """What a fresh Python prints; `path` holds the packages that come first."""
    environment = {name: value for name, value in os.environ.items() if name != "PYTHONPATH"}
    if path is not None:
        environment["PYTHONPATH"] = str(path)
    result = subprocess.run(
        [sys.executable, *arguments], cwd=cwd, env=environment, capture_output=True, text=True, check=False
    )
    assert result.returncode == 0, result.stdout + result.stderr
    return result.stdout


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The wheel, built without an index."""
    pytest.importorskip("hatchling")
    folder = tmp_path_factory.mktemp("wheel")
    options = ["--no-deps", "--no-build-isolation", "--no-index", "--quiet", "--disable-pip-version-check"]
    run_python("-m", "pip", "wheel", *options, "--wheel-dir", str(folder), str(CHECKOUT), cwd=folder)
    (built,) = folder.glob("*.whl")
    return built


@pytest.fixture(scope="module")
def installed(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder that holds the installed wheel and nothing else."""
    folder = tmp_path_factory.mktemp("installed")
    options = ["--no-deps", "--no-index", "--quiet", "--disable-pip-version-check"]
    run_python("-m", "pip", "install", *options, "--target", str(folder), str(wheel), cwd=folder)
    return folder


def test_the_wheel_holds_every_source_and_every_resource(wheel):
    names = set(zipfile.ZipFile(wheel).namelist())
    for folder, place in (("src/plumbwell", "plumbwell"), ("resources", "plumbwell/resource_files")):
        files = [path for path in (CHECKOUT / folder).rglob("*") if path.is_file()]
        wanted = {f"{place}/{path.relative_to(CHECKOUT / folder).as_posix()}" for path in files}
        assert {name for name in wanted if "__pycache__" not in name} <= names
    assert not [name for name in names if name.startswith(("tests/", "sample_surveys/"))]
    assert [name for name in names if name.endswith("licenses/LICENSE")]


def test_the_installed_command_tells_its_version(installed, tmp_path):
    shown = run_python("-m", "plumbwell", "--version", cwd=tmp_path, path=installed)
    assert plumbwell.__version__ in shown.split()
    scripts = [path.stem for folder in ("bin", "Scripts") for path in (installed / folder).glob("plumbwell*")]
    assert scripts == ["plumbwell"]


def test_the_installed_package_finds_its_resources_beside_itself(installed, tmp_path):
    first = next(path for path in sorted((CHECKOUT / "resources").rglob("*")) if path.is_file())
    name = first.relative_to(CHECKOUT / "resources").as_posix()
    look = f"from plumbwell.resources import resource; print(resource({name!r}))"
    found = Path(run_python("-c", look, cwd=tmp_path, path=installed).strip())
    assert found.is_relative_to(installed.resolve())
    assert found.read_bytes() == first.read_bytes()


def test_the_installed_program_reduces_a_survey(installed, tmp_path):
    sample = next(iter(sorted((CHECKOUT / "sample_surveys").glob("*/survey.toml")))).parent
    look = (
        "import sys; from plumbwell.cli import main; status = main(['reduce', sys.argv[1], '--out', 'out']);"
        " assert status in (0, 3), status; import plumbwell; print(plumbwell.__file__)"
    )
    shown = run_python("-c", look, str(sample), cwd=tmp_path, path=installed)
    assert Path(shown.splitlines()[-1]).is_relative_to(installed)
    assert (tmp_path / "out" / "intervals.csv").stat().st_size > 0
