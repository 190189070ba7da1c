"""Rules of the house that no tool checks by itself."""

from __future__ import annotations

import ast
import importlib.metadata
import inspect
import re
import subprocess
import sys
import tomllib
from collections.abc import Callable, Iterator
from pathlib import Path
from types import ModuleType
from typing import Any

import click
import pytest
from packaging.requirements import Requirement
from packaging.utils import canonicalize_name

from generator import polarity, thermal
from generator.cli import main
from generator.plugin import DatasheetsPlugin

ROOT = Path(__file__).resolve().parent.parent
MODULES = sorted((ROOT / "generator").glob("*.py"))
LONGEST_MODULE = 400  # lines
# The theme is named in mkdocs.yml; of the reference tables only the files are read.
USED_BY_NAME = {"mkdocs-material", "chemicals"}


@pytest.fixture(scope="module")
def pyproject() -> dict[str, Any]:
    return tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))


@pytest.fixture(scope="module")
def tracked() -> list[Path]:
    """The files under version control; in an unpacked archive there is nothing to check."""
    listed = subprocess.run(
        ["git", "ls-files", "-z"], cwd=ROOT, capture_output=True, text=True, check=False
    )
    if listed.returncode:
        pytest.skip("not a git checkout")
    return [ROOT / name for name in listed.stdout.split("\0") if name and (ROOT / name).exists()]


# --- source -------------------------------------------------------------------------------------


@pytest.mark.parametrize("path", MODULES, ids=lambda p: p.name)
def test_modules_are_small(path: Path) -> None:
    assert len(path.read_text(encoding="utf-8").splitlines()) <= LONGEST_MODULE


def _public_functions(module: ModuleType) -> Iterator[tuple[str, Callable[..., Any]]]:
    for name, function in inspect.getmembers(module, inspect.isfunction):
        if not name.startswith("_") and function.__module__ == module.__name__:
            yield name, function


@pytest.mark.parametrize(
    ("name", "function"),
    [
        pytest.param(name, function, id=f"{module.__name__.rpartition('.')[2]}.{name}")
        for module in (polarity, thermal)
        for name, function in _public_functions(module)
    ],
)
def test_formulas_state_the_unit_of_each_parameter(name: str, function: Callable[..., Any]) -> None:
    text = inspect.getdoc(function) or ""
    missing = [
        parameter
        for parameter in inspect.signature(function).parameters
        if not re.search(rf"``{parameter}`` \[[^\]]+\]", text)
    ]
    assert not missing, f"the docstring of {name} does not state the unit of {missing}"


# --- dependencies -------------------------------------------------------------------------------


def _imported() -> set[str]:
    """First names of what the package imports from elsewhere."""
    names: set[str] = set()
    for path in MODULES:
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.Import):
                names.update(alias.name.split(".")[0] for alias in node.names)
            elif isinstance(node, ast.ImportFrom) and node.module and not node.level:
                names.add(node.module.split(".")[0])
    return names - set(sys.stdlib_module_names) - {"generator"}


def test_each_import_is_declared_and_each_dependency_imported(pyproject: dict[str, Any]) -> None:
    declared = {
        canonicalize_name(Requirement(text).name) for text in pyproject["project"]["dependencies"]
    }
    providers = importlib.metadata.packages_distributions()
    imported = {canonicalize_name(providers[name][0]) for name in _imported()}
    assert imported - declared == set(), "imported, but left to chance"
    assert declared - imported - USED_BY_NAME == set(), "declared, but not used"


def _pins() -> dict[str, Requirement]:
    lines = (ROOT / "requirements.lock").read_text(encoding="utf-8").splitlines()
    pins = [Requirement(line) for line in lines if line and not line.startswith("#")]
    return {canonicalize_name(pin.name): pin for pin in pins}


def test_the_environment_is_the_locked_one() -> None:
    wrong = {}
    for name, pin in _pins().items():
        if pin.marker is None or pin.marker.evaluate():
            try:
                version = importlib.metadata.version(name)
            except importlib.metadata.PackageNotFoundError:
                version = "absent"
            if version not in pin.specifier:
                wrong[name] = f"{version}, locked {pin.specifier}"
    assert not wrong, "make test renews the environment: run it instead of pytest alone"


def test_the_lock_names_exact_versions_of_all_that_is_declared(pyproject: dict[str, Any]) -> None:
    pins = _pins()
    assert all(re.fullmatch(r"==[\w.!+]+", str(pin.specifier)) for pin in pins.values())
    groups = (
        pyproject["build-system"]["requires"],
        pyproject["project"]["dependencies"],
        *pyproject["project"]["optional-dependencies"].values(),
    )
    for requirement in (Requirement(text) for group in groups for text in group):
        pin = pins[canonicalize_name(requirement.name)]
        assert str(pin.specifier).removeprefix("==") in requirement.specifier


# --- documentation ------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def documentation() -> str:
    pages = (ROOT / "README.md", ROOT / "DEVELOPERS.md")
    return "\n".join(page.read_text(encoding="utf-8") for page in pages)


def _commands() -> Iterator[tuple[str, click.Command]]:
    for name, command in main.commands.items():
        if isinstance(command, click.Group):
            yield from ((f"{name} {part}", each) for part, each in command.commands.items())
        else:
            yield name, command


@pytest.mark.parametrize("name", [name for name, _ in _commands()])
def test_each_command_is_documented(name: str, documentation: str) -> None:
    assert re.search(rf"`datasheets {name}\b", documentation)


@pytest.mark.parametrize(
    ("command", "option"),
    [
        (name, option)
        for name, command in _commands()
        for parameter in command.params
        if isinstance(parameter, click.Option)
        for option in parameter.opts
        if option.startswith("--") and option != "--help"
    ],
)
def test_each_option_is_documented(command: str, option: str, documentation: str) -> None:
    assert re.search(rf"{option}\b", documentation), f"datasheets {command} {option}"


@pytest.mark.parametrize("setting", [name for name, _ in DatasheetsPlugin.config_scheme])
def test_each_setting_is_documented(setting: str, documentation: str) -> None:
    assert f"`{setting}`" in documentation


@pytest.mark.parametrize("path", MODULES, ids=lambda p: p.name)
def test_each_module_has_its_place_in_the_layout(path: Path) -> None:
    layout = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    assert path.name == "__init__.py" or f"`{path.name}`" in layout


def test_the_documentation_names_only_steps_that_exist(documentation: str) -> None:
    targets = set(re.findall(r"^([a-z]+):", (ROOT / "Makefile").read_text(), flags=re.MULTILINE))
    named = set(re.findall(r"`make ([a-z]+)", documentation))
    assert {"site", "test"} <= named <= targets
    subcommands = set(re.findall(r"`datasheets ([a-z]+)", documentation))
    assert subcommands <= set(main.commands)


@pytest.mark.parametrize("page", ["README.md", "DEVELOPERS.md"])
def test_links_between_our_own_files_lead_somewhere(page: str) -> None:
    text = (ROOT / page).read_text(encoding="utf-8")
    targets = re.findall(r"\]\(([^)#:]+)(?:#[^)]*)?\)", text)
    assert [target for target in targets if not (ROOT / target).exists()] == []


# --- tree ---------------------------------------------------------------------------------------

FOREIGN_PLACES = re.compile(
    # a path of one machine; the address of a package registry
    r"(?:^|[^a-z.\w])/(?:work|tmp|root|home|Users)/"
    r"|https?://[^ ]*(?:pypi|pythonhosted|npmjs|debian)",
    re.IGNORECASE | re.MULTILINE,
)


def test_no_file_names_a_machine_or_a_registry(tracked: list[Path]) -> None:
    found = []
    for path in tracked:
        try:
            text = path.read_text(encoding="utf-8")
        except UnicodeDecodeError:
            continue  # a picture, or a table broken on purpose
        found += [f"{path.relative_to(ROOT)}: {hit[0]}" for hit in FOREIGN_PLACES.finditer(text)]
    assert found == []


def test_nothing_built_or_taken_from_elsewhere_is_committed(tracked: list[Path]) -> None:
    built = re.compile(r"^site/|(^|/)node_modules/|\.min\.(js|css)$|\.(whl|pyc|woff2?|ttf)$")
    names = [path.relative_to(ROOT).as_posix() for path in tracked]
    assert [name for name in names if built.search(name)] == []
