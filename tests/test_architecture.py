"""The house: import levels, public names, constants in one place."""

from __future__ import annotations

import ast
import re
import subprocess
import sys
import tomllib
from importlib import import_module
from pathlib import Path

import pytest

import latticefit
from latticefit import functions, models
from latticefit.cli import COMMANDS
from latticefit.later import LATER_COMMANDS, LATER_KEYS, LATER_OPTIONS
from latticefit.reading.settings import MODEL, REPORT, RUN, SAMPLE

PACKAGE = Path(latticefit.__file__).parent

LEVELS = {
    "errors": 0,
    "later": 0,
    "lazy": 0,
    "wording": 0,
    "constants": 0,
    "records": 0,
    "_version": 0,
    "units": 1,
    "rounding": 1,
    "exclusion": 1,
    "sample": 2,  # reads units
    "functions": 2,
    "terms": 3,
    "models": 4,
    "reading": 5,
    "preparing": 5,
    "fitting": 6,
    "diagnosing": 7,
    "comparing": 8,
    "deriving": 9,
    "report": 10,
    "held": 11,
    "notebook": 11,
    "analysis": 12,
    "calls": 13,
    "batch": 13,
    "cli": 14,
    "__main__": 15,
    "": 16,  # the package itself, which only re-exports
}
MODULES = sorted(PACKAGE.rglob("*.py"))


def room(module: Path) -> str:
    """The first part of a module's path below the package: the room it stands in."""
    parts = module.relative_to(PACKAGE).with_suffix("").parts
    return "" if parts == ("__init__",) else parts[0]


def imported_rooms(source: str, package: list[str]) -> set[str]:
    """Rooms that a module of `package` imports from, at its top or inside functions; type-checking imports count."""
    found = set()
    for node in ast.walk(ast.parse(source)):
        if isinstance(node, ast.ImportFrom):
            base = package[: len(package) - node.level + 1] if node.level else []
            full = [*base, *(node.module or "").split(".")] if node.module else base
            targets = [[*full, alias.name] for alias in node.names] if len(full) == 1 else [full]
        elif isinstance(node, ast.Import):
            targets = [alias.name.split(".") for alias in node.names]
        else:
            continue
        found |= {each[1] for each in targets if each[0] == "latticefit" and len(each) > 1 and each[1] in LEVELS}
    return found


def rooms_of(module: Path) -> set[str]:
    return imported_rooms(module.read_text(encoding="utf-8"), ["latticefit", *module.relative_to(PACKAGE).parent.parts])


@pytest.mark.parametrize("module", MODULES, ids=lambda m: str(m.relative_to(PACKAGE)))
def test_modules_import_only_lower_levels(module: Path) -> None:
    """A module imports from lower levels and its own room only; data flows one way."""
    own = room(module)
    assert own in LEVELS, f"{own} has no level: add it to the map here and in DEVELOPERS.md"
    for other in rooms_of(module) - {own}:
        assert LEVELS[other] < LEVELS[own], f"{own} (level {LEVELS[own]}) imports {other} (level {LEVELS[other]})"


@pytest.mark.parametrize(
    "source",
    [
        "from ..report import text",
        "from ..report.text import text_report",
        "from .. import report",
        "from latticefit.report import text",
        "from latticefit import report",
        "import latticefit.report.text",
        "def late():\n    from ..report import text",
    ],
)
def test_the_level_check_sees_an_upward_import(source: str) -> None:
    """The check above can fail: every spelling of an import is found, also inside a function."""
    assert imported_rooms(source, ["latticefit", "terms"]) == {"report"}


def test_public_names_of_the_package() -> None:
    """The public surface is exactly this."""
    assert set(latticefit.__all__) == {
        "Fit",
        "FitError",
        "InputError",
        "LatticefitError",
        "Measurement",
        "Saved",
        "__version__",
        "fit",
        "functions",
        "load",
        "models",
        "rank",
        "read",
        "write_measurement",
    }
    for name in latticefit.__all__:
        assert getattr(latticefit, name) is not None


def test_public_names_of_functions_and_models() -> None:
    """The contract's special functions and lmfit models are there under their names."""
    for kind in ("debye", "einstein"):
        for quantity in ("heat_capacity", "energy", "entropy", "helmholtz"):
            assert callable(getattr(functions, f"{kind}_{quantity}"))
    assert {name for name in ("DebyeModel", "EinsteinModel", "ElectronicModel") if hasattr(models, name)} == {
        "DebyeModel",
        "EinsteinModel",
        "ElectronicModel",
    }


def test_the_gas_constant_stands_in_one_file() -> None:
    """No literal gas constant, Boltzmann constant or calorie outside constants.py."""
    literal = re.compile(r"\b8\.314\d*|1\.380649|6\.02214|\b4\.184\b(?! J)")
    for module in MODULES:
        if module.name in ("constants.py", "units.py"):
            continue
        code = "\n".join(
            line.split("#")[0] for line in module.read_text(encoding="utf-8").splitlines() if '"""' not in line
        )
        assert not literal.search(code), module


def test_every_library_that_is_imported_is_declared() -> None:
    """What latticefit imports by name stands in pyproject.toml, also where another library would bring it along."""
    project = tomllib.loads((PACKAGE.parent / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    declared = [*project["dependencies"], *project["optional-dependencies"]["spreadsheet"]]
    known = {re.split(r"[<>=]", each)[0].replace("-", "_") for each in declared}
    imported = set()
    for module in MODULES:
        for node in ast.walk(ast.parse(module.read_text(encoding="utf-8"))):
            if isinstance(node, ast.ImportFrom) and node.level == 0 and node.module:
                imported.add(node.module.split(".")[0])
            elif isinstance(node, ast.Import):
                imported |= {alias.name.split(".")[0] for alias in node.names}
    assert imported - set(sys.stdlib_module_names) - {"latticefit"} == known


def test_text_is_made_harmless_in_one_place() -> None:
    """One function decides which characters may act on a terminal."""
    defining = [module for module in MODULES if "unicodedata.category(" in module.read_text(encoding="utf-8")]
    assert [module.name for module in defining] == ["wording.py"]


def test_words_of_later_versions_are_not_words_of_this_one() -> None:
    """Nothing that exists is refused as not yet built."""
    assert not LATER_COMMANDS & set(COMMANDS)
    for name, keys in {"sample": SAMPLE, "run": RUN, "model": MODEL, "report": REPORT}.items():
        assert not LATER_KEYS[name] & set(keys)
    for name in COMMANDS:
        parser = import_module(f"latticefit.cli.{name}").parser()
        assert not LATER_OPTIONS & {option for action in parser._actions for option in action.option_strings}


def test_help_needs_nothing_heavy() -> None:
    """``latticefit --help`` imports neither numpy nor scipy nor lmfit, so it answers at once."""
    code = (
        "import sys; from latticefit.cli import main; main(['--help']); main(['--version']);"
        "heavy = {'numpy', 'scipy', 'pandas', 'matplotlib', 'lmfit', 'pint'} & set(sys.modules); sys.exit(bool(heavy))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    assert "commands:" in done.stdout


def test_modules_and_functions_stay_small() -> None:
    """Modules have at most 400 lines, functions at most 40 with their docstring left out."""
    for module in MODULES:
        source = module.read_text(encoding="utf-8")
        assert source.count("\n") <= 400, module
        for node in ast.walk(ast.parse(source)):
            if isinstance(node, (ast.FunctionDef, ast.AsyncFunctionDef)):
                first = node.body[1] if ast.get_docstring(node) and len(node.body) > 1 else node.body[0]
                assert (node.end_lineno or 0) - first.lineno + 1 <= 40, f"{module}: {node.name}"
