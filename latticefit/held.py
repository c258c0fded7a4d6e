"""What is held with an uncertainty: fixed parameters with u, and the lattice of a saved result."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np

from .errors import InputError
from .models import build_model
from .records import HeldParameters, ModelSettings, SavedResult
from .report.saved import read_result

__all__ = ["resolve_held"]


def resolve_held(settings: ModelSettings, base: Path) -> tuple[ModelSettings, HeldParameters | None]:
    """Turn `fix_from` and `fix_u` into fixed values and their covariance.

    Parameters
    ----------
    settings : ModelSettings
    base : Path
        Folder that a relative `fix_from` starts from.

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
        When the saved result cannot be read, or a u is given for a parameter that is not fixed.
    """
    names: list[str] = []
    blocks: list[np.ndarray] = []
    resolved = settings
    if settings.fix_from is not None:
        path = (base / settings.fix_from).resolve()
        path = path / "result.json" if path.is_dir() else path
        saved = read_result(path)
        lattice, positions = _lattice(saved)
        twice = sorted(set(lattice) & {*settings.fix, *settings.start, *settings.bounds})
        if twice:
            raise InputError(f"{twice[0]} is held by the saved result and is also named; give one or the other")
        values = {name: float(saved.fit.values[i]) for name, i in zip(lattice, positions, strict=True)}
        resolved = replace(
            settings,
            fix={**values, **settings.fix},
            fix_from=str(path),
            cp_cv=settings.cp_cv or saved.fit.cp_cv,
        )
        names += lattice
        blocks.append(np.asarray(saved.fit.covariance)[np.ix_(positions, positions)])
    for name, u in settings.fix_u.items():
        if name not in settings.fix:
            raise InputError(f"a standard uncertainty is given for {name}, which is not fixed; fix it, or leave u out")
        names.append(name)
        blocks.append(np.array([[u * u]]))
    if not names:
        return resolved, None
    return resolved, HeldParameters(tuple(names), _block_diagonal(blocks))


def _lattice(saved: SavedResult) -> tuple[list[str], list[int]]:
    """Names and positions of what belongs to the lattice of a saved result: its terms and its Cp-Cv."""
    model = build_model(saved.fit.terms, saved.fit.cp_cv)
    outside = {i for each in model.placed if not each.term.lattice for i in range(each.slice.start, each.slice.stop)}
    positions = [i for i in range(len(model.names)) if i not in outside]
    return [model.names[i] for i in positions], positions


def _block_diagonal(blocks: list[np.ndarray]) -> np.ndarray:
    size = sum(len(each) for each in blocks)
    matrix = np.zeros((size, size))
    at = 0
    for each in blocks:
        matrix[at : at + len(each), at : at + len(each)] = each
        at += len(each)
    return matrix
