"""The house keeps its order: declared imports, floors, rooms, and what stands at the top."""

from __future__ import annotations

import ast
import importlib
import re
import subprocess
import sys
import tomllib
from importlib import metadata
from pathlib import Path

import pytest
from packaging.requirements import Requirement
from packaging.version import Version

import gtfs_schematic
from gtfs_schematic.demo.write import demo_files

ROOT = Path(__file__).parent.parent
PACKAGE = ROOT / "gtfs_schematic"
MODULES = sorted(PACKAGE.rglob("*.py"))
PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))
RUNTIME = [Requirement(text) for text in PROJECT["project"]["dependencies"]]
TEST = [Requirement(text) for text in PROJECT["project"]["optional-dependencies"]["test"]]
BENCHMARK = [Requirement(text) for text in PROJECT["project"]["optional-dependencies"]["benchmark"]]

TOP_LEVEL = {
    "README.md",
    "DEVELOPERS.md",
    "LICENSE",
    "pyproject.toml",
    "gtfs_schematic",
    "tests",
    "data",
    "configs",
    ".gitignore",
    ".ci",
}

# Distributions whose modules go by another name than the distribution.
MODULES_OF = {
    "fontpkg-noto-sans": {"fontpkg_noto_sans", "fontpkg"},
    "fonttools": {"fontTools"},
    "import-linter": {"importlinter"},
    "pytest-xdist": {"xdist"},
    "scikit-learn": {"sklearn"},
}


def imported(file: Path) -> set[str]:
    """Give the full names of all modules that a file imports, wherever in it."""
    names = set()
    for node in ast.walk(ast.parse(file.read_text("utf-8"))):
        if isinstance(node, ast.Import):
            names |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{file}: relative import"
            names.add(node.module)
            names |= {f"{node.module}.{alias.name}" for alias in node.names}
    return names


def declared(requirements: list[Requirement]) -> set[str]:
    names = set()
    for requirement in requirements:
        plain = requirement.name.replace("-", "_")
        names |= MODULES_OF.get(requirement.name, {plain})
    return names


def tracked() -> set[str]:
    """Give the top-level names under version control; without git, what is not ignored."""
    listing = subprocess.run(
        ["git", "ls-files", "-z"],  # noqa: S607 - wherever git is
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=False,
    )
    if listing.returncode != 0:
        pytest.skip("not a git checkout, so nobody can tell what belongs to it")
    return {name.split("/")[0] for name in listing.stdout.split("\0") if name}


def test_the_top_level_holds_just_what_it_should():
    assert tracked() == TOP_LEVEL


@pytest.mark.parametrize("file", MODULES, ids=lambda file: str(file.relative_to(PACKAGE)))
def test_every_import_is_declared(file):
    allowed = declared(RUNTIME) | set(sys.stdlib_module_names) | {"gtfs_schematic", "pydantic_core"}
    foreign = {name.split(".")[0] for name in imported(file)} - allowed
    assert not foreign


def test_every_declared_dependency_is_used():
    """What nobody imports has not earned its place; pandas is declared to hold its version."""
    files = [*MODULES, *sorted((ROOT / "tests").rglob("*.py"))]
    used = {name.split(".")[0] for file in files for name in imported(file)}
    for requirement in RUNTIME:
        assert declared([requirement]) & used or requirement.name == "pandas", requirement.name


def test_only_the_entry_points_know_the_command_line():
    for file in MODULES:
        if file.parent.name != "cli" and file.name != "__main__.py":
            above = {name for name in imported(file) if name.startswith("gtfs_schematic.cli")}
            assert not above, file


def test_tests_import_only_what_is_declared():
    allowed = declared(RUNTIME) | declared(TEST) | set(sys.stdlib_module_names)
    own = {file.stem for file in (ROOT / "tests").glob("*.py")}
    scripts = {file.stem for file in (ROOT / "tests" / "benchmarks").glob("*.py")}
    # packaging comes with pytest, which needs it.
    allowed |= own | {"gtfs_schematic", "packaging", "tests"}
    for file in sorted((ROOT / "tests").rglob("*.py")):
        foreign = {name.split(".")[0] for name in imported(file)} - allowed
        if file.parent.name == "benchmarks":
            foreign -= declared(BENCHMARK) | scripts
        assert not foreign, file


@pytest.mark.parametrize("requirement", RUNTIME + TEST, ids=lambda each: each.name)
def test_every_dependency_has_a_floor_that_is_met(requirement):
    floors = [each for each in requirement.specifier if each.operator == ">="]
    assert len(floors) == 1, f"{requirement} declares no floor"
    installed = Version(metadata.version(requirement.name))
    assert Version(floors[0].version) <= installed
    assert requirement.specifier.contains(installed, prereleases=True)


def test_every_dependency_earns_its_place_in_the_developers_page():
    text = (ROOT / "DEVELOPERS.md").read_text("utf-8")
    rows = dict(re.findall(r"^- `([^`]+)`: (.+)$", text, re.MULTILINE))
    names = {requirement.name for requirement in RUNTIME + TEST + BENCHMARK}
    assert names <= set(rows), names - set(rows)


@pytest.mark.parametrize("file", MODULES, ids=lambda file: str(file.relative_to(PACKAGE)))
def test_modules_are_short_and_say_their_job(file):
    text = file.read_text("utf-8")
    assert sum(bool(line.strip()) for line in text.splitlines()) <= 300
    first = (ast.get_docstring(ast.parse(text)) or "").split("\n")[0]
    assert first.endswith("."), "line 1 says the module's job as a sentence"


def test_functions_are_short():
    """Compiled kernels are let by: a call in their inner loop would cost more than it clears up."""
    for file in MODULES:
        for node in ast.walk(ast.parse(file.read_text("utf-8"))):
            compiled = "njit" in "".join(map(ast.dump, getattr(node, "decorator_list", [])))
            if isinstance(node, ast.FunctionDef) and not compiled:
                docstring = ast.get_docstring(node, clean=False) or ""
                body = node.end_lineno - node.lineno + 1 - len(docstring.splitlines())
                assert body <= 50, f"{file.name}: {node.name} has {body} lines"


def test_every_room_has_its_check():
    rooms = {
        "feed",
        "network",
        "layout",
        "bundles",
        "labels",
        "background",
        "drawing",
        "drift",
        "edition",
    }
    for room in sorted(rooms):
        module = importlib.import_module(f"gtfs_schematic.{room}.check")
        assert callable(module.faults)


def test_every_public_name_can_be_had():
    assert sorted(gtfs_schematic.__all__) == sorted(gtfs_schematic._HOME)
    for name in gtfs_schematic.__all__:
        assert getattr(gtfs_schematic, name) is not None
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        gtfs_schematic.nothing  # noqa: B018 - asking is the point


def test_importing_the_package_loads_no_library():
    code = "import gtfs_schematic, sys; print(sorted({m.split('.')[0] for m in sys.modules}))"
    output = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True
    ).stdout
    loaded = set(ast.literal_eval(output))
    assert not loaded & declared(RUNTIME)


def test_the_demo_data_is_what_the_generator_writes():
    files = demo_files()
    kept = {file.name for file in (ROOT / "data").iterdir()}
    assert set(files) <= kept
    assert kept - set(files) <= {"README.md", "demo-diagram.png"}
