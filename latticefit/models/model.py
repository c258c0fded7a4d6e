"""A lattice model: a sum of terms, seen through one form of Cp - Cv."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from ..constants import DEBYE_CUBIC
from ..records import FloatArray
from ..terms import ParameterSpec, Term, term
from .cp_cv import CpCvForm, cp_cv_form
from .expression import format_expression, parse_expression

__all__ = [
    "Model",
    "PlacedTerm",
    "build_model",
    "components",
    "cp_cv_coefficient",
    "harmonic_heat_capacity",
    "heat_capacity",
    "heat_capacity_and_partials",
    "low_temperature_theta",
    "partials",
    "total_modes",
]


@dataclass(frozen=True)
class PlacedTerm:
    """A term at its place in a model: its name there (``einstein1``) and its slice of the parameter vector."""

    name: str
    term: Term
    slice: slice


@dataclass(frozen=True)
class Model:
    """A sum of terms with one form of Cp - Cv.

    Attributes
    ----------
    expression : str
        In its standard spelling.
    placed : tuple of PlacedTerm
    cp_cv : CpCvForm
    names : tuple of str, length p
        Parameter names: term + quantity, numbered when a kind repeats; the Cp-Cv coefficient stands last.
    specs : tuple of ParameterSpec, length p
    modes : tuple of int
        Positions of the mode counts of lattice terms.
    """

    expression: str
    placed: tuple[PlacedTerm, ...]
    cp_cv: CpCvForm
    names: tuple[str, ...]
    specs: tuple[ParameterSpec, ...]
    modes: tuple[int, ...]

    def index(self, name: str) -> int:
        """Position of a parameter."""
        return self.names.index(name)


def build_model(terms: str, cp_cv: str = "none") -> Model:
    """Return the model of an expression.

    Parameters
    ----------
    terms : str
        Model expression, e.g. ``"debye + 2 einstein"``.
    cp_cv : str
        A form of Cp - Cv, one of `CP_CV_FORMS`.

    Raises
    ------
    InputError
        For an unreadable expression or an unknown term or form.
    """
    counts = parse_expression(terms)
    form = cp_cv_form(cp_cv)
    placed: list[PlacedTerm] = []
    names: list[str] = []
    specs: list[ParameterSpec] = []
    modes: list[int] = []
    for name, count in counts:
        for number in range(1, count + 1):
            each = term(name)
            prefix = name if count == 1 else f"{name}{number}"
            placed.append(PlacedTerm(prefix, each, slice(len(names), len(names) + len(each.parameters))))
            for spec in each.parameters:
                if each.lattice and spec.quantity == "modes":
                    modes.append(len(names))
                names.append(f"{prefix}_{spec.quantity}")
                specs.append(spec)
    if form.parameter is not None:
        names.append(f"{form.name.replace('-', '_')}_{form.parameter.quantity}")
        specs.append(form.parameter)
    return Model(format_expression(counts), tuple(placed), form, tuple(names), tuple(specs), tuple(modes))


def cp_cv_coefficient(model: Model, values: FloatArray) -> float:
    """The coefficient of the Cp - Cv form, which stands last; 0 for the form without one."""
    return 0.0 if model.cp_cv.parameter is None else float(values[-1])


def _sum(model: Model, T: FloatArray, values: FloatArray, lattice: bool) -> FloatArray:
    total = np.zeros_like(T)
    for each in model.placed:
        if each.term.lattice is lattice:
            total = total + each.term.heat_capacity(T, *values[each.slice])
    return total


def harmonic_heat_capacity(model: Model, T: FloatArray, values: FloatArray) -> FloatArray:
    """Heat capacity of the harmonic lattice alone, J/(mol K): no electronic part, no Cp - Cv; shape of T (K)."""
    return _sum(model, T, values, lattice=True)


def heat_capacity(model: Model, T: FloatArray, values: FloatArray) -> FloatArray:
    """Heat capacity of the whole model, J/(mol K), shape of T (K); `values` in the order of ``model.names``."""
    lattice = harmonic_heat_capacity(model, T, values)
    return model.cp_cv.apply(T, lattice, cp_cv_coefficient(model, values)) + _sum(model, T, values, lattice=False)


def heat_capacity_and_partials(model: Model, T: FloatArray, values: FloatArray) -> tuple[FloatArray, FloatArray]:
    """`heat_capacity` and `partials` for little more than the price of the latter, T (K) of shape (n,).

    Every term is homogeneous in its amplitudes, so that their partials hold its heat capacity too.
    """
    columns = np.empty((len(model.names), T.size))
    lattice, other = np.zeros_like(T), np.zeros_like(T)
    for each in model.placed:
        columns[each.slice] = each.term.partials(T, *values[each.slice])
        for i, spec in enumerate(each.term.parameters, start=each.slice.start):
            if spec.role == "amplitude":
                total = lattice if each.term.lattice else other
                total += values[i] * columns[i]
    if model.cp_cv.parameter is None:
        return lattice + other, columns
    coefficient = cp_cv_coefficient(model, values)
    slope, columns[-1] = model.cp_cv.slopes(T, lattice, coefficient)
    for each in model.placed:
        if each.term.lattice:
            columns[each.slice] *= slope
    return model.cp_cv.apply(T, lattice, coefficient) + other, columns


def partials(model: Model, T: FloatArray, values: FloatArray) -> FloatArray:
    """Derivatives of the heat capacity with respect to every parameter; shape (p, n), T (K) of shape (n,)."""
    return heat_capacity_and_partials(model, T, values)[1]


def components(model: Model, T: FloatArray, values: FloatArray) -> Mapping[str, FloatArray]:
    """Heat capacity of each term and of Cp - Cv, J/(mol K), by name; their sum is `heat_capacity`."""
    parts = {each.name: each.term.heat_capacity(T, *values[each.slice]) for each in model.placed}
    if model.cp_cv.parameter is not None:
        lattice = harmonic_heat_capacity(model, T, values)
        parts["cp_minus_cv"] = model.cp_cv.apply(T, lattice, cp_cv_coefficient(model, values)) - lattice
    return parts


def total_modes(model: Model, values: FloatArray) -> float:
    """Modes of all lattice terms per formula unit."""
    return float(sum(values[i] for i in model.modes))


def low_temperature_theta(model: Model, values: FloatArray, atoms: float | None) -> float | None:
    """Debye temperature of the T^3 limit on the per-atom basis, K; None where the model has no T^3 term.

    theta_D(T->0) = (12 pi^4 n R/(5 beta))^(1/3), beta the T^3 coefficient of the lattice part (Debye 1912), n the
    declared atoms, or modes/3 where none are known.
    """
    beta = sum(each.term.cubic_coefficient(*values[each.slice]) for each in model.placed)
    n = atoms if atoms is not None else total_modes(model, values) / 3
    return None if beta <= 0 or n <= 0 else float((DEBYE_CUBIC * n / beta) ** (1 / 3))
