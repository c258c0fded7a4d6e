"""Builders of records for tests: prepared data from plain arrays, reference files, invented solids."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from latticefit.models import build_model, heat_capacity
from latticefit.records import (
    FloatArray,
    Measurement,
    PreparedData,
    Quantity,
    Reading,
    RunSettings,
    Sample,
    SampleSettings,
    SigmaKind,
)

ROOT = Path(__file__).resolve().parent.parent
REFERENCE = ROOT / "data" / "reference"
DEMO = ROOT / "data" / "demo"


def prepared_data(
    T: FloatArray,
    C: FloatArray,
    sigma: FloatArray,
    atoms: float | None = None,
    quantity: Quantity = "Cp",
    sigma_kind: SigmaKind = "stated",
    melting_point: float | None = None,
    sigma_text: str = "as stated",
) -> PreparedData:
    """Prepared data of one run from arrays in K and J/(mol K), ascending T."""
    n = len(T)
    settings = RunSettings("invented.csv")
    reading = Reading(
        "invented.csv",
        "invented.csv",
        "0" * 64,
        "run 1",
        "utf-8",
        ",",
        ".",
        "T",
        "C",
        None,
        "K",
        "J/(mol K)",
        n,
        settings,
    )
    measurement = Measurement(
        sample=Sample("invented", None, atoms, None, None, melting_point),
        temperature=T,
        heat_capacity=C,
        sigma=sigma if sigma_kind == "stated" else None,
        run=np.zeros(n, dtype=np.intp),
        line=np.arange(2, n + 2),
        quantity=quantity,
        basis="mol",
        sigma_text=sigma_text,
        readings=(reading,),
        repairs=(),
        excluded=(),
        sample_settings=SampleSettings(atoms=atoms),
    )
    return PreparedData(
        measurement, T, C, sigma, np.zeros(n, dtype=np.intp), np.arange(n), (None,) * n, sigma_kind, sigma_text
    )


def invented_solid(
    terms: str,
    values: list[float],
    T: FloatArray,
    noise: float = 0.005,
    seed: int = 1,
    cp_cv: str = "none",
    atoms: float | None = None,
    quantity: Quantity = "Cp",
) -> PreparedData:
    """Prepared data drawn from a model with known parameters and a stated relative sigma (invented data)."""
    model = build_model(terms, cp_cv)
    exact = heat_capacity(model, T, np.array(values))
    rng = np.random.default_rng(seed)
    measured = exact * (1 + noise * rng.standard_normal(T.size))
    return prepared_data(T, measured, max(noise, 1e-6) * exact, atoms, quantity)
