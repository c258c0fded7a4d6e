"""Harmonic oscillators whose frequencies are spread over a band of one given shape: what such terms have in common.

Every function of the term is modes R f(theta/T), so a term of this family states only its functions f of x = theta/T
and the numbers of its band.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from math import inf

import numpy as np

from ..constants import GAS_CONSTANT
from ..records import FloatArray
from .term import ParameterSpec, Term

__all__ = ["Oscillators"]


@dataclass(frozen=True)
class Oscillators:
    """A band of oscillators; functions of x = theta/T, each per R and mode (the energy per R T and mode).

    Attributes
    ----------
    heat_capacity, energy, entropy : callable ``(x) -> ndarray``
        Without the zero point; the heat capacity and x times the energy tend to 1 and x as x -> 0.
    slope : callable ``(x, c) -> ndarray``
        x dc/dx, given the heat capacity c at x too: closed forms of it need no second table.
    theta_mean : callable ``(m, theta) -> float``
        Mean of theta^m over the band, K^m; for m = 0 the mean of ln(theta/K).
    cubic : float
        Coefficient of (T/theta)^3 of the heat capacity as T -> 0; 0 where there is no T^3 law.
    half : float
        theta over the temperature at which half the modes are excited (c = 1/2): what a first guess needs.
    """

    heat_capacity: Callable[[FloatArray], FloatArray]
    energy: Callable[[FloatArray], FloatArray]
    entropy: Callable[[FloatArray], FloatArray]
    slope: Callable[[FloatArray, FloatArray], FloatArray]
    theta_mean: Callable[[int, float], float]
    cubic: float
    half: float

    def term(self, name: str, meaning: str, example: float, low_limit: str, source: str) -> Term:
        """Return the lattice term of that name; `meaning` and `example` (K) are those of its theta."""
        return Term(
            name=name,
            parameters=(
                ParameterSpec("theta", "K", 1.0, 2.0e4, "scale", meaning, example),
                ParameterSpec("modes", "1", 0.0, inf, "amplitude", "vibrational modes per formula unit, 3 per atom", 3),
            ),
            lattice=True,
            heat_capacity=self._heat_capacity,
            partials=self._partials,
            energy=self._energy,
            entropy=self._entropy,
            zero_point_energy=self._zero_point_energy,
            cubic_coefficient=self._cubic_coefficient,
            theta_mean=self._theta_mean,
            low_limit=low_limit,
            high_limit="modes R",
            source=source,
            guess=self._guess,
        )

    def _heat_capacity(self, T: FloatArray, theta: float, modes: float) -> FloatArray:
        return np.asarray(modes * GAS_CONSTANT * self.heat_capacity(theta / T))

    def _partials(self, T: FloatArray, theta: float, modes: float) -> FloatArray:
        """Derivatives with respect to theta, J/(mol K^2), and modes, J/(mol K); shape (2, ...)."""
        x = theta / T
        c = self.heat_capacity(x)
        found = np.empty((2, *np.shape(T)))
        found[0] = (GAS_CONSTANT * modes / theta) * self.slope(x, c)
        found[1] = GAS_CONSTANT * c
        return found

    def _energy(self, T: FloatArray, theta: float, modes: float) -> FloatArray:
        return np.asarray(modes * GAS_CONSTANT * T * self.energy(theta / T))

    def _entropy(self, T: FloatArray, theta: float, modes: float) -> FloatArray:
        return np.asarray(modes * GAS_CONSTANT * self.entropy(theta / T))

    def _zero_point_energy(self, theta: float, modes: float) -> float:
        """Half a quantum for every mode: R <theta>/2 each, J/mol."""
        return 0.5 * GAS_CONSTANT * modes * self.theta_mean(1, theta)

    def _cubic_coefficient(self, theta: float, modes: float) -> float:
        return self.cubic * GAS_CONSTANT * modes / theta**3

    def _theta_mean(self, m: int, theta: float, modes: float) -> float:
        return self.theta_mean(m, theta)

    def _guess(self, T: FloatArray, measured: FloatArray) -> tuple[float, float]:
        """Modes from the largest heat capacity (Dulong and Petit), theta from the temperature of half of it."""
        largest = float(measured.max())
        return self.half * float(T[np.argmin(np.abs(measured - largest / 2))]), largest / GAS_CONSTANT
