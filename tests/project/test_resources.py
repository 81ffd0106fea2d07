"""`resource` looks beside the package first, then at the checkout's top."""

import re

import pytest

from plumbwell import resources


def test_the_place_beside_the_package_comes_first(tmp_path, monkeypatch):
    beside, top = tmp_path / "resource_files", tmp_path / "resources"
    for place in (beside, top):
        (place / "tables").mkdir(parents=True)
        (place / "tables" / "both.csv").touch()
    (top / "tables" / "top.csv").touch()
    monkeypatch.setattr(resources, "_PLACES", (beside, top))
    assert resources.resource("tables/both.csv") == beside / "tables" / "both.csv"
    assert resources.resource("tables/top.csv") == top / "tables" / "top.csv"


def test_a_missing_resource_names_itself_and_both_places(tmp_path, monkeypatch):
    monkeypatch.setattr(resources, "_PLACES", (tmp_path / "a", tmp_path / "b"))
    beside, top = tmp_path / "a" / "x.csv", tmp_path / "b" / "x.csv"
    wanted = f"resource 'x.csv' is missing: neither {beside} nor {top} is there; please reinstall"
    with pytest.raises(FileNotFoundError, match=f"^{re.escape(wanted)}$"):
        resources.resource("x.csv")


def test_the_checkout_has_its_resources():
    assert resources.resource("").is_dir()
