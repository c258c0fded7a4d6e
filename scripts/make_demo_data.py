"""Make the demo data: invented measurements of invented samples in an invented laboratory, from a stated truth.

    python scripts/make_demo_data.py

writes data/demo/*.csv and data/demo/truth.toml; the same seeds give the same files, byte for byte.
"""

from __future__ import annotations

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
    byte_order_mark: bool = False


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
        byte_order_mark=True,
    ),
)


def molar_mass(formula: str) -> float:
    """kg/mol."""
    found = build_sample(SampleSettings(formula=formula), formula).molar_mass
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
    return header + demo.write(T, measured, demo.noise * exact, 1e3 * molar_mass(demo.formula))


# ------------------------------------------------------------------------------- two platforms, and a blank forgotten

GRANNESE = model_truth(
    "debye + einstein",
    "none",
    3,
    {"debye_theta": 210.0, "debye_modes": 4.5, "einstein_theta": 380.0, "einstein_modes": 4.5},
)
GRANNESE_STEP = 1.025  # scale of the cold platform over the warm one
QUELLITE = model_truth(
    "debye + einstein",
    "none",
    2,
    {"debye_theta": 320.0, "debye_modes": 3.0, "einstein_theta": 520.0, "einstein_modes": 3.0},
)
QUELLITE_MASS = 2.1e-6  # kg


def heading(title: str, formula: str, about: str, seed: int) -> list[str]:
    """The comment lines above a table."""
    return [
        f"# invented data: {title}. {LABORATORY}.",
        f"# Formula {formula} (a composition that does not exist); {about}.",
        f"# Made by scripts/make_demo_data.py, seed {seed}; the exact solid stands in truth.toml.",
    ]


def triplicates(low: float, high: float, sets: int, rng: np.random.Generator) -> np.ndarray:
    """Temperatures in sets of three within 0.05 %, K."""
    return np.repeat(np.geomspace(low, high, sets), 3) * (1 + 2.5e-4 * rng.uniform(-1, 1, 3 * sets))


def grannese(cold: bool) -> str:
    """Triplicates of one crystal on one platform; the first of each set has not settled and lies 1.5 % high."""
    seed = 107 if cold else 106
    rng = np.random.default_rng(seed)
    T = np.round(triplicates(0.4, 20.0, 36, rng) if cold else triplicates(2.0, 300.0, 48, rng), 5)
    noise = 0.006 if cold else 0.005
    C = GRANNESE.heat_capacity(T) * (1 + noise * rng.standard_normal(T.size)) * (GRANNESE_STEP if cold else 1.0)
    C[::3] *= 1.015
    where = "cold platform, 0.4-20 K" if cold else "warm platform, 2-300 K"
    about = f"{where}; every temperature measured three times; heat capacity in uJ/K of 4.8 mg"
    per_mass = 4.8e-6 / molar_mass("HeNeAr") * 1e6
    rows = [f"{t:.5f}\t{c * per_mass:.6g}" for t, c in zip(T, C, strict=True)]
    return "\n".join([*heading("Grannese, crystal GR-1", "HeNeAr", about, seed), "T (K)\tC (uJ/K)", *rows]) + "\n"


def quellite_addenda(T: np.ndarray) -> np.ndarray:
    """Platform and grease, J/K: more than half of what the sample adds."""
    return 3.2e-4 * np.asarray(einstein_heat_capacity(160.0 / T)) + 2.0e-9 * T + 1.0e-4 * (T / 300) ** 2.6


def quellite(blank: bool) -> str:
    """The blank alone, or the sample on it, J/K."""
    seed = 109 if blank else 108
    rng = np.random.default_rng(seed)
    T = np.round(np.geomspace(1.8, 305.0, 70) if blank else np.geomspace(2.0, 300.0, 110), 4)
    total = quellite_addenda(T)
    if not blank:
        total = total + QUELLITE.heat_capacity(T) * QUELLITE_MASS / molar_mass("NeXe")
    total = total * (1 + 0.004 * rng.standard_normal(T.size))
    what = "platform and grease alone" if blank else "crystal of 2.1 mg on platform and grease, nothing taken off"
    rows = [f"{t:.4f};{c:.6e};{0.004 * c:.2e}" for t, c in zip(T, total, strict=True)]
    header = "T [K];C [J/K];sigma [J/K]"
    return "\n".join([*heading("Quellite, crystal Q-3", "NeXe", what, seed), header, *rows]) + "\n"


def run_truth() -> dict[str, object]:
    """What stands behind the files of several runs and of the blank."""
    return {
        "grannese": {
            "title": "Grannese, crystal GR-1, on two platforms",
            "formula": "HeNeAr",
            "mass_mg": 4.8,
            "step_cold_over_warm": GRANNESE_STEP,
            "first_of_each_set_high_percent": 1.5,
            "solid": GRANNESE.facts,
        },
        "quellite": {
            "title": "Quellite, crystal Q-3, with its blank",
            "formula": "NeXe",
            "mass_mg": round(1e6 * QUELLITE_MASS, 9),
            "noise_percent": 0.4,
            "solid": QUELLITE.facts,
        },
    }


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
    facts |= run_truth()
    return f"# invented data: the exact solids behind the demo files. {LABORATORY}.\n" + tomli_w.dumps(facts)


def files() -> dict[str, bytes]:
    """Every file's name and content."""
    texts = {f"{demo.name}.csv": encoded("\n".join(lines(demo)) + "\n", demo.byte_order_mark) for demo in DEMOS}
    runs = {
        "grannese_cold.csv": grannese(True),
        "grannese_warm.csv": grannese(False),
        "quellite_addenda.csv": quellite(True),
        "quellite_total.csv": quellite(False),
    }
    return {**texts, **{name: encoded(text) for name, text in runs.items()}, "truth.toml": encoded(truth_text())}


def encoded(text: str, byte_order_mark: bool = False) -> bytes:
    """The bytes of a file, UTF-8: any search finds that the data are invented."""
    return text.encode("utf-8-sig" if byte_order_mark else "utf-8")


def main() -> None:
    """Write the files."""
    FOLDER.mkdir(parents=True, exist_ok=True)
    for name, content in files().items():
        (FOLDER / name).write_bytes(content)
        print(f"wrote data/demo/{name}")


if __name__ == "__main__":
    main()
