"""Which columns of a file were not used, and whether a header looks like an uncertainty that was passed over."""

from __future__ import annotations

import re
from collections.abc import Sequence

from ..records import RunSettings
from .columns import find_column
from .conditions import condition_column
from .headers import Column, describe_columns, is_uncertainty_of_anything, normal_name

__all__ = ["looks_like_uncertainty", "unused_columns"]

_SHORT = re.compile(
    r"s|sd|se|sem|rsd|dev|deviation|precision|accuracy|[±δ].*|s ?\(.*\)|(?:s|d|delta) ?\(?c ?,?[pv]?(?: ?,? ?m)?\)?"
)


def unused_columns(
    columns: tuple[Column, ...], data: Sequence[Column], run: RunSettings, shown: str
) -> tuple[str, ...]:
    """Return the headers of the columns that hold no data, meet no condition and divide nothing.

    Parameters
    ----------
    columns, data : sequence of Column
        All columns, and those of temperature, heat capacity and sigma.
    run : RunSettings
        `require` and `split_by` use columns too.
    shown : str
        The file as messages name it.
    """
    used: set[Column | None] = {*data, *(condition_column(text, columns, shown) for text in run.require)}
    if run.split_by is not None:
        used.add(find_column(columns, run.split_by, shown))
    return tuple(column.label for column in columns if column not in used)


def looks_like_uncertainty(header: str) -> bool:
    """Say whether a header may name an uncertainty, be it in a way too loose to take the column for one."""
    column = describe_columns([header])[0]
    return is_uncertainty_of_anything(column) or _SHORT.fullmatch(normal_name(column.name)) is not None
