"""What every physical contribution to the heat capacity provides."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

from ..records import FloatArray

__all__ = ["ParameterSpec", "Term"]


@dataclass(frozen=True)
class ParameterSpec:
    """One parameter of a term.

    Attributes
    ----------
    quantity : str
        ``"theta"``, ``"modes"``, ``"gamma"`` ...; the full name is term + quantity.
    unit : str
        SI unit of the value.
    low, high : float
        Physical range, closed; infinite where open.
    role : {"scale", "amplitude"}
        An amplitude enters the heat capacity linearly; a scale does not and is searched for.
    meaning : str
        One line for reports and help.
    example : float
        A typical value, strictly inside the range: the start of the lmfit Model, and what the tests evaluate.
    """

    quantity: str
    unit: str
    low: float
    high: float
    role: Literal["scale", "amplitude"]
    meaning: str
    example: float


@dataclass(frozen=True)
class Term:
    """A physical contribution: pure functions of T (K, any shape) and its parameters, in the order of `parameters`.

    Attributes
    ----------
    name : str
        Name in model expressions: lower case, an identifier, without a digit at its end (repeated terms are numbered).
    parameters : tuple of ParameterSpec
        At least one of them an amplitude, and the heat capacity homogeneous of first degree in the amplitudes.
    lattice : bool
        True for lattice vibrations: Cp-Cv acts on them and their `modes` count towards the mode sum.
    heat_capacity : callable ``(T, *parameters) -> ndarray``
        J/(mol K).
    partials : callable ``(T, *parameters) -> ndarray of shape (number of parameters, *T.shape)``
        Derivatives of the heat capacity with respect to each parameter.
    energy : callable
        U(T) - U(0), J/mol.
    entropy : callable
        J/(mol K).
    zero_point_energy : callable ``(*parameters) -> float``
        J/mol.
    cubic_coefficient : callable ``(*parameters) -> float``
        Coefficient of T^3 of the heat capacity as T -> 0, J/(mol K^4).
    theta_mean : callable ``(m, *parameters) -> float``, or None
        Mean of theta^m over the modes of the term, K^m; for m = 0 the mean of ln(theta/K). None where there are no
        modes.
    low_limit, high_limit : str
        The heat capacity as T -> 0 and T -> infinity, in words.
    source : str
        Where the formula was published.
    guess : callable ``(T, heat capacity) -> parameters``, or None
        Start values from data that this term alone describes, for the lmfit Model; None for the examples with the
        amplitudes scaled to the data.
    """

    name: str
    parameters: tuple[ParameterSpec, ...]
    lattice: bool
    heat_capacity: Callable[..., FloatArray]
    partials: Callable[..., FloatArray]
    energy: Callable[..., FloatArray]
    entropy: Callable[..., FloatArray]
    zero_point_energy: Callable[..., float]
    cubic_coefficient: Callable[..., float]
    theta_mean: Callable[..., float] | None
    low_limit: str
    high_limit: str
    source: str
    guess: Callable[[FloatArray, FloatArray], tuple[float, ...]] | None = None

    @property
    def model_class_name(self) -> str:
        """Name of the lmfit Model class of this term: ``two_level`` gives ``TwoLevelModel``."""
        return "".join(word.capitalize() for word in self.name.split("_")) + "Model"
