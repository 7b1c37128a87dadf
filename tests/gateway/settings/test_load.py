"""From a site's folder to its settings: which files, in which order, and what is said when they cannot be read."""

from pathlib import Path

import pytest
from marked import SITE, TANK

from gateway.errors import InputError
from gateway.examples import example
from gateway.settings.advice import advise
from gateway.settings.assemble import plant_plan
from gateway.settings.complaint import SettingsError
from gateway.settings.load import load, load_texts


def written(folder: Path, files: dict[str, str | bytes]) -> Path:
    """Write a site's files and return its folder."""
    for name, text in files.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return folder


def refused(folder: Path) -> list[str]:
    """Return the complaints about the site in a folder."""
    with pytest.raises(SettingsError) as error:
        load(folder)
    return str(error.value).splitlines()


@pytest.mark.parametrize("name", ["first-tank", "hill-dairy"])
def test_the_example_sites_load_without_a_complaint_and_without_a_risk(name: str) -> None:
    """By their folder and by their `site.yaml` alike."""
    site = load(example(name))
    assert site == load(example(name) / "site.yaml")
    assert site.name == name
    assert advise(site, plant_plan(site)) == []


@pytest.mark.parametrize("name", ["first-tank", "hill-dairy"])
def test_a_site_reads_the_same_from_its_texts(name: str) -> None:
    """The texts that the journal keeps give the same settings again, and the same digest."""
    site = load(example(name))
    assert load_texts(site.texts, site.folder) == site


def test_tanks_come_in_the_order_of_the_bytes_of_their_paths(tmp_path: Path) -> None:
    """Capitals before small letters, digits before both, and folders by their names; the same on every machine."""
    names = ["b", "B", "a10", "a2", "é", "z/a"]
    files: dict[str, str | bytes] = {f"tanks/{name}.yaml": f"tank: t{n}\n" for n, name in enumerate(names)}
    site = load(written(tmp_path, {"site.yaml": SITE + "tanks: ['tanks/**/*.yaml']\n", **files}))
    expected = sorted((f"tanks/{name}.yaml" for name in names), key=str.encode)
    assert list(site.texts) == ["site.yaml", *expected]
    assert list(site.tanks) == [f"t{names.index(path[6:-5])}" for path in expected]


def test_the_digest_is_of_names_and_texts(tmp_path: Path) -> None:
    """A blank more, or a file renamed, is another settings text; the same files elsewhere are the same."""
    files: dict[str, str | bytes] = {"site.yaml": SITE, "tanks/a.yaml": TANK}
    first = load(written(tmp_path / "1", files))
    assert load(written(tmp_path / "2", files)).digest == first.digest
    assert load(written(tmp_path / "3", files | {"site.yaml": SITE + " "})).digest != first.digest
    assert load(written(tmp_path / "4", {"site.yaml": SITE, "tanks/b.yaml": TANK})).digest != first.digest


def test_a_mark_of_the_order_of_bytes_is_passed_over(tmp_path: Path) -> None:
    """Some editors begin a file with one."""
    site = load(written(tmp_path, {"site.yaml": b"\xef\xbb\xbf" + SITE.encode(), "tanks/a.yaml": TANK}))
    assert site.name == "farm"


def test_a_folder_without_a_site_is_no_site(tmp_path: Path) -> None:
    """The sentence says what a site is."""
    for path in (tmp_path, tmp_path / "nowhere", tmp_path / "site.yaml"):
        with pytest.raises(InputError, match=r"there is no site.yaml here; a site is a folder that holds one"):
            load(path)


def test_a_pattern_that_finds_no_file_is_a_complaint(tmp_path: Path) -> None:
    """A tank that is not read because its path is misspelt would otherwise go unnoticed."""
    folder = written(tmp_path, {"site.yaml": SITE + "tanks: [tanks/*.yaml, tnaks/*.yaml]\n", "tanks/a.yaml": TANK})
    assert refused(folder) == ["site.yaml:3:23: no file is found by `tnaks/*.yaml`"]


def test_a_file_that_two_patterns_find_is_read_once(tmp_path: Path) -> None:
    """It is one tank."""
    folder = written(tmp_path, {"site.yaml": SITE + "tanks: [tanks/*.yaml, tanks/a*]\n", "tanks/a.yaml": TANK})
    assert list(load(folder).tanks) == ["sump"]


def test_a_file_that_is_no_text_is_a_complaint_by_its_name(tmp_path: Path) -> None:
    """Nothing else can be said of it."""
    folder = written(tmp_path, {"site.yaml": SITE, "tanks/a.yaml": b"tank: \xff\n"})
    assert refused(folder) == ["tanks/a.yaml:1:1: the file is not UTF-8 text"]


def test_the_names_of_files_end_printable(tmp_path: Path) -> None:
    """A file's name that no terminal takes does not end in a traceback."""
    name = b"tanks/\xff\x1b.yaml".decode("utf-8", "surrogateescape")
    (complaint,) = refused(written(tmp_path, {"site.yaml": SITE, name: "x"}))
    assert complaint.isprintable()
    assert complaint.encode().startswith(b"tanks/")


def test_a_secret_is_never_in_the_texts_that_are_kept(tmp_path: Path) -> None:
    """It is read from its own file, or the environment, when the link is made, and is no part of the settings."""
    text = SITE.replace("1883}", "1883, username: me, password: {file: broker}}")
    site = load(written(tmp_path, {"site.yaml": text, "broker": "hunter2"}))
    assert "hunter2" not in repr(site)
