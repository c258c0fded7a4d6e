"""Physical constants, from `scipy.constants` (CODATA; R is exact since the SI of 2019), and numbers of all rooms."""

from __future__ import annotations

from math import pi
from typing import Final

from scipy import constants as _codata

__all__ = [
    "AVOGADRO_CONSTANT",
    "CALORIE_THERMOCHEMICAL",
    "DEBYE_CUBIC",
    "GAS_CONSTANT",
    "NERNST_LINDEMANN_A0",
    "NORMAL_MEDIAN",
    "REPEAT_FACTOR",
    "STANDARD_TEMPERATURE",
]

GAS_CONSTANT: Final[float] = float(_codata.R)
"""Molar gas constant R, J/(mol K)."""

AVOGADRO_CONSTANT: Final[float] = float(_codata.N_A)
"""Avogadro constant, 1/mol (exact since the SI of 2019)."""

DEBYE_CUBIC: Final[float] = 12 * pi**4 * GAS_CONSTANT / 5
"""12 pi^4 R/5, J/(mol K): heat capacity of one mole of atoms is this times (T/theta_D)^3 at low T (Debye 1912)."""

STANDARD_TEMPERATURE: Final[float] = 298.15
"""Reference temperature of standard thermodynamic tables, K."""

CALORIE_THERMOCHEMICAL: Final[float] = float(_codata.calorie)
"""Thermochemical calorie, J."""

NERNST_LINDEMANN_A0: Final[float] = 0.0214 / CALORIE_THERMOCHEMICAL
"""Universal coefficient A0 = 0.0214 mol K/cal of W. Nernst and F. A. Lindemann, Z. Elektrochem. 17, 817 (1911),
in mol K/J: Cp - Cv = A0 Cp^2 T/Tm per mole of atoms (the number 0.0214 from memory)."""

NORMAL_MEDIAN: Final[float] = 1.4826
"""Standard deviation of a normal distribution over the median of its absolute values."""

REPEAT_FACTOR: Final[float] = 1.003
"""Points closer than this factor in T may be repeats of one temperature (common practice, no source)."""
