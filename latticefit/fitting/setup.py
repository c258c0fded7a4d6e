"""From what the user holds by name to a parametrisation of the model."""

from __future__ import annotations

from math import isfinite

import numpy as np

from ..errors import InputError, nearest
from ..models import Model, Parametrisation
from ..records import FloatArray, ModelSettings, Sample

__all__ = ["check_names", "default_mode_sum", "parametrise"]

_MODES_PER_ATOM = 3
_EXCESS = 2.0  # times the measured heat capacity that a held term alone may give
_COLDEST_THETA = 0.3  # below this times the lowest point a term is a constant and its theta without meaning


def default_mode_sum(settings: ModelSettings, sample: Sample) -> str:
    """``"fixed"`` when the atoms per formula unit are known, unless the user said otherwise; else ``"free"``."""
    return settings.mode_sum or ("free" if sample.atoms is None else "fixed")


def check_names(model: Model, settings: ModelSettings) -> None:
    """Refuse start, fix and bounds of parameters that the model does not have (InputError, the nearest offered)."""
    for what, given in (("start", settings.start), ("fix", settings.fix), ("bounds", settings.bounds)):
        for name in given:
            if name not in model.names:
                raise InputError(
                    f"{what} names {name!r}, which the model {model.expression!r} does not have; "
                    f"{nearest(name, model.names)}"
                )


def _bounds(
    model: Model, settings: ModelSettings, coldest: float, hottest: float, largest: float, atoms: float | None
) -> tuple[FloatArray, FloatArray]:
    lowest = _COLDEST_THETA * coldest
    low = np.array([max(spec.low, lowest) if spec.role == "scale" else spec.low for spec in model.specs])
    high = np.array([spec.high for spec in model.specs])
    if model.cp_cv.largest_coefficient is not None:
        limit = largest if atoms is None else max(largest, _MODES_PER_ATOM * atoms * 8.5)
        high[-1] = model.cp_cv.largest_coefficient(hottest, limit)
    for name, (lower, upper) in settings.bounds.items():
        i = model.index(name)
        if not lower < upper:
            raise InputError(f"bounds of {name}: the lower one ({lower:g}) must be below the upper one ({upper:g})")
        if upper <= low[i] or lower >= high[i]:
            raise InputError(
                f"bounds of {name}: {lower:g} to {upper:g} {model.specs[i].unit} lies outside the range "
                f"{low[i]:.4g} to {high[i]:.4g} that the parameter can have"
            )
        low[i], high[i] = max(low[i], lower), min(high[i], upper)
    return low, high


def _held(model: Model, settings: ModelSettings, sample: Sample) -> dict[str, float]:
    held = dict(settings.fix)
    name = model.names[-1]
    named = {*settings.start, *settings.fix, *settings.bounds}
    rule = model.cp_cv.from_melting_point
    if rule is not None and sample.melting_point is not None and name not in named:
        if sample.atoms is None:
            raise InputError(
                f"a melting point fixes {name} only when the atoms per formula unit are known; give the formula or the "
                "number of atoms"
            )
        held[name] = rule(sample.atoms, sample.melting_point)
    return held


def _tied(model: Model, settings: ModelSettings, held: dict[str, float], total: float) -> int | None:
    """The mode count that follows from the sum: the first one that the user does not name, else the first not held."""
    loose = [i for i in model.modes if model.names[i] not in held]
    if not loose:
        given = sum(held[model.names[i]] for i in model.modes)
        if abs(given - total) > 1e-6 * total:
            raise InputError(
                f"the fixed mode counts add up to {given:g}, but the mode sum is fixed at {total:g} (3 per atom); "
                "leave one of them out or use the free mode sum"
            )
        return None
    unnamed = [i for i in loose if model.names[i] not in {*settings.start, *settings.bounds}]
    return (unnamed or loose)[0]


def parametrise(
    model: Model, settings: ModelSettings, sample: Sample, T: FloatArray, measured: FloatArray
) -> Parametrisation:
    """Return which parameters are free, held or tied, and their bounds.

    Parameters
    ----------
    model : Model
    settings : ModelSettings
        `mode_sum`, `fix`, `bounds` and the names in `start`.
    sample : Sample
        Atoms per formula unit for the mode sum; a melting point holds the coefficient of Cp - Cv.
    T, measured : ndarray, shape (n,)
        K and J/(mol K): the highest point limits Cp - Cv.

    Raises
    ------
    InputError
        For unknown names, values outside their bounds, or a fixed mode sum without a number of atoms.
    """
    check_names(model, settings)
    both = sorted({*settings.fix} & {*settings.start, *settings.bounds})
    if both:
        raise InputError(f"{both[0]} is fixed and also has a start value or bounds; give one or the other")
    fixed_sum = default_mode_sum(settings, sample) == "fixed"
    if fixed_sum and sample.atoms is None:
        raise InputError("a fixed mode sum needs the atoms per formula unit; give the formula or the number of atoms")
    low, high = _bounds(model, settings, float(T.min()), float(T.max()), float(measured.max()), sample.atoms)
    held = _held(model, settings, sample)
    base = np.full(len(model.names), np.nan)
    for kind, given in (("fixed", held), ("start", dict(settings.start))):
        for name, value in given.items():
            i = model.index(name)
            if not low[i] <= value <= high[i]:
                if name not in settings.fix and kind == "fixed":
                    raise InputError(
                        f"the melting point {sample.melting_point:g} K would hold {name} at {value:.3g} "
                        f"{model.specs[i].unit}, beyond what Cp-Cv can be for these data ({high[i]:.3g}); check it"
                    )
                raise InputError(
                    f"{kind} value of {name}: {value:g} {model.specs[i].unit} lies outside "
                    f"{low[i]:.4g} to {high[i]:.4g}"
                )
    if all(held.get(model.names[i]) == 0 for i in model.modes):
        raise InputError("every mode count is fixed at 0, so there is no lattice left; free one of them")
    total = _MODES_PER_ATOM * sample.atoms if fixed_sum and sample.atoms is not None else 0.0
    tied = _tied(model, settings, held, total) if fixed_sum else None
    for name, value in held.items():
        base[model.index(name)] = value
    _check_level(model, {**{n: b[0] for n, b in settings.bounds.items()}, **held}, T, measured)
    if tied is not None:
        _check_room(model, held, low, high, total)
        for i in model.modes:
            high[i] = min(high[i], total)
    free = [i for i, name in enumerate(model.names) if name not in held and i != tied]
    return Parametrisation(model, base, np.array(free, dtype=np.intp), tied, total, low, high)


def _check_level(model: Model, least: dict[str, float], T: FloatArray, measured: FloatArray) -> None:
    """Refuse a held value that alone gives more than was measured: most often milli for one."""
    for each in model.placed:
        names = model.names[each.slice]
        if each.term.lattice or not all(name in least and isfinite(least[name]) for name in names):
            continue
        ratio = each.term.heat_capacity(T, *(least[name] for name in names)) / measured
        if ratio.max() > _EXCESS:
            worst = int(ratio.argmax())
            listed = ", ".join(f"{name} = {least[name]:g} {model.specs[model.index(name)].unit}" for name in names)
            raise InputError(
                f"{listed} alone gives {ratio[worst]:.3g} times the heat capacity measured at {T[worst]:.4g} K; values "
                "are in SI units, so 4.1 mJ/(mol K^2) is 0.0041"
            )


def _check_room(model: Model, held: dict[str, float], low: FloatArray, high: FloatArray, total: float) -> None:
    """Refuse mode counts that cannot add up to the sum."""
    least = sum(held.get(model.names[i], low[i]) for i in model.modes)
    most = sum(held.get(model.names[i], high[i]) for i in model.modes)
    taken = sum(held.get(model.names[i], 0.0) for i in model.modes)
    if taken >= total:
        raise InputError(
            f"the fixed mode counts take {taken:g} of the {total:g} modes (3 per atom) and leave none for the others"
        )
    if not least <= total <= most:
        raise InputError(
            f"the bounds let the mode counts add up to {least:g} to {most:g}, but the mode sum is fixed at {total:g} "
            "(3 per atom); widen them or use the free mode sum"
        )
