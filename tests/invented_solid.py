"""An invented solid of one Debye and one Einstein term, computed with plain numpy, for tests of the report."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from latticefit.constants import GAS_CONSTANT
from latticefit.records import DerivedValue, FloatArray, ThermodynamicTable

NODES, WEIGHTS = np.polynomial.legendre.leggauss(200)
BELOW = "below the data: the uncertainty of an extrapolation is not known"


def debye_shape(x: FloatArray) -> FloatArray:
    """C/(3 N k_B) of a Debye solid at x = theta/T, by fixed quadrature (6 digits are plenty here)."""
    top = np.minimum(x, 60.0)
    t = top[:, None] * (NODES + 1) / 2
    integrand = t**4 * np.exp(-t) / np.expm1(-t) ** 2
    return 3 / x**3 * (integrand @ WEIGHTS) * top / 2


def einstein_shape(x: FloatArray) -> FloatArray:
    """C/(3 N k_B) of an Einstein solid at x = theta/T."""
    return np.where(x > 300, 0.0, x**2 * np.exp(-np.minimum(x, 300)) / np.expm1(-np.minimum(x, 300)) ** 2)


@dataclass(frozen=True)
class Truth:
    """What the invented sample is made of; modes per formula unit, gamma in J/(mol K^2)."""

    atoms: float
    debye_theta: float
    debye_modes: float
    einstein_theta: float
    gamma: float

    @property
    def einstein_modes(self) -> float:
        """The rest of the 3n modes."""
        return 3 * self.atoms - self.debye_modes

    def components(self, T: FloatArray) -> dict[str, FloatArray]:
        """Heat capacity of each term, J/(mol K)."""
        parts = {
            "debye": GAS_CONSTANT * self.debye_modes * debye_shape(self.debye_theta / T),
            "einstein": GAS_CONSTANT * self.einstein_modes * einstein_shape(self.einstein_theta / T),
        }
        if self.gamma:
            parts["electronic"] = self.gamma * T
        return parts

    def heat_capacity(self, T: FloatArray) -> FloatArray:
        """Sum of the components, J/(mol K)."""
        return np.asarray(sum(self.components(T).values()))


def thermodynamic_table(
    truth: Truth, T: FloatArray, low: float, high: float, quantity: str, known: bool
) -> ThermodynamicTable:
    """A table on the grid T; u below `low` only where `known`."""
    fine = np.geomspace(1e-2, max(T[-1], 300.0), 4000)
    heat_capacity = truth.heat_capacity(fine)
    steps = np.diff(fine)
    energy = np.concatenate([[0], np.cumsum((heat_capacity[1:] + heat_capacity[:-1]) / 2 * steps)])
    slope = heat_capacity / fine
    entropy = np.concatenate([[0], np.cumsum((slope[1:] + slope[:-1]) / 2 * steps)])
    C, H, S = truth.heat_capacity(T), np.interp(T, fine, energy), np.interp(T, fine, entropy)
    withheld = (low > T) & (not known)
    origin = np.where(low > T, "extrapolated_below", np.where(high < T, "extrapolated_above", "measured"))

    def u(value: FloatArray, relative: float) -> dict[str, FloatArray]:
        return {"u": np.where(withheld, np.nan, relative * value), "u_fit": relative * value * 0.9}

    columns = {"heat_capacity": C, "energy": H, "entropy": S, "free_energy_function": S - H / T}
    filled = {}
    for (name, value), relative in zip(columns.items(), (1.3e-3, 1.1e-3, 1.7e-3, 2.9e-3), strict=True):
        filled[name] = value
        for kind, each in u(value, relative).items():
            filled[f"{name}_{kind}"] = each
    return ThermodynamicTable(
        quantity=quantity,  # type: ignore[arg-type]
        temperature=T,
        entropy_fraction_below_data=np.minimum(1.0, np.interp(low, fine, entropy) / S),
        energy_from_standard=H - float(np.interp(298.15, T, H)),
        energy_from_standard_u=np.where(withheld, np.nan, 1.1e-3 * H),
        origin=tuple(str(each) for each in origin),  # type: ignore[arg-type]
        u_reasons=tuple(BELOW if each else None for each in withheld),
        components=truth.components(T),
        **filled,
    )


def theta_of(C: FloatArray, T: FloatArray, atoms: float) -> FloatArray:
    """theta_D that a pure Debye solid would need to have C at T; NaN where C >= 3nR."""
    x = np.geomspace(0.02, 1500, 4000)
    shape = debye_shape(x)
    wanted = C / (3 * atoms * GAS_CONSTANT)
    return np.where(wanted >= 1, np.nan, T * np.interp(wanted, shape[::-1], x[::-1]))


def characteristic(truth: Truth, withheld: bool) -> tuple[DerivedValue, ...]:
    """Low-temperature, moment and Einstein-equivalent temperatures of the truth, as the contract names them."""
    n = truth.atoms
    f_debye, f_einstein = truth.debye_modes / (3 * n), truth.einstein_modes / (3 * n)
    low = truth.debye_theta * (n / (truth.debye_modes / 3)) ** (1 / 3)
    reason = "the lowest point fitted lies above theta/30: no data carry the T^3 limit" if withheld else None
    definition = "(12 pi^4 n R/(5 beta))^(1/3), beta the T^3 coefficient of the lattice part, per atom"
    rows = [
        DerivedValue(
            "theta_debye_low_temperature",
            "theta_D(T->0)",
            None if withheld else low,
            None if withheld else 0.61,
            None if withheld else 0.55,
            None,
            None,
            "K",
            definition,
            "P. Debye, Ann. Phys. 39, 789 (1912)",
            "undetermined" if withheld else "determined",
            reason,
        )
    ]
    for m, word in zip((-2, -1, 0, 1, 2), ("minus_2", "minus_1", "0", "1", "2"), strict=True):
        if m == 0:
            mean = f_debye * (np.log(truth.debye_theta) - 1 / 3) + f_einstein * np.log(truth.einstein_theta)
            value = float(np.exp(1 / 3 + mean))
        else:
            mean = f_debye * 3 / (m + 3) * truth.debye_theta**m + f_einstein * truth.einstein_theta**m
            value = float(((m + 3) / 3 * mean) ** (1 / m))
        rows.append(
            DerivedValue(
                f"theta_debye_moment_{word}",
                f"theta_D[m={m}]",
                value,
                0.42 + 0.2 * abs(m),
                0.4,
                None,
                None,
                "K",
                f"Debye temperature of the moment m = {m} of the spectrum",
                "C. Domb and L. Salter, Phil. Mag. 43, 1083 (1952)",
                "determined",
                None,
            )
        )
    einstein = (("entropy", 0, "exp(-1/3) theta_D[m=0]"), ("high_temperature", 2, "sqrt(3/5) theta_D[m=2]"))
    for word, m, definition in einstein:
        rows.append(
            DerivedValue(
                f"theta_einstein_{word}",
                f"theta_E({word.replace('_', ' ')})",
                rows[m + 3].value * 0.75,
                0.33,
                0.3,
                None,
                None,
                "K",
                definition,
                "A. Einstein, Ann. Phys. 22, 180 (1907)",
                "determined",
                None,
            )
        )
    return tuple(rows)
