"""Files of the package that are missing, cut off, altered or laid out anew: each is said, none stops a build."""

from __future__ import annotations

import json
import shutil
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

from propdb.errors import SeedError
from propdb.intake.package import READERS, load_package
from propdb.intake.package.curves import tidy_points
from propdb.intake.package.files import FileSpec, installed, load, read_manifest
from propdb.intake.package.registry import Refused
from propdb.intake.seeds import load_seed
from propdb.intake.where import seed_root
from propdb.store.content import Content, validate

SPEC = {spec.key: spec for spec in read_manifest(seed_root()).files}
ATCT, JANAF = SPEC["atct-liquid"], SPEC["janaf-solid"]


@pytest.fixture(scope="module")
def seed() -> Content:
    return load_seed(seed_root(), identifiers=False)


@pytest.fixture
def place(tmp_path: Path) -> Path:
    """A directory with copies of two files of the package."""
    root, _ = installed()
    assert root is not None
    for spec in (ATCT, JANAF):
        (tmp_path / spec.path).parent.mkdir(exist_ok=True)
        shutil.copy(root / spec.path, tmp_path / spec.path)
    return tmp_path


def _load(spec: FileSpec, place: Path | None) -> tuple[int, str, str]:
    found = load(spec, place, found_version="1.5.2", recorded_version="1.5.2")
    return len(found.rows), found.trouble, found.remark


def test_every_file_of_the_manifest_is_there_as_recorded() -> None:
    root, version = installed()
    manifest = read_manifest(seed_root())
    if version != manifest.version:
        pytest.skip(f"chemicals {version} is installed, {manifest.version} is recorded")
    for spec in manifest.files:
        assert _load(spec, root) == (spec.rows, "", ""), spec.key
    assert {spec.key for spec in manifest.files if not spec.key.startswith("vapour-")} == set(READERS)


def _append(path: Path) -> None:
    with path.open("a", encoding="utf-8") as file:
        file.write("64-17-5\tEthanol\tCH3CH2OH (l)\t-269270\t-277030\t220\n")


def _cut(path: Path) -> None:
    path.write_bytes(path.read_bytes()[:-20])


def _column(path: Path) -> None:
    path.write_text(path.read_text(encoding="utf-8").replace("Hfl_0K", "Hfl at 0 K"), encoding="utf-8")


def _bytes(path: Path) -> None:
    path.write_bytes(b"\xff\xfe\x00" + path.read_bytes())


def _empty(path: Path) -> None:
    path.write_bytes(b"")


def _directory(path: Path) -> None:
    path.unlink()
    path.mkdir()


ALTERED = "its SHA-256 is not the one recorded for chemicals 1.5.2"


@pytest.mark.parametrize(
    ("damage", "rows", "trouble", "remark"),
    [
        (Path.unlink, 0, "the file is missing", ""),
        (_append, 35, "", ALTERED),
        (_cut, 33, "", ALTERED),
        (_column, 0, "its columns have changed, first at 'Hfl at 0 K'", ALTERED),
        (_bytes, 0, "cannot be read", ALTERED),
        (_empty, 0, "its columns have changed, first at 'nothing'", ALTERED),
        (_directory, 0, "cannot be read", ""),
    ],
)
def test_a_damaged_table(place: Path, damage: Callable[[Path], None], rows: int, trouble: str, remark: str) -> None:
    damage(place / ATCT.path)
    found = _load(ATCT, place)
    assert found[0] == rows
    assert trouble in found[1]
    assert bool(trouble) == bool(found[1])
    assert found[2].startswith(remark)


def test_a_json_file_that_is_cut_off_or_laid_out_anew(place: Path) -> None:
    path = place / JANAF.path
    whole = json.loads(path.read_text(encoding="utf-8"))
    _cut(path)
    assert _load(JANAF, place)[:1] == (0,)
    assert "cannot be read" in _load(JANAF, place)[1]
    path.write_text("[]", encoding="utf-8")
    assert "another layout" in _load(JANAF, place)[1]
    cas = next(iter(whole))
    path.write_text(json.dumps({**whole, cas: whole[cas][:1]}), encoding="utf-8")
    assert _load(JANAF, place)[:2] == (len(whole) - 1, "")


def test_no_package_at_all() -> None:
    assert _load(ATCT, None) == (0, "the package chemicals is not installed", "")


def test_a_build_goes_on_without_what_cannot_be_read(seed: Content, place: Path) -> None:
    _cut(place / ATCT.path)
    told: list[str] = []
    found = load_package(seed, seed_root(), place=place, progress=told.append)
    report = {each.key: each for each in found.reports}
    assert report["yaws-gas"].trouble == "the file is missing"
    assert any("skipped" in line and "Yaws" in line for line in told)
    atct = report["atct-liquid"]
    assert (atct.rows, atct.used, atct.refused) == (34, 33, 1)
    assert [refusal.kind for refusal in atct.refusals if not refusal.column] == ["cut off"]
    carriers = {c.how for e in found.content.entries for c in e.carriers if c.file == ATCT.path}
    assert all("its SHA-256 is not the one recorded for chemicals 1.5.2" in how for how in carriers)
    assert carriers
    validate(found.content)


def test_a_package_without_files_leaves_the_seed(seed: Content, tmp_path: Path) -> None:
    found = load_package(seed, seed_root(), place=tmp_path)
    assert [e.id for e in found.content.entries] == [e.id for e in seed.entries]
    assert {s.name for s in found.content.species} == {s.name for s in seed.species}


def test_a_manifest_that_is_not_one(tmp_path: Path) -> None:
    (tmp_path / "_package").mkdir()
    (tmp_path / "_package" / "files.toml").write_text("version = '1'\n[[file]]\nkey = 'a'\n", encoding="utf-8")
    with pytest.raises(SeedError, match="cannot be read"):
        read_manifest(tmp_path)


def test_points_that_make_no_table() -> None:
    line = [(100.0, 1.0), (200.0, 2.0), (300.0, 3.0)]
    assert tidy_points([(0.0, 0.0), *line]) == (
        line,
        ["the point at 0 K is left out: a limit, or a blank printed as 0, through which no curve goes"],
    )
    thrice = [(100.0, 1.0), (200.0, 2.0), (200.0, 2.0), (200.0, 5.0), (300.0, 3.0)]
    points, notes = tidy_points(thrice)
    assert points == [(100.0, 1.0), (200.0, 2.0), (200.0, 5.0), (300.0, 3.0)]
    assert notes == ["a temperature printed three times or more keeps its first and last value"]
    points, notes = tidy_points([*line, (300.0, 9.0)])
    assert points == line
    assert "one point only" in notes[0]
    for wrong in ([(200.0, 1.0), (100.0, 1.0)], [(100.0, 0.0), (200.0, 1.0)]):
        with pytest.raises(Refused):
            tidy_points(wrong)


def test_the_same_files_give_the_same_content_twice(seed: Content, place: Path) -> None:
    one, two = (load_package(seed, seed_root(), place=place).content for _ in range(2))
    assert [e.id for e in one.entries] == [e.id for e in two.entries]
    assert one.species == two.species
    assert replace(one, entries=()) == replace(two, entries=())
