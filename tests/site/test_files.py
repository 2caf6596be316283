"""Reading and writing site.toml on disk: nothing is lost, whatever happens."""

from __future__ import annotations

import os
from datetime import datetime
from pathlib import Path

import pytest

from fertui.refusals import FileTrouble
from fertui.site import files
from fertui.site.checks import SiteError
from fertui.site.files import read_site, write_site
from fertui.site.model import Loop, Site

NOW = datetime(2026, 3, 1, 8, 30)
SITE = Site("Elm Lane", "UTC", (Loop("north", "known-feed", 100.0, "tomato", "stone-wool"),))


def test_what_is_written_is_read_back(tmp_path: Path) -> None:
    assert write_site(SITE, tmp_path, NOW) == tmp_path / "site.toml"
    assert read_site(tmp_path) == SITE
    assert [each.name for each in tmp_path.iterdir()] == ["site.toml"]


def test_the_old_file_stays_with_its_comments(tmp_path: Path) -> None:
    write_site(SITE, tmp_path, NOW)
    path = tmp_path / "site.toml"
    commented = b"# the north house leaks\n" + path.read_bytes()
    path.write_bytes(commented)
    write_site(SITE._replace(name="Elm Lane 2"), tmp_path, NOW)
    assert (tmp_path / "site.2026-03-01.toml").read_bytes() == commented
    write_site(SITE._replace(name="Elm Lane 3"), tmp_path, NOW)
    assert b"Elm Lane 2" in (tmp_path / "site.2026-03-01.2.toml").read_bytes()
    assert read_site(tmp_path).name == "Elm Lane 3"
    assert (tmp_path / "site.2026-03-01.toml").read_bytes() == commented


def test_a_site_that_would_be_refused_is_not_written(tmp_path: Path) -> None:
    write_site(SITE, tmp_path, NOW)
    before = (tmp_path / "site.toml").read_bytes()
    with pytest.raises(SiteError, match="area_m2"):
        write_site(SITE._replace(loops=(SITE.loops[0]._replace(area_m2=-1.0),)), tmp_path, NOW)
    assert (tmp_path / "site.toml").read_bytes() == before
    assert len(list(tmp_path.iterdir())) == 1


@pytest.mark.parametrize("step", ["fsync", "replace"])
def test_a_disk_that_fails_leaves_the_old_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, step: str) -> None:
    write_site(SITE, tmp_path, NOW)
    before = (tmp_path / "site.toml").read_bytes()

    def fails(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(files.os, step, fails)
    with pytest.raises(FileTrouble, match="No space left"):
        write_site(SITE._replace(name="other"), tmp_path, NOW)
    monkeypatch.undo()
    assert (tmp_path / "site.toml").read_bytes() == before
    assert not [each for each in tmp_path.iterdir() if each.name.startswith(".site")]


def test_no_site_there_says_how_to_make_one(tmp_path: Path) -> None:
    with pytest.raises(SiteError, match="fertui new"):
        read_site(tmp_path)
    with pytest.raises(SiteError, match="fertui new"):
        read_site(tmp_path / "absent")
    (tmp_path / "file").write_text("x")
    with pytest.raises(SiteError, match="fertui new"):
        read_site(tmp_path / "file")


def test_what_cannot_be_read_is_trouble_with_the_file(tmp_path: Path) -> None:
    (tmp_path / "site.toml").mkdir()
    with pytest.raises(FileTrouble, match="cannot be read"):
        read_site(tmp_path)


def test_a_huge_file_is_not_read(tmp_path: Path) -> None:
    with (tmp_path / "site.toml").open("wb") as file:
        os.truncate(file.fileno(), 3_000_000)
    with pytest.raises(SiteError, match="larger than"):
        read_site(tmp_path)
