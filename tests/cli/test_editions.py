"""An earlier edition is issued again without anything being lost, and a kill loses nothing."""

from __future__ import annotations

import json
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from gtfs_schematic.cli.main import run
from gtfs_schematic.edition.folder import load_beside, load_edition
from gtfs_schematic.edition.history import editions_in

DATA = Path(__file__).parents[2] / "data"


@pytest.fixture(scope="module")
def archive(tmp_path_factory) -> Path:
    """Three editions: the demo, one with another color, and one with another name."""
    folder = tmp_path_factory.mktemp("archive")
    quick = ["--effort", "quick", "-q"]
    spring, summer, autumn = (str(folder / name) for name in ("spring", "summer", "autumn"))
    assert run(["draw", str(DATA / "before.zip"), "--out", spring, *quick]) == 0
    change = ["--line", "m1", "--color", "#225577"]
    assert run(["adjust", spring, "-q", "--out", summer, *change]) == 0
    change = ["--station", "183", "--name", "Hall"]
    assert run(["adjust", summer, "-q", "--out", autumn, *change]) == 0
    return folder


def content(folder: Path) -> dict[str, bytes]:
    return {str(f.relative_to(folder)): f.read_bytes() for f in folder.rglob("*") if f.is_file()}


def test_going_back_issues_the_earlier_one_again(archive, capsys):
    before = content(archive)
    assert run(["editions", str(archive), "--back-to", "spring", "--as", "winter"]) == 0
    told = capsys.readouterr().out
    assert "Hall" in told
    assert "as after autumn" in told
    after = content(archive)
    assert before.items() <= after.items()
    old, new = (load_edition(archive / name) for name in ("spring", "winter"))
    for name in ("diagram.svg", "diagram.pdf", "state.json", "drift.json"):
        assert after[f"spring/{name}"] == after[f"winter/{name}"]
    assert (old.stations, old.links, old.lines) == (new.stations, new.links, new.lines)
    listed, faults = editions_in(archive)
    assert [each.name for each in listed] == ["spring", "summer", "autumn", "winter"]
    assert [each.previous_name for each in listed] == ["", "spring", "summer", "autumn"]
    assert faults == ()
    sheet = json.loads(after["winter/changes.json"])
    kinds = {(c["subject"], c["kind"], c["id"]) for c in sheet["changes"]}
    assert {("line", "recolored", "m1"), ("station", "renamed", "183")} <= kinds
    assert load_beside(archive / "winter", new).state is not None
    # And back again: going back can be undone like anything else.
    assert run(["editions", str(archive), "--back-to", "autumn", "--as", "spring-2"]) == 0
    assert after.items() <= content(archive).items()
    again = load_edition(archive / "spring-2")
    assert {s.name for s in again.stations} >= {"Hall"}


@pytest.mark.parametrize(
    ("words", "told"),
    [
        (["--back-to", "nowhere", "--as", "x"], "no edition"),
        (["--back-to", "spring"], "go together"),
        (["--as", "x"], "go together"),
        (["--back-to", "spring", "--as", "summer"], "stands there already"),
        (["--back-to", "spring", "--as", "../x"], "name of a folder"),
        (["--back-to", "spring", "--as", ".x"], "name of a folder"),
    ],
)
def test_what_is_wrong_is_told_and_nothing_is_written(archive, capsys, words, told):
    before = content(archive)
    assert run(["editions", str(archive), *words]) == 2
    assert told in capsys.readouterr().err
    assert content(archive) == before


def test_the_latest_needs_no_going_back(archive, capsys):
    last = editions_in(archive)[0][-1].name
    assert run(["editions", str(archive), "--back-to", last, "--as", "x"]) == 2
    assert "latest" in capsys.readouterr().err


_KILLED = """
import os, shutil, signal, sys
from pathlib import Path

from gtfs_schematic.cli.main import run
from gtfs_schematic.edition import folder

original, folder_of_all = folder.write_folder, Path(sys.argv[1])

def content(path):
    found = {}
    for file in path.rglob("*"):
        if file.is_file() and not any(p.startswith(".") for p in file.relative_to(path).parts):
            found[str(file.relative_to(path))] = file.read_bytes()
    return found

def killed(target, files, *, overwrite=False):
    # At each step on the disk a process of its own is killed; what stands is old or new.
    old, target = content(folder_of_all), Path(target)
    new = {k: v for k, v in old.items() if not k.startswith(target.name + "/")}
    new |= {f"{target.name}/{name}": data for name, data in files.items()}
    kept = folder_of_all.with_name("kept")
    shutil.copytree(folder_of_all, kept)
    seen = set()
    for step in [*range(1, 300, 2), 10**6]:
        child = os.fork()
        if child == 0:
            left = [step]
            def watch(event, arguments):
                if event == "open" or event.split(".")[0] in {"os", "shutil", "tempfile", "ctypes"}:
                    left[0] -= 1
                    if left[0] == 0:
                        os.kill(os.getpid(), signal.SIGKILL)
            sys.addaudithook(watch)
            original(target, files, overwrite=overwrite)
            os._exit(0)
        code = os.waitstatus_to_exitcode(os.waitpid(child, 0)[1])
        found = content(folder_of_all)
        assert found in (old, new), sorted(set(found) ^ set(old))
        seen.add((code, "old" if found == old else "new"))
        shutil.rmtree(folder_of_all)
        shutil.copytree(kept, folder_of_all)
        if code == 0:
            break
    assert {(-signal.SIGKILL, "old"), (0, "new")} <= seen, seen
    original(target, files, overwrite=overwrite)

folder.write_folder = killed
sys.exit(run(sys.argv[2:]))
"""


@pytest.mark.parametrize(
    "words",
    [
        ["adjust", "{}/spring", "-q", "--line", "m1", "--color", "#AA2255"],
        ["editions", "{}", "--back-to", "spring", "--as", "killed"],
    ],
)
def test_killed_at_any_step_every_edition_is_whole(archive, tmp_path, words):
    copy = tmp_path / "archive"
    shutil.copytree(archive, copy)
    words = [word.format(copy) for word in words]
    command = [sys.executable, "-c", _KILLED, str(copy), *words]
    done = subprocess.run(command, check=False, capture_output=True, text=True)
    assert done.returncode == 0, done.stderr
