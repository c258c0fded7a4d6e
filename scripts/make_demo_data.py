"""Make the demo data: invented measurements of invented samples in an invented laboratory, from a stated truth.

    python scripts/make_demo_data.py

writes data/demo/*.csv and data/demo/truth.toml; the same seeds give the same files, byte for byte.
"""

from __future__ import annotations

import codecs
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import tomli_w

from latticefit.constants import GAS_CONSTANT, STANDARD_TEMPERATURE
from latticefit.functions import einstein_heat_capacity
from latticefit.models import build_model, energy, entropy, heat_capacity, low_temperature_theta
from latticefit.records import SampleSettings
from latticefit.sample import build_sample

FOLDER = Path(__file__).resolve().parent.parent / "data" / "demo"
LABORATORY = "Kvellmoor Low Temperature Laboratory (fictional)"


@dataclass(frozen=True)
class Truth:
    """The exact solid behind a demo file: heat capacity in J/(mol K) at T in K, and what a fit should find."""

    heat_capacity: Callable[[np.ndarray], np.ndarray]
    facts: dict[str, object]


def model_truth(terms: str, cp_cv: str, atoms: float, values: dict[str, float]) -> Truth:
    """A solid that is exactly one of latticefit's models."""
    model = build_model(terms, cp_cv)
    vector = np.array([values[name] for name in model.names])
    at = np.array([STANDARD_TEMPERATURE])
    facts: dict[str, object] = {
        "terms": terms,
        "cp_cv": cp_cv,
        "parameters": values,
        "entropy_298_J_mol_K": float(entropy(model, at, vector)[0]),
        "enthalpy_298_J_mol": float(energy(model, at, vector)[0]),
    }
    theta = low_temperature_theta(model, vector, atoms)
    if theta is not None:
        facts["theta_debye_low_temperature_K"] = theta
    return Truth(lambda T: heat_capacity(model, T, vector), facts)


def dispersive_truth(theta_acoustic: float, optic: dict[float, float], atoms: float, coefficient: float) -> Truth:
    """Three acoustic modes with plain sine dispersion and optic modes of single frequencies: no Debye solid.

    `theta_acoustic` is the Debye temperature of the acoustic modes as T -> 0; `optic` maps theta (K) to modes;
    `coefficient` is that of Cp - Cv = A Cp^2 T, mol/J.
    """
    q, weight = np.polynomial.legendre.leggauss(400)
    q, weight = (q + 1) / 2, weight / 2 * 3 * ((q + 1) / 2) ** 2  # fraction of the zone radius; 3 q^2 dq
    thetas = np.concatenate([theta_acoustic * 2 / np.pi * np.sin(np.pi / 2 * q), list(optic)])
    modes = np.concatenate([3 * weight, list(optic.values())])

    def measured(T: np.ndarray) -> np.ndarray:
        harmonic = GAS_CONSTANT * np.asarray(einstein_heat_capacity(thetas / np.asarray(T)[:, None])) @ modes
        return 2 * harmonic / (1 + np.sqrt(1 - 4 * coefficient * T * harmonic))

    # integrals from 0 to 298.15 K on 40 panels of 20 nodes: exact to the last digits for so smooth a function
    x, w = np.polynomial.legendre.leggauss(20)
    width = STANDARD_TEMPERATURE / 40
    t = (np.arange(40)[:, None] * width + (x + 1) / 2 * width).ravel()
    weights = np.tile(w / 2 * width, 40)
    facts: dict[str, object] = {
        "spectrum": "three acoustic modes with sine dispersion, optic modes of single frequencies",
        "acoustic_theta_K": theta_acoustic,
        "optic_modes": [{"theta_K": theta, "modes": count} for theta, count in optic.items()],
        "nernst_lindemann_coefficient_mol_J": coefficient,
        "entropy_298_J_mol_K": float(weights @ (measured(t) / t)),
        "enthalpy_298_J_mol": float(weights @ measured(t)),
        # the acoustic modes alone carry the T^3 law; per atom it is stiffer by the cube root of the atoms
        "theta_debye_low_temperature_K": theta_acoustic * atoms ** (1 / 3),
    }
    return Truth(measured, facts)


@dataclass(frozen=True)
class Demo:
    """One demo file: what it is, its solid, its points and noise, and how it is written."""

    name: str
    title: str
    about: str
    formula: str
    truth: Truth
    low: float
    high: float
    points: int
    noise: float
    seed: int
    write: Callable[[np.ndarray, np.ndarray, np.ndarray, float], list[str]]
    utf16: bool = False


def with_sigma(T: np.ndarray, C: np.ndarray, sigma: np.ndarray, molar_mass: float) -> list[str]:
    """Comma separated, heat capacity and its standard uncertainty in J/(mol K)."""
    rows = [f"{t:.4f},{c:.6g},{s:.2g}" for t, c, s in zip(T, C, sigma, strict=True)]
    return ["T_K,Cp_J_molK,sigma_J_molK", *rows]


def plain(T: np.ndarray, C: np.ndarray, sigma: np.ndarray, molar_mass: float) -> list[str]:
    """Tab separated, mJ/(mol K), no uncertainties."""
    return ["T/K\tCp/mJ/(mol K)", *(f"{t:.4f}\t{1000 * c:.6g}" for t, c in zip(T, C, strict=True))]


def per_gram(T: np.ndarray, C: np.ndarray, sigma: np.ndarray, molar_mass: float) -> list[str]:
    """Semicolons, decimal commas, J/(g K)."""
    rows = [f"{t:.3f};{c / molar_mass:.6g}".replace(".", ",") for t, c in zip(T, C, strict=True)]
    return ["T (K);cp (J/(g K))", *rows]


def per_gram_below_units(T: np.ndarray, C: np.ndarray, sigma: np.ndarray, molar_mass: float) -> list[str]:
    """Semicolons, decimal commas, the units in a row below the names, J/(g K)."""
    rows = [f"{t:.3f};{c / molar_mass:.6g}".replace(".", ",") for t, c in zip(T, C, strict=True)]
    return ["T;cp", "K;J/(g K)", *rows]


DEMOS = (
    Demo(
        "halvite",
        "Halvite, crystal HVT-1",
        "an insulator; uncertainties in the third column (k = 1)",
        "NeKr",
        model_truth(
            "debye + einstein",
            "nernst-lindemann",
            2,
            {
                "debye_theta": 245.0,
                "debye_modes": 3.6,
                "einstein_theta": 430.0,
                "einstein_modes": 2.4,
                "nernst_lindemann_coefficient": 1.6e-6,
            },
        ),
        2.0,
        300.0,
        120,
        0.005,
        101,
        with_sigma,
    ),
    Demo(
        "norrium",
        "Norrium, a metal, bar N-7",
        "no uncertainties stated",
        "At",
        model_truth(
            "debye + einstein + electronic",
            "nernst-lindemann",
            1,
            {
                "debye_theta": 275.0,
                "debye_modes": 2.5,
                "einstein_theta": 132.0,
                "einstein_modes": 0.5,
                "electronic_gamma": 3.2e-3,
                "nernst_lindemann_coefficient": 5.0e-6,
            },
        ),
        1.8,
        300.0,
        150,
        0.006,
        102,
        plain,
    ),
    Demo(
        "tvorrite",
        "Tvorrite, powder",
        "an insulator; heat capacity per gram, no uncertainties stated",
        "NeKr2Xe2",
        model_truth(
            "debye + einstein",
            "nernst-lindemann",
            5,
            {
                "debye_theta": 310.0,
                "debye_modes": 7.5,
                "einstein_theta": 640.0,
                "einstein_modes": 7.5,
                "nernst_lindemann_coefficient": 4.0e-7,
            },
        ),
        3.0,
        320.0,
        140,
        0.008,
        103,
        per_gram,
    ),
    Demo(
        "drommenite",
        "Drommenite, crystal",
        "an insulator; measured from 50 K up only",
        "ArXe",
        dispersive_truth(300.0, {330.0: 1.5, 480.0: 1.5}, 2, 1.5e-6),
        50.0,
        300.0,
        120,
        0.005,
        104,
        with_sigma,
    ),
    Demo(
        "sjelite",
        "Sjelite, powder SJ-2, a hydrate",
        "an insulator, all modes below 500 K as no real water has; per gram, no uncertainties stated",
        "He4Ne4*2H2O",
        model_truth(
            "debye + einstein",
            "nernst-lindemann",
            14,
            {
                "debye_theta": 205.0,
                "debye_modes": 26.0,
                "einstein_theta": 430.0,
                "einstein_modes": 16.0,
                "nernst_lindemann_coefficient": 2.0e-7,
            },
        ),
        2.2,
        310.0,
        130,
        0.006,
        105,
        per_gram_below_units,
        utf16=True,
    ),
)


def molar_mass(demo: Demo) -> float:
    """kg/mol."""
    found = build_sample(SampleSettings(formula=demo.formula), demo.name).molar_mass
    assert found is not None
    return found


def lines(demo: Demo) -> list[str]:
    """Header and rows of a demo file."""
    rng = np.random.default_rng(demo.seed)
    T = np.geomspace(demo.low, demo.high, demo.points)
    T = np.round(T * (1 + 0.002 * rng.uniform(-1, 1, T.size)), 3)
    exact = demo.truth.heat_capacity(T)
    measured = exact * (1 + demo.noise * rng.standard_normal(T.size))
    header = [
        f"# invented data: {demo.title}. {LABORATORY}.",
        f"# Formula {demo.formula} (a composition that does not exist); {demo.about}.",
        f"# Made by scripts/make_demo_data.py, seed {demo.seed}; the exact solid stands in truth.toml.",
    ]
    return header + demo.write(T, measured, demo.noise * exact, 1e3 * molar_mass(demo))


def truth_text() -> str:
    """The stated truth of every demo file, TOML."""
    facts = {
        demo.name: {
            "title": demo.title,
            "formula": demo.formula,
            "noise_percent": 100 * demo.noise,
            **demo.truth.facts,
        }
        for demo in DEMOS
    }
    return f"# invented data: the exact solids behind the demo files. {LABORATORY}.\n" + tomli_w.dumps(facts)


def files() -> dict[str, bytes]:
    """Every file's name and content."""
    texts = {f"{demo.name}.csv": encoded("\n".join(lines(demo)) + "\n", demo.utf16) for demo in DEMOS}
    return {**texts, "truth.toml": encoded(truth_text())}


def encoded(text: str, utf16: bool = False) -> bytes:
    """The bytes of a file: UTF-8, or UTF-16 with a byte order mark."""
    return codecs.BOM_UTF16_LE + text.encode("utf-16-le") if utf16 else text.encode("utf-8")


def main() -> None:
    """Write the files."""
    FOLDER.mkdir(parents=True, exist_ok=True)
    for name, content in files().items():
        (FOLDER / name).write_bytes(content)
        print(f"wrote data/demo/{name}")


if __name__ == "__main__":
    main()
