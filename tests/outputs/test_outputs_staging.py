import datetime
import hashlib
import json
import shutil
import subprocess
import sys
from dataclasses import dataclass
from pathlib import Path, PurePosixPath

import numpy as np
import pytest

from siting.errors import OutputError
from siting.outputs.run_record import file_hashes, sha256, write_run_record
from siting.outputs.staging import StagedFolder

REPOSITORY = Path(__file__).parents[2]


def write_results(target: Path, text: str, *, overwrite: bool = False) -> None:
    with StagedFolder(target, overwrite=overwrite) as folder:
        (folder / "rasters").mkdir()
        (folder / "rasters" / "a.txt").write_text(text)
        write_run_record(folder / "run.json", {"text": text})


def content(target: Path) -> dict[str, str]:
    return {path.relative_to(target).as_posix(): path.read_text() for path in target.rglob("*") if path.is_file()}


def test_results_appear_whole_at_the_end(tmp_path: Path) -> None:
    target = tmp_path / "deep" / "results"
    with StagedFolder(target) as folder:
        write_run_record(folder / "run.json", {})
        assert not target.exists()
    assert [path.name for path in target.parent.iterdir()] == ["results"]
    assert [path.name for path in target.iterdir()] == ["run.json"]


@pytest.mark.parametrize("error", [RuntimeError, KeyboardInterrupt])
def test_an_error_or_an_interrupt_leaves_the_old_results_and_nothing_else(
    tmp_path: Path, error: type[BaseException]
) -> None:
    target = tmp_path / "results"
    write_results(target, "old")
    before = content(target)
    with pytest.raises(error), StagedFolder(target, overwrite=True) as folder:
        (folder / "half.txt").write_text("half")
        raise error
    assert content(target) == before
    assert [path.name for path in tmp_path.iterdir()] == ["results"]


def test_a_killed_run_leaves_the_old_results_whole(tmp_path: Path) -> None:
    target = tmp_path / "results"
    write_results(target, "old")
    before = content(target)
    script = (
        "import os, signal, sys; from pathlib import Path; from siting.outputs.staging import StagedFolder\n"
        "with StagedFolder(Path(sys.argv[1]), overwrite=True) as folder:\n"
        "    (folder / 'half.txt').write_text('half'); os.kill(os.getpid(), signal.SIGKILL)\n"
    )
    done = subprocess.run([sys.executable, "-c", script, str(target)], cwd=REPOSITORY, check=False)
    assert done.returncode == -9
    assert content(target) == before
    write_results(target, "new", overwrite=True)
    assert content(target)["rasters/a.txt"] == "new"


def test_a_run_killed_between_the_two_renames_is_mended_by_the_next(tmp_path: Path) -> None:
    target = tmp_path / "results"
    write_results(target, "old")
    target.rename(tmp_path / ".results.before")  # the first of the two renames
    with pytest.raises(OutputError, match="overwrite"):
        write_results(target, "new")
    assert content(target)["rasters/a.txt"] == "old"
    assert [path.name for path in tmp_path.iterdir()] == ["results"]


def test_a_run_killed_while_it_cleared_the_old_results_is_mended_by_the_next(tmp_path: Path) -> None:
    target = tmp_path / "results"
    write_results(target, "new")
    aside = tmp_path / ".results.before"
    write_results(aside, "old")
    (aside / "rasters" / "a.txt").unlink()  # half cleared
    with StagedFolder(target, overwrite=True) as folder:
        assert not aside.exists()
        write_run_record(folder / "run.json", {})
    assert [path.name for path in tmp_path.iterdir()] == ["results"]


def test_a_folder_of_someone_else_with_the_name_of_the_one_set_aside_is_not_removed(tmp_path: Path) -> None:
    target = tmp_path / "results"
    write_results(target, "old")
    (tmp_path / ".results.before").mkdir()
    (tmp_path / ".results.before" / "theirs.txt").write_text("theirs")
    with pytest.raises(OutputError, match="put in place"):
        write_results(target, "new", overwrite=True)
    assert content(tmp_path / ".results.before") == {"theirs.txt": "theirs"}
    assert content(target)["rasters/a.txt"] == "old"


def test_results_are_replaced_only_when_asked(tmp_path: Path) -> None:
    target = tmp_path / "results"
    write_results(target, "old")
    with pytest.raises(OutputError, match="--overwrite"):
        write_results(target, "new")
    assert content(target)["rasters/a.txt"] == "old"
    write_results(target, "new", overwrite=True)
    assert content(target)["rasters/a.txt"] == "new"
    assert [path.name for path in tmp_path.iterdir()] == ["results"]


@pytest.mark.parametrize("record", [None, "not json", "[1]", '{"name": "another program"}'])
def test_a_folder_without_our_run_record_is_never_touched(tmp_path: Path, record: str | None) -> None:
    target = tmp_path / "photos"
    target.mkdir()
    (target / "holiday.txt").write_text("dear")
    if record is not None:
        (target / "run.json").write_text(record)
    before = content(target)
    with pytest.raises(OutputError, match="left alone"):
        write_results(target, "new", overwrite=True)
    assert content(target) == before


def test_a_file_a_link_and_a_dangling_link_are_never_replaced(tmp_path: Path) -> None:
    write_results(tmp_path / "results", "old")
    (tmp_path / "file").write_text("mine")
    (tmp_path / "link").symlink_to(tmp_path / "results")
    (tmp_path / "dangling").symlink_to(tmp_path / "nowhere")
    for name in ("file", "link", "dangling"):
        with pytest.raises(OutputError):
            write_results(tmp_path / name, "new", overwrite=True)
    assert (tmp_path / "file").read_text() == "mine"
    assert (tmp_path / "link").is_symlink()
    assert content(tmp_path / "results")["rasters/a.txt"] == "old"


def test_an_empty_folder_may_be_filled(tmp_path: Path) -> None:
    (tmp_path / "results").mkdir()
    write_results(tmp_path / "results", "new")
    assert content(tmp_path / "results")["rasters/a.txt"] == "new"


def test_a_folder_that_someone_fills_meanwhile_is_left_alone(tmp_path: Path) -> None:
    target = tmp_path / "results"
    with pytest.raises(OutputError, match="left alone"), StagedFolder(target) as folder:
        write_run_record(folder / "run.json", {})
        target.mkdir()
        (target / "theirs.txt").write_text("theirs")
    assert content(target) == {"theirs.txt": "theirs"}
    assert [path.name for path in tmp_path.iterdir()] == ["results"]


@dataclass(frozen=True)
class Setting:
    value: float
    origin: str


def test_a_run_record_is_stable_json(tmp_path: Path) -> None:
    record = {"b": np.float64(1.5), "a": [np.int64(2), np.nan, None, True], "c": Setting(0.2, "default")}
    other = {"c": Setting(0.2, "default"), "a": [2, float("nan"), None, True], "b": 1.5}
    write_run_record(tmp_path / "1.json", record)
    write_run_record(tmp_path / "2.json", other)
    assert (tmp_path / "1.json").read_bytes() == (tmp_path / "2.json").read_bytes()
    read = json.loads((tmp_path / "1.json").read_text())
    assert read.pop("siting_run_record") == 1
    assert read == {"a": [2, None, None, True], "b": 1.5, "c": {"value": 0.2, "origin": "default"}}


def test_a_run_record_names_no_folder_and_no_user(tmp_path: Path) -> None:
    record = {
        "dem": PurePosixPath("/home/amina/dem.tif"),
        "rain": "/home/amina/rain.csv",
        "soil": r"C:\Users\amina\soil.gpkg",
        "cover": PurePosixPath("maps/cover.tif"),
        "sentence": "the soil is deep / the slope is small",
        "day": datetime.date(2001, 2, 3),
        "sown": np.array(["2001-11-02", "NaT"], dtype="datetime64[D]"),
    }
    write_run_record(tmp_path / "run.json", record)
    text = (tmp_path / "run.json").read_text()
    assert "amina" not in text
    assert json.loads(text) == {
        "siting_run_record": 1,
        "dem": "dem.tif",
        "rain": "rain.csv",
        "soil": "soil.gpkg",
        "cover": "maps/cover.tif",
        "sentence": "the soil is deep / the slope is small",
        "day": "2001-02-03",
        "sown": ["2001-11-02", None],
    }


def test_what_json_cannot_hold_is_refused_with_its_place(tmp_path: Path) -> None:
    with pytest.raises(OutputError, match=r"record\.stages\[1\]\.seconds is inf"):
        write_run_record(tmp_path / "run.json", {"stages": [{}, {"seconds": float("inf")}]})
    with pytest.raises(OutputError, match=r"record\.thing is a set"):
        write_run_record(tmp_path / "run.json", {"thing": {1}})


def test_hashes_cover_every_file_but_the_record(tmp_path: Path) -> None:
    # FIPS 180-2, appendix B.1: SHA-256 of "abc"
    published = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    (tmp_path / "rasters").mkdir()
    (tmp_path / "rasters" / "b.tif").write_bytes(b"abc")
    (tmp_path / "a.gpkg").write_bytes(b"")
    write_run_record(tmp_path / "run.json", {})
    assert sha256(tmp_path / "rasters" / "b.tif") == published
    assert list(file_hashes(tmp_path)) == ["a.gpkg", "rasters/b.tif"]
    assert file_hashes(tmp_path)["a.gpkg"] == hashlib.sha256(b"").hexdigest()


def test_what_a_killed_run_left_half_written_is_taken_away_and_that_of_a_living_one_stays(tmp_path: Path) -> None:
    script = (
        "import os, sys; from pathlib import Path; from siting.outputs import StagedFolder\n"
        "with StagedFolder(Path(sys.argv[1])) as folder:\n"
        "    (folder / 'half').write_text('x'); os.kill(os.getpid(), 9)\n"
    )
    subprocess.run([sys.executable, "-c", script, str(tmp_path / "results")], check=False)
    assert len(list(tmp_path.glob(".results.*.partial"))) == 1
    with StagedFolder(tmp_path / "results") as alive:
        with StagedFolder(tmp_path / "results") as folder:
            assert sorted(tmp_path.glob(".results.*.partial")) == sorted([alive, folder])
            (folder / "run.json").write_text('{"siting_run_record": 1}')
        with pytest.raises(OutputError):
            StagedFolder(tmp_path / "results").__enter__()
        shutil.rmtree(tmp_path / "results")
    assert not list(tmp_path.glob(".results.*.partial"))
