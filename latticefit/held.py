"""What is held with an uncertainty: fixed parameters with u, and the lattice of a saved result."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np

from .deriving import stated_covariance
from .errors import InputError
from .models import build_model
from .records import HeldParameters, ModelSettings, Quantity, SavedResult
from .report.saved import read_result

__all__ = ["resolve_held"]


def resolve_held(
    settings: ModelSettings, base: Path, quantity: Quantity = "Cp"
) -> tuple[ModelSettings, HeldParameters | None]:
    """Turn `fix_from` and `fix_u` into fixed values and their covariance.

    Parameters
    ----------
    settings : ModelSettings
    base : Path
        Folder that a relative `fix_from` starts from.
    quantity : {"Cp", "Cv"}
        Of the data: the Cp-Cv of a saved result is held too, unless the data are Cv or another form is named.

    Returns
    -------
    ModelSettings
        With the saved lattice among the fixed values, its form of Cp-Cv taken over where none is named, and
        `fix_from` as an absolute path.
    HeldParameters or None
        None where nothing fixed has an uncertainty.

    Raises
    ------
    InputError
        When the saved result cannot be read or is not to be relied on, or a u is given for a parameter that is not
        fixed.
    """
    names: list[str] = []
    blocks: list[np.ndarray] = []
    resolved = settings
    if settings.fix_from is not None:
        path = (base / settings.fix_from).resolve()
        path = path / "result.json" if path.is_dir() else path
        saved = read_result(path)
        wanted = settings.cp_cv or ("none" if quantity == "Cv" else saved.fit.cp_cv)
        lattice, positions = _lattice(saved, with_cp_cv=wanted == saved.fit.cp_cv)
        _refuse_unreliable(saved, positions, settings.fix_from)
        twice = sorted(set(lattice) & {*settings.fix, *settings.start, *settings.bounds})
        if twice:
            raise InputError(f"{twice[0]} is held by the saved result and is also named; give one or the other")
        values = {name: float(saved.fit.values[i]) for name, i in zip(lattice, positions, strict=True)}
        resolved = replace(
            settings,
            fix={**values, **settings.fix},
            fix_from=str(path),
            cp_cv=wanted,
        )
        names += lattice
        blocks.append(stated_covariance(saved.fit)[np.ix_(positions, positions)])
    for name, u in settings.fix_u.items():
        if name not in settings.fix:
            raise InputError(f"a standard uncertainty is given for {name}, which is not fixed; fix it, or leave u out")
        names.append(name)
        blocks.append(np.array([[u * u]]))
    if not names:
        return resolved, None
    return resolved, HeldParameters(tuple(names), _block_diagonal(blocks))


def _lattice(saved: SavedResult, with_cp_cv: bool) -> tuple[list[str], list[int]]:
    """Names and positions of what belongs to the lattice of a saved result: its terms, and its Cp-Cv where wanted."""
    model = build_model(saved.fit.terms, saved.fit.cp_cv)
    inside = [i for each in model.placed if each.term.lattice for i in range(each.slice.start, each.slice.stop)]
    if with_cp_cv and model.cp_cv.parameter is not None:
        inside.append(len(model.names) - 1)
    return [model.names[i] for i in inside], inside


def _refuse_unreliable(saved: SavedResult, positions: list[int], shown: str) -> None:
    """A lattice is known only where its own fit describes its data and determines it."""
    lost = [
        each.name
        for i in positions
        for each in [saved.fit.parameters[i]]
        if each.status in ("undetermined", "at_bound") or each.u is None
    ]
    if not saved.fit.converged:
        raise InputError(f"{shown!r} holds a fit that did not converge; its lattice cannot be held as known")
    if not saved.describes:
        raise InputError(f"the model of {shown!r} does not describe its own data; its lattice cannot be held as known")
    if lost:
        raise InputError(f"{lost[0]} of {shown!r} is not determined there; its lattice cannot be held as known")


def _block_diagonal(blocks: list[np.ndarray]) -> np.ndarray:
    size = sum(len(each) for each in blocks)
    matrix = np.zeros((size, size))
    at = 0
    for each in blocks:
        matrix[at : at + len(each), at : at + len(each)] = each
        at += len(each)
    return matrix
