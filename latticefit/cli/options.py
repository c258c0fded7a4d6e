"""Options that commands share, and what they become: the settings of a run sheet."""

from __future__ import annotations

import argparse
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import InputError
from .parsing import CommandParser

if TYPE_CHECKING:
    from ..records import AddendaSettings, ModelSettings, ReportSettings, RunSettings, SampleSettings

__all__ = [
    "add_column_options",
    "add_model_options",
    "add_point_options",
    "add_report_options",
    "add_sample_options",
    "addenda_settings",
    "given_options",
    "is_sheet",
    "model_settings",
    "report_settings",
    "run_settings",
    "sample_settings",
]


def is_sheet(path: str) -> bool:
    """Whether a path names a run sheet."""
    return Path(path).suffix.lower() == ".toml"


def add_sample_options(parser: CommandParser) -> None:
    """Options that describe the sample."""
    group = parser.add_argument_group("sample")
    group.add_argument("--formula", metavar="FORMULA", help="chemical formula, e.g. Al2O3, CaSO4*2H2O, Mg0.9Fe0.1O")
    group.add_argument("--name", metavar="TEXT", help="name of the sample in the report")
    group.add_argument("--atoms", metavar="N", help="atoms per formula unit, where there is no formula")
    group.add_argument("--molar-mass", metavar="'VALUE UNIT'", help="e.g. '101.96 g/mol'")
    group.add_argument(
        "--mass", metavar="'VALUE UNIT'", help="sample mass for data in J/K, e.g. '12.3 mg', '12.3(2) mg'"
    )
    group.add_argument("--insulator", action="store_true", help="no conduction electrons: no electronic term")
    group.add_argument(
        "--melting-point", metavar="'VALUE UNIT'", help="fixes the Nernst-Lindemann coefficient, e.g. '1358 K'"
    )
    group.add_argument("--accept-level", action="store_true", help="take a heat capacity whose level looks impossible")


def add_column_options(parser: CommandParser) -> None:
    """Options that say how a file is read."""
    group = parser.add_argument_group("columns and uncertainties (recognised when left out)")
    group.add_argument("--temperature", metavar="COLUMN", help="header or number (from 1) of the temperature column")
    group.add_argument("--heat-capacity", metavar="COLUMN", help="header or number of the heat capacity column")
    group.add_argument("--temperature-unit", metavar="UNIT", help="e.g. K, mK, degC")
    group.add_argument("--heat-capacity-unit", metavar="UNIT", help="e.g. 'J/(mol K)', 'mJ/(g K)', 'uJ/K'")
    group.add_argument("--quantity", metavar="Cp|Cv", help="what was measured; Cp unless a header says Cv")
    group.add_argument(
        "--sigma",
        metavar="COLUMN|TEXT",
        help="a column, or '0.5%%', '0.02 mJ/(mol K) + 0.3%%', '1%% below 100 K, 0.3%% above', '1 J/(mol K)', or "
        "scatter or replicates to estimate it",
    )
    group.add_argument("--coverage-factor", metavar="K", help="k of the stated uncertainties, where they are U")
    group.add_argument("--temperature-scale", metavar="SCALE", help="ITS-90, or IPTS-68 to convert T and Cp from it")
    group.add_argument(
        "--worksheet", metavar="NAME|NUMBER", help="sheet of a spreadsheet file, by name or by number from 1"
    )
    group.add_argument(
        "--split-by",
        metavar="COLUMN",
        help="a column whose values divide the file into runs, or series for the lines 'Series 1'",
    )
    group.add_argument(
        "--addenda",
        metavar="FILE",
        action="append",
        default=[],
        help="heat capacity in J/K of what was measured with the sample, to be taken off (repeatable)",
    )


def add_point_options(parser: CommandParser) -> None:
    """Options that choose points."""
    group = parser.add_argument_group("points")
    group.add_argument(
        "--window", metavar="LOW:HIGH", action="append", default=[], help="fit only this range in K (repeatable)"
    )
    group.add_argument(
        "--mask", metavar="LOW:HIGH", action="append", default=[], help="leave this range in K out (repeatable)"
    )
    group.add_argument(
        "--mask-lines", metavar="FIRST:LAST", action="append", default=[], help="leave these lines out (repeatable)"
    )
    group.add_argument(
        "--require",
        metavar="CONDITION",
        action="append",
        default=[],
        help="fit only lines where a column meets a limit, e.g. 'quality >= 0.9' (repeatable)",
    )
    group.add_argument(
        "--replicates", metavar="keep|average|drop-first", help="what is done with sets of repeats (default: keep)"
    )


def add_model_options(parser: CommandParser, terms: bool = True) -> None:
    """Options that describe the model; without `terms` for a command that compares candidates."""
    group = parser.add_argument_group("model")
    if terms:
        group.add_argument(
            "--terms", metavar="EXPRESSION", help="e.g. 'debye + 2 einstein + electronic'; without, models are compared"
        )
    group.add_argument(
        "--mode-sum", metavar="fixed|free", help="modes held at 3 per atom (when atoms are known) or free"
    )
    group.add_argument(
        "--cp-cv", metavar="FORM", help="none, nernst-lindemann or anharmonic (with --terms: none, unless given)"
    )
    for name, shape, words in (
        ("start", "NAME=VALUE", "start value"),
        ("fix", "NAME=VALUE", "hold a parameter"),
        ("fix-u", "NAME=U", "standard uncertainty of a held parameter"),
        ("bounds", "NAME=LOW:HIGH", "bounds of a parameter"),
    ):
        group.add_argument(
            f"--{name}", metavar=shape, action="append", default=[], help=f"{words}, SI units (repeatable)"
        )
    group.add_argument(
        "--fix-from", metavar="RESULT.json", help="hold the lattice of a saved result, with its uncertainty"
    )


def add_report_options(parser: CommandParser) -> None:
    """Options that say what is written."""
    group = parser.add_argument_group("output")
    group.add_argument("--grid", metavar="TEXT", help="temperatures of the table in K, e.g. '0.5:5:0.5, 10:300:10'")
    group.add_argument(
        "--out", metavar="FOLDER", help="report folder (default: NAME_latticefit, NAME of the first file)"
    )
    group.add_argument("--replace", action="store_true", help="replace an earlier latticefit report there")
    group.add_argument("--figures", metavar="none|svg|png|all", help="figure files to write (default: svg)")
    group.add_argument("--random-seed", metavar="N", help="seed of everything random (default: 0)")
    group.add_argument("--json", action="store_true", help="print the result as JSON; no folder unless --out is given")
    group.add_argument("--quiet", action="store_true", help="no notes and no progress")


def _option(key: str) -> str:
    return f"--{key.replace('_', '-')}"


def _number(text: str | None, key: str) -> float | None:
    """The number in a text, to be checked as a setting."""
    try:
        return None if text is None else float(text)
    except ValueError:
        raise InputError(f"{_option(key)} needs a number, not {text!r}") from None


def _whole(text: str | None) -> int | str | None:
    """The whole number in a text, or the text itself, which the check of the setting refuses."""
    try:
        return int(text) if text is not None and text.isascii() and text.isdigit() else text
    except ValueError:  # thousands of digits
        return text


def sample_settings(arguments: argparse.Namespace) -> SampleSettings:
    """Return the `[sample]` table of the options."""
    from ..reading.settings import SAMPLE, checked
    from ..records import SampleSettings

    given = {key: getattr(arguments, key) for key in SAMPLE}
    given["atoms"] = _number(arguments.atoms, "atoms")
    given["accept_level"] = arguments.accept_level or None
    return SampleSettings(**checked(given, SAMPLE, _option))


def run_settings(arguments: argparse.Namespace, file: str) -> RunSettings:
    """Return the `[[run]]` table of the options for one file."""
    from ..reading.settings import RUN, checked
    from ..records import RunSettings

    given = {key: getattr(arguments, key, None) for key in RUN}
    given = {key: None if value == [] else value for key, value in given.items()}
    given["coverage_factor"] = _number(arguments.coverage_factor, "coverage_factor")
    return RunSettings(file=file, **checked(given, RUN, _option))


def addenda_settings(arguments: argparse.Namespace) -> tuple[AddendaSettings, ...]:
    """Return the `[[addenda]]` tables of the options: files in J/K."""
    from ..reading.settings import ADDENDA, checked
    from ..records import AddendaSettings

    return tuple(
        AddendaSettings(**checked({"file": file}, ADDENDA, lambda key: "--addenda")) for file in arguments.addenda
    )


def _by_name(texts: list[str], option: str, parse: Callable[[str], tuple[str, Any]]) -> dict[str, Any]:
    found: dict[str, Any] = {}
    for text in texts:
        name, value = parse(text)
        if name in found:
            raise InputError(f"{option} names {name!r} twice")
        found[name] = value
    return found


def model_settings(arguments: argparse.Namespace) -> ModelSettings:
    """Return the `[model]` table of the options."""
    from ..reading import parse_assignment, parse_bounds
    from ..reading.settings import MODEL, checked
    from ..records import ModelSettings

    given = {
        "terms": getattr(arguments, "terms", None),
        "mode_sum": arguments.mode_sum,
        "cp_cv": arguments.cp_cv,
        "start": _by_name(arguments.start, "--start", parse_assignment),
        "fix": _by_name(arguments.fix, "--fix", parse_assignment),
        "fix_u": _by_name(arguments.fix_u, "--fix-u", parse_assignment),
        "fix_from": arguments.fix_from,
        "bounds": _by_name(arguments.bounds, "--bounds", parse_bounds),
    }
    return ModelSettings(**checked(given, MODEL, _option))


def report_settings(arguments: argparse.Namespace, before: ReportSettings | None = None) -> ReportSettings:
    """Return the `[report]` table: the options, over what a sheet says."""
    from dataclasses import replace

    from ..reading.settings import REPORT, checked
    from ..records import ReportSettings

    given = {
        "grid": getattr(arguments, "grid", None),
        "figures": getattr(arguments, "figures", None),
        "random_seed": _whole(arguments.random_seed),
    }
    return replace(before or ReportSettings(), **checked(given, REPORT, _option))


_WITH_A_SHEET = {
    *("files", "grid", "out", "replace", "figures", "random_seed", "json", "quiet", "allow_outside", "save_sheet"),
}


def given_options(arguments: argparse.Namespace, parser: CommandParser) -> list[str]:
    """Options given on the command line that belong into a run sheet rather than beside one."""
    return [
        f"--{name.replace('_', '-')}"
        for name, value in vars(arguments).items()
        if name not in _WITH_A_SHEET and value != parser.get_default(name)
    ]
