"""The request of a command, from a run sheet or from options."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING

from ..errors import InputError
from . import options
from .parsing import CommandParser

if TYPE_CHECKING:
    from ..records import Sheet

__all__ = ["request"]


def _from_sheet(arguments: argparse.Namespace, made: CommandParser) -> tuple[Sheet, Path, Path | None]:
    """The request of a run sheet, the folder its paths start from, and the report folder that was asked for."""
    from dataclasses import replace

    from ..reading import read_sheet

    if len(arguments.files) > 1:
        raise InputError("give one run sheet, or data files, not both; a sheet lists its files in [[run]] tables")
    given = options.given_options(arguments, made)
    if given:
        raise InputError(f"{given[0]} is given beside a run sheet; write it into the sheet {arguments.files[0]!r}")
    path = Path(arguments.files[0])
    sheet = read_sheet(path, arguments.allow_outside)
    out = path.parent / sheet.report.out if sheet.report.out else None
    report = options.report_settings(arguments, sheet.report) if _fits(arguments) else sheet.report
    return replace(sheet, report=report), path.parent, out


def _from_options(arguments: argparse.Namespace) -> tuple[Sheet, Path, Path | None]:
    from ..records import ModelSettings, ReportSettings, Sheet

    if arguments.allow_outside:
        raise InputError("--allow-outside concerns run sheets; files on the command line may lie anywhere")
    runs = tuple(options.run_settings(arguments, file) for file in arguments.files)
    sheet = Sheet(
        options.sample_settings(arguments),
        runs,
        options.model_settings(arguments) if _fits(arguments) else ModelSettings(),
        options.report_settings(arguments) if _fits(arguments) else ReportSettings(),
        options.addenda_settings(arguments),
    )
    return sheet, Path(), None


def _fits(arguments: argparse.Namespace) -> bool:
    """Whether the command has options of model and report; `inspect` has none."""
    return hasattr(arguments, "mode_sum")


def request(arguments: argparse.Namespace, made: CommandParser) -> tuple[Sheet, Path, Path | None]:
    """The request of a command, from a run sheet or from options: sheet, folder its paths start from, report folder."""
    if any(options.is_sheet(file) for file in arguments.files):
        return _from_sheet(arguments, made)
    return _from_options(arguments)
