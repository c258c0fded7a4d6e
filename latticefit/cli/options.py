"""Options that commands share, and what they become: the settings of a run sheet."""

from __future__ import annotations

import argparse
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import InputError, nearest
from .parsing import CommandParser

if TYPE_CHECKING:
    from ..records import ModelSettings, ReportSettings, RunSettings, SampleSettings

__all__ = [
    "add_column_options",
    "add_model_options",
    "add_point_options",
    "add_report_options",
    "add_sample_options",
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
    group.add_argument("--mass", metavar="'VALUE UNIT'", help="sample mass for data in J/K, e.g. '12.3 mg'")
    group.add_argument(
        "--melting-point", metavar="'VALUE UNIT'", help="fixes the Nernst-Lindemann coefficient, e.g. '1358 K'"
    )


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
        help="a column, or '0.5%%', '0.02 mJ/(mol K) + 0.3%%', '1%% below 100 K, 0.3%% above', '1 J/(mol K)'",
    )
    group.add_argument("--coverage-factor", metavar="K", help="k of the stated uncertainties, where they are U")


def add_point_options(parser: CommandParser) -> None:
    """Options that choose points."""
    group = parser.add_argument_group("points")
    group.add_argument(
        "--window", metavar="LOW:HIGH", action="append", default=[], help="fit only this range in K (repeatable)"
    )
    group.add_argument(
        "--mask", metavar="LOW:HIGH", action="append", default=[], help="leave this range in K out (repeatable)"
    )


def add_model_options(parser: CommandParser) -> None:
    """Options that describe the model."""
    group = parser.add_argument_group("model")
    group.add_argument("--terms", metavar="EXPRESSION", help="e.g. 'debye + 2 einstein + electronic'")
    group.add_argument(
        "--mode-sum", metavar="fixed|free", help="modes held at 3 per atom (when atoms are known) or free"
    )
    group.add_argument(
        "--cp-cv", metavar="FORM", default="none", help="none, nernst-lindemann or anharmonic (default: none)"
    )
    for name, shape, words in (
        ("start", "NAME=VALUE", "start value"),
        ("fix", "NAME=VALUE", "hold a parameter"),
        ("bounds", "NAME=LOW:HIGH", "bounds of a parameter"),
    ):
        group.add_argument(
            f"--{name}", metavar=shape, action="append", default=[], help=f"{words}, SI units (repeatable)"
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


def _choice(value: str | None, option: str, choices: tuple[str, ...]) -> Any:
    if value is not None and value not in choices:
        raise InputError(f"{option} cannot be {value!r}; {nearest(value, choices)}")
    return value


def _number(value: str | None, option: str, positive: bool = True) -> float | None:
    if value is None:
        return None
    try:
        number = float(value)
    except ValueError:
        number = float("nan")
    if not number < float("inf") or (positive and number <= 0):
        raise InputError(f"{option} needs a number{' above 0' if positive else ''}, not {value!r}")
    return number


def _column(value: str | None) -> str | int | None:
    """A header as text; digits alone are a column number, counted from 1."""
    return int(value) if value is not None and value.isascii() and value.isdigit() and int(value) > 0 else value


def sample_settings(arguments: argparse.Namespace) -> SampleSettings:
    """Return the `[sample]` table of the options."""
    from ..records import SampleSettings

    return SampleSettings(
        name=arguments.name,
        formula=arguments.formula,
        atoms=_number(arguments.atoms, "--atoms"),
        molar_mass=arguments.molar_mass,
        mass=arguments.mass,
        melting_point=arguments.melting_point,
    )


def run_settings(arguments: argparse.Namespace, file: str) -> RunSettings:
    """Return the `[[run]]` table of the options for one file."""
    from ..reading import parse_interval
    from ..records import RunSettings

    return RunSettings(
        file=file,
        quantity=_choice(arguments.quantity, "--quantity", ("Cp", "Cv")),
        temperature=_column(arguments.temperature),
        heat_capacity=_column(arguments.heat_capacity),
        sigma=_column(arguments.sigma),
        coverage_factor=_number(arguments.coverage_factor, "--coverage-factor"),
        temperature_unit=arguments.temperature_unit,
        heat_capacity_unit=arguments.heat_capacity_unit,
        window=tuple(parse_interval(text) for text in getattr(arguments, "window", [])),
        mask=tuple(parse_interval(text) for text in getattr(arguments, "mask", [])),
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
    from ..models import cp_cv_form
    from ..reading import parse_assignment, parse_bounds
    from ..records import ModelSettings

    return ModelSettings(
        terms=arguments.terms,
        mode_sum=_choice(arguments.mode_sum, "--mode-sum", ("fixed", "free")),
        cp_cv=cp_cv_form(arguments.cp_cv).name,
        start=_by_name(arguments.start, "--start", parse_assignment),
        fix=_by_name(arguments.fix, "--fix", parse_assignment),
        bounds=_by_name(arguments.bounds, "--bounds", parse_bounds),
    )


def report_settings(arguments: argparse.Namespace, before: ReportSettings | None = None) -> ReportSettings:
    """Return the `[report]` table: the options, over what a sheet says."""
    from dataclasses import replace

    from ..reading import parse_grid
    from ..records import ReportSettings

    settings = before or ReportSettings()
    if arguments.grid is not None:
        parse_grid(arguments.grid)
        settings = replace(settings, grid=arguments.grid)
    if arguments.figures is not None:
        settings = replace(settings, figures=_choice(arguments.figures, "--figures", ("none", "svg", "png", "all")))
    if arguments.random_seed is not None:
        if not (arguments.random_seed.isascii() and arguments.random_seed.isdigit()):
            raise InputError(f"--random-seed needs a whole number from 0 on, not {arguments.random_seed!r}")
        settings = replace(settings, random_seed=int(arguments.random_seed))
    return settings


_WITH_A_SHEET = {"files", "grid", "out", "replace", "figures", "random_seed", "json", "quiet", "allow_outside"}


def given_options(arguments: argparse.Namespace, parser: CommandParser) -> list[str]:
    """Options given on the command line that belong into a run sheet rather than beside one."""
    return [
        f"--{name.replace('_', '-')}"
        for name, value in vars(arguments).items()
        if name not in _WITH_A_SHEET and value != parser.get_default(name)
    ]
