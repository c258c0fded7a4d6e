"""Analyses built by hand with plain numpy, for the tests of reports: invented data, no stage of the pipeline used.

Each function returns a whole `Analysis` whose files lie in the given folder. Truth and "fit" are the same model, so
the residuals are the seeded noise.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
from invented_measurement import Case, measurement_of, prepared_of
from invented_solid import Truth, characteristic, thermodynamic_table, theta_of

from latticefit.records import (
    Analysis,
    Candidate,
    Comparison,
    Derived,
    DerivedValue,
    Diagnosis,
    FitRecord,
    FloatArray,
    ModelSettings,
    NamedWarning,
    ParameterValue,
    PointwiseTheta,
    PreparedData,
    Provenance,
    ReportSettings,
    ResidualBand,
    ResidualStatistics,
    Sheet,
    ValidityFact,
)


def _parameters(truth: Truth, names: tuple[str, ...], values: FloatArray, sigma: FloatArray) -> list[ParameterValue]:
    units = {"theta": "K", "modes": "1", "gamma": "J/(mol K^2)"}
    meanings = {
        "theta": "characteristic temperature",
        "modes": "modes per formula unit",
        "gamma": "electronic (Sommerfeld) coefficient gamma",
    }
    found = []
    for name, value, u in zip(names, values, sigma, strict=True):
        quantity = name.split("_")[1]
        status = "tied" if name == "einstein_modes" else "fitted"
        found.append(
            ParameterValue(
                name,
                float(value),
                1.1 * float(u),
                float(u),
                units[quantity],
                status,
                0.0,
                np.inf,
                float(value) * 0.9,
                meanings[quantity],
            )
        )
    return found


def _diagnosis(case: Case, prepared: PreparedData, warnings: tuple[NamedWarning, ...]) -> Diagnosis:
    model_all = case.truth.heat_capacity(case.T)
    model = model_all[prepared.index]
    residual = prepared.heat_capacity - model
    percent, pull = 100 * residual / model, residual / prepared.sigma
    bands, T = [], prepared.temperature
    for low in (1.0, 10.0, 100.0):
        inside = (low <= T) & (10 * low > T)
        if inside.any():
            each = percent[inside]
            bands.append(
                ResidualBand(
                    max(low, float(T[0])),
                    min(10 * low, float(T[-1])),
                    int(inside.sum()),
                    float(np.sqrt(np.mean(each**2))),
                    float(np.max(np.abs(each))),
                )
            )
    freedom = T.size - 4
    good = case.misfit == 0
    reduced = float(pull @ pull) / freedom
    statistics = ResidualStatistics(
        reduced_chi_square=reduced,
        chi_square_p=0.47 if good else 1e-30,
        aicc=float(pull @ pull) + 8.9,
        bic=float(pull @ pull) + 17.0,
        rms_percent=float(np.sqrt(np.mean(percent**2))),
        max_abs_percent=float(np.max(np.abs(percent))),
        max_abs_percent_temperature=float(T[np.argmax(np.abs(percent))]),
        durbin_watson=1.94 if good else 0.31,
        lag1_correlation=0.03 if good else 0.8,
        runs_test_p=0.62 if good else 1e-6,
        longest_run=6 if good else 21,
        bands=tuple(bands),
        entropy_miss=0.01,
        energy_miss=0.5,
        run_means_percent=(0.0,),
    )
    facts = (
        ValidityFact("converged", True, "the minimum was reached in 9 evaluations"),
        ValidityFact("no parameter at a bound", True, "0 of 4"),
        ValidityFact("residuals as large as sigma says", good, f"reduced chi-square {reduced:.2f}"),
        ValidityFact("residuals change sign at random", good, f"runs test p = {0.62 if good else 1e-6:.2g}"),
    )
    verdict = (
        "The model describes the data within their stated uncertainties."
        if good
        else "The model does not describe the data: the residuals are larger than sigma and run in waves. "
        "Do not use the parameters."
    )
    return Diagnosis(model, residual, percent, pull, model_all, statistics, facts, good, verdict, warnings)


def _warnings(case: Case) -> tuple[NamedWarning, ...]:
    found = []
    if case.withheld:
        found.append(
            NamedWarning(
                "low-temperature-reach",
                "stop",
                "theta_debye_low_temperature",
                "The lowest point fitted, 50 K, lies above theta/30: theta_D(T->0) is not determined by these data.",
                6.4,
                30.0,
                "Measure below 10 K, or use the moments and S(298.15 K) instead.",
            )
        )
    if case.misfit:
        found.append(
            NamedWarning(
                "residual-structure",
                "warn",
                "fit",
                "The residuals run in waves: 21 points in a row of one sign.",
                0.31,
                1.2,
                "Try a model with one more term.",
            )
        )
    return tuple(found)


def build(case: Case, folder: Path, seed: int = 5) -> Analysis:
    """Return the analysis of an invented case; its input files are written under `folder`."""
    rng = np.random.default_rng(seed)
    exact = case.truth.heat_capacity(case.T)
    sigma = 0.01 * exact
    wave = 1 + case.misfit * np.sin(2.5 * np.log(case.T))
    C = exact * wave * (1 + 0.01 * rng.standard_normal(case.T.size))
    for low, high in case.mask:
        C = C * (1 + 0.3 * ((low <= case.T) & (high >= case.T)))  # an anomaly that the mask leaves out
    measurement = measurement_of(case, folder, C, sigma)
    prepared = prepared_of(case, measurement, sigma)
    warnings = _warnings(case)
    truth, low, high = case.truth, float(prepared.temperature[0]), float(prepared.temperature[-1])
    names = ("debye_theta", "debye_modes", "einstein_theta", "einstein_modes")
    values = np.array([truth.debye_theta, truth.debye_modes, truth.einstein_theta, truth.einstein_modes])
    u_fit = np.array([0.8, 0.021, 1.7, 0.021])
    if truth.gamma:
        names, values, u_fit = (*names, "electronic_gamma"), np.append(values, truth.gamma), np.append(u_fit, 3.2e-6)
    diagnosis = _diagnosis(case, prepared, tuple(each for each in warnings if each.concerns == "fit"))
    reduced = diagnosis.statistics.reduced_chi_square or 1.0
    terms = "debye + einstein" + (" + electronic" if truth.gamma else "")
    fit = FitRecord(
        terms=terms,
        mode_sum="fixed",
        cp_cv="none",
        atoms=truth.atoms,
        names=names,
        values=values,
        covariance=np.diag(u_fit**2),
        parameters=tuple(_parameters(truth, names, values, u_fit)),
        covariance_kind="absolute" if case.stated else "scaled",
        scale_factor=reduced,
        condition=14.2,
        converged=True,
        message="converged",
        chi_square=reduced * (prepared.temperature.size - 4),
        degrees_of_freedom=prepared.temperature.size - 4,
        free_parameters=4,
        evaluations=9,
        starts_tried=10,
        distinct_minima=1,
    )
    settings = Sheet(
        sample=measurement.sample_settings,
        runs=tuple(each.settings for each in measurement.readings),
        model=ModelSettings(terms=terms),
        report=ReportSettings(out="somewhere"),
    )
    provenance = Provenance(
        "0.1",
        "2026-12-01T12:00:00+00:00",
        0,
        {"numpy": "2.4.6", "lmfit": "1.3.4"},
        f"latticefit fit halden.csv --formula {case.formula} --terms '{terms}'",
    )
    derived = _derived(case, prepared, warnings, low, high)
    return Analysis(settings, measurement, prepared, fit, diagnosis, derived, warnings, _one_candidate(fit), provenance)


def _one_candidate(fit: FitRecord) -> Comparison:
    reduced = fit.chi_square / fit.degrees_of_freedom
    only = Candidate(fit.terms, fit.mode_sum, fit.cp_cv, 4, fit.chi_square, reduced, 90.0, 95.0, 0.0, 1.0, True, ())
    return Comparison((only,), 0, "the terms were given")


def _derived(
    case: Case, prepared: PreparedData, warnings: tuple[NamedWarning, ...], low: float, high: float
) -> Derived:
    truth, T = case.truth, case.T
    grid = np.array([0.5, 1, 2, 5, 10, 20, 30, 50, 100, 150, 200, 250, 298.15, 350.0])
    curve = np.geomspace(max(low / 4, 0.5), high * 1.15, 400)
    known = not case.withheld
    C = prepared.measurement.heat_capacity - truth.gamma * T
    theta = theta_of(C, T, truth.atoms)
    slope = np.abs(theta_of(C * 1.001, T, truth.atoms) - theta) / (0.001 * C)
    reasons = tuple("C is not below 3nR" if blank else None for blank in np.isnan(theta))
    return Derived(
        characteristic_temperatures=characteristic(truth, case.withheld),
        zero_point_energy=DerivedValue(
            "zero_point_energy",
            "E_0",
            5210.7,
            9.4,
            8.8,
            None,
            None,
            "J/mol",
            "energy of the harmonic lattice at T = 0: (9/8) R theta of a Debye atom, (3/2) R theta of an Einstein one",
            "P. Debye, Ann. Phys. 39, 789 (1912)",
            "determined",
            None,
        ),
        table=thermodynamic_table(truth, grid, low, high, case.quantity, known),  # type: ignore[arg-type]
        curve=thermodynamic_table(truth, curve, low, high, case.quantity, known),  # type: ignore[arg-type]
        pointwise_theta=PointwiseTheta(theta, np.where(np.isnan(theta), np.nan, slope * 0.01 * C), reasons),
        model_theta=theta_of(truth.heat_capacity(curve) - truth.gamma * curve, curve, truth.atoms),
        warnings=tuple(each for each in warnings if each.concerns != "fit"),
    )


METAL = Case(
    name="Haldenium HM-4",
    formula="Cu",
    truth=Truth(1.0, 290.0, 2.1, 214.0, 7.2e-4),
    T=np.geomspace(1.2, 300, 90),
    mask=((28.0, 33.0),),
    runs=2,
    excluded=True,
)
COLDSTOP = Case(
    name="Coldstop CS-1",
    formula="NaCl",
    truth=Truth(2.0, 260.0, 3.2, 330.0, 0.0),
    T=np.linspace(50, 300, 60),
    withheld=True,
    stated=False,
)
VOLUME = Case(
    name="Brennite BN-2",
    formula="NaCl",
    truth=Truth(2.0, 260.0, 3.2, 330.0, 0.0),
    T=np.geomspace(2, 290, 80),
    quantity="Cv",
)
MISFIT = Case(
    name="Wavelite WL-9",
    formula="Cu",
    truth=Truth(1.0, 290.0, 2.1, 214.0, 7.2e-4),
    T=np.geomspace(1.2, 300, 90),
    misfit=0.12,
)
CASES = {"metal": METAL, "coldstop": COLDSTOP, "volume": VOLUME, "misfit": MISFIT}


def undetermined(folder: Path) -> Analysis:
    """A fit that did not converge and determined nothing (exit code 3): the report must still be written."""
    good = build(MISFIT, folder)
    nothing = replace(
        good.fit,
        converged=False,
        message="the iteration limit was reached",
        covariance=np.full_like(good.fit.covariance, np.nan),
        scale_factor=float("nan"),
        condition=float("inf"),
        parameters=tuple(replace(each, u=None, u_fit=None, status="undetermined") for each in good.fit.parameters),
    )
    statistics = replace(
        good.diagnosis.statistics,
        reduced_chi_square=None,
        chi_square_p=None,
        aicc=None,
        bic=None,
        durbin_watson=None,
        lag1_correlation=None,
        runs_test_p=None,
    )
    diagnosis = replace(good.diagnosis, statistics=statistics, verdict="The fit did not converge: nothing is known.")
    blank = np.full_like(good.derived.table.temperature, np.nan)
    table = replace(
        good.derived.table,
        u_reasons=("the fit did not converge",) * blank.size,
        **{
            f"{name}_{kind}": blank
            for name in ("heat_capacity", "energy", "entropy", "free_energy_function")
            for kind in ("u", "u_fit")
        },
    )
    derived = replace(
        good.derived,
        table=table,
        characteristic_temperatures=tuple(
            replace(each, value=None, u=None, u_fit=None, status="undetermined", reason="the fit did not converge")
            for each in good.derived.characteristic_temperatures
        ),
        zero_point_energy=replace(
            good.derived.zero_point_energy,
            value=None,
            u=None,
            u_fit=None,
            status="undetermined",
            reason="the fit did not converge",
        ),
    )
    return replace(good, fit=nothing, diagnosis=diagnosis, derived=derived)


def renamed(analysis: Analysis, name: str) -> Analysis:
    """The same analysis of a sample with another name and, for every run, that name as label."""
    measurement = replace(
        analysis.measurement,
        sample=replace(analysis.measurement.sample, name=name),
        readings=tuple(replace(each, label=name) for each in analysis.measurement.readings),
    )
    return replace(analysis, measurement=measurement, prepared=replace(analysis.prepared, measurement=measurement))
