"""The order of the stages, in one readable function."""

from __future__ import annotations

import platform
from collections.abc import Callable, Iterable
from dataclasses import replace
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

from ._version import __version__
from .comparing import compare
from .deriving import derive
from .diagnosing import diagnose, examine_prepared_level
from .errors import InputError
from .held import resolve_held
from .preparing import prepare
from .reading import parse_grid
from .records import (
    Analysis,
    Comparison,
    LevelFinding,
    Measurement,
    NamedWarning,
    PreparedData,
    Provenance,
    Sheet,
)

__all__ = ["analyse", "ranked"]

_PACKAGES = ("numpy", "scipy", "lmfit", "matplotlib", "pandas", "pint", "periodictable")
_GRAVITY = {"stop": 0, "warn": 1, "note": 2}


def analyse(
    sheet: Sheet,
    measurement: Measurement,
    command: str = "",
    progress: Callable[[str], None] | None = None,
    base: Path | None = None,
) -> Analysis:
    """Prepare, fit, diagnose and derive: everything between reading and the report.

    Parameters
    ----------
    sheet : Sheet
        The whole request; its runs have been read into `measurement`.
    measurement : Measurement
        The analysis holds it with its repeats averaged where a run asks for it.
    command : str
        What was typed, for the provenance.
    progress : callable, optional
        Called with a few words as each stage begins.
    base : Path, optional
        Folder that the path of a saved result in the sheet starts from; the current one by default.

    Raises
    ------
    InputError
        For data or a request that cannot be fitted, a heat capacity whose level is impossible among them unless the
        sample says `accept_level`.
    """
    tell = progress or (lambda words: None)
    settings, held = resolve_held(sheet.model, base or Path(), measurement.quantity)
    prepared = prepare(measurement)
    level = _possible_level(prepared)
    compared = compare(prepared, settings, sheet.report.random_seed, held, tell)
    diagnosis = diagnose(prepared, compared.fit, level)
    tell("deriving thermodynamic functions")
    grid = parse_grid(sheet.report.grid) if sheet.report.grid else None
    derived = derive(prepared, compared.fit, diagnosis.describes, grid)
    return Analysis(
        sheet=replace(sheet, model=replace(sheet.model, fix_from=settings.fix_from)),
        measurement=prepared.measurement,
        prepared=prepared,
        fit=compared.fit,
        diagnosis=diagnosis,
        derived=derived,
        warnings=_gravest_first((*diagnosis.warnings, *derived.warnings)),
        comparison=compared.comparison,
        provenance=_provenance(sheet.report.random_seed, command),
        level=level,
    )


def ranked(
    sheet: Sheet,
    measurement: Measurement,
    progress: Callable[[str], None] | None = None,
    base: Path | None = None,
) -> Comparison:
    """Compare the candidates of the ladder; parameters as `analyse`."""
    settings, held = resolve_held(replace(sheet.model, terms=None), base or Path(), measurement.quantity)
    prepared = prepare(measurement)
    _possible_level(prepared)
    return compare(prepared, settings, sheet.report.random_seed, held, progress).comparison


def _possible_level(prepared: PreparedData) -> LevelFinding:
    """What is found of the level of the points; refused where it is impossible and was not accepted (InputError)."""
    level = examine_prepared_level(prepared)
    if level.verdict == "impossible" and not prepared.measurement.sample_settings.accept_level:
        raise InputError(f"{level.sentence}; or give --accept-level to fit the data as they are")
    return level


def _gravest_first(warnings: Iterable[NamedWarning]) -> tuple[NamedWarning, ...]:
    return tuple(sorted(warnings, key=lambda each: _GRAVITY[each.level]))


def _provenance(seed: int, command: str) -> Provenance:
    packages = {"python": platform.python_version()}
    for name in _PACKAGES:
        try:
            packages[name] = version(name)
        except PackageNotFoundError:
            packages[name] = "unknown"
    created = datetime.now(UTC).replace(microsecond=0).isoformat()
    return Provenance(version=__version__, created=created, random_seed=seed, packages=packages, command=command)
