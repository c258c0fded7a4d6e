"""What was fitted and found: parameters, covariance, residuals, validity, warnings."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from .base import FloatArray, Frozen, Level, LevelVerdict, ParameterStatus

__all__ = [
    "Candidate",
    "Comparison",
    "Diagnosis",
    "FitRecord",
    "HeldParameters",
    "LackOfFit",
    "LevelExplanation",
    "LevelFinding",
    "NamedWarning",
    "ParameterValue",
    "ResidualBand",
    "ResidualStatistics",
    "ValidityFact",
]


@dataclass(frozen=True)
class ParameterValue:
    """One parameter of the model with its uncertainty (k = 1), unit and status.

    `u` is the standard uncertainty that latticefit stands behind, `u_fit` the one from the covariance alone; both
    None where undetermined, 0 where fixed.
    """

    name: str
    value: float
    u: float | None
    u_fit: float | None
    unit: str
    status: ParameterStatus
    low: float
    high: float
    start: float
    meaning: str


@dataclass(frozen=True, eq=False)
class FitRecord(Frozen):
    """Result of one fit: enough to evaluate the model again without the data.

    Attributes
    ----------
    terms : str
        The model expression in its standard spelling, e.g. ``"debye + 2 einstein"``.
    mode_sum : {"fixed", "free"}
        Whether the modes are held at 3 per atom.
    atoms : float or None
        Atoms per formula unit.
    names : tuple of str, length p
        Every parameter of the model, free or not.
    values : ndarray, shape (p,)
        Their values in SI (K; modes; J/(mol K^2); mol/J; 1/K).
    covariance : ndarray, shape (p, p)
        Of all parameters, of kind `covariance_kind`; rows of fixed parameters are zero, tied ones are filled in.
        Directions that the data do not determine are left out of it; the parameters concerned have the status
        "undetermined".
    scale_factor : float
        Reduced chi-square; what an absolute covariance would be multiplied by (already done when "scaled").
    condition : float
        Condition number of the covariance of the free parameters scaled to unit diagonal.
    carried : ndarray, shape (p, p), or None
        The part of `covariance` that comes from the uncertainty of held parameters; no misfit enlarges it.
    starts_tried, distinct_minima : int
        Local fits made to find the minimum, and distinct minima found within a chi-square of 4 of the best.
    """

    terms: str
    mode_sum: Literal["fixed", "free"]
    cp_cv: str
    atoms: float | None
    names: tuple[str, ...]
    values: FloatArray
    covariance: FloatArray
    parameters: tuple[ParameterValue, ...]
    covariance_kind: Literal["absolute", "scaled"]
    scale_factor: float
    condition: float
    converged: bool
    message: str
    chi_square: float
    degrees_of_freedom: int
    free_parameters: int
    evaluations: int
    starts_tried: int
    distinct_minima: int
    carried: FloatArray | None = None


@dataclass(frozen=True)
class ResidualBand:
    """Residuals of one temperature decade: how many points, rms and largest in percent of the model."""

    temperature_low: float
    temperature_high: float
    points: int
    rms_percent: float
    max_abs_percent: float


@dataclass(frozen=True)
class LackOfFit:
    """What the residuals are made of where points stand in sets of repeats.

    `pure_error` is the sum of squares within sets, divided by sigma squared, with its degrees of freedom, and
    `pure_error_percent` the relative standard deviation that it means; `lack_of_fit` is what is left of chi-square,
    between the sets. `f` compares the two per degree of freedom, and `p` is its upper tail. `shared_error` is None
    where it cannot be told whether a set shares an error, else whether neighbouring sets differ, without any model, by
    more than their spread within explains.
    """

    pure_error: float
    pure_error_degrees_of_freedom: int
    pure_error_percent: float
    lack_of_fit: float
    degrees_of_freedom: int
    f: float
    p: float
    shared_error: bool | None


@dataclass(frozen=True)
class ResidualStatistics:
    """Numbers on the residuals of the fitted points; None where they are not defined.

    `entropy_miss` is the integral of residual/T over the fitted points, J/(mol K), and `energy_miss` that of the
    residual, J/mol: what S and H of the model lack over the measured range. `run_means_percent` has one mean residual
    for each run, NaN where none of its points is fitted. `lack_of_fit` is None where no points stand in sets of
    repeats.
    """

    reduced_chi_square: float | None
    chi_square_p: float | None
    aicc: float | None
    bic: float | None
    rms_percent: float
    max_abs_percent: float
    max_abs_percent_temperature: float
    durbin_watson: float | None
    lag1_correlation: float | None
    runs_test_p: float | None
    longest_run: int
    bands: tuple[ResidualBand, ...]
    entropy_miss: float
    energy_miss: float
    run_means_percent: tuple[float, ...]
    lack_of_fit: LackOfFit | None = None


@dataclass(frozen=True)
class ValidityFact:
    """One yes-or-no fact on the fit: what was asked, whether it holds, and the number behind it in words."""

    name: str
    holds: bool
    detail: str


@dataclass(frozen=True)
class NamedWarning:
    """A named finding: code in kebab-case, level, what it concerns, and what to do next."""

    code: str
    level: Level
    concerns: str
    message: str
    found: float | str | None
    threshold: float | str | None
    advice: str


@dataclass(frozen=True, eq=False)
class Diagnosis(Frozen):
    """Residuals of the fitted points and what they say.

    Attributes
    ----------
    model, residual, residual_percent, residual_normalised : ndarray, shape (n,)
        For the fitted points in the order of `PreparedData`: model in J/(mol K), measured - model in J/(mol K), the
        same in percent of the model, and divided by sigma.
    model_all : ndarray, shape (m,)
        The model at every point of the measurement, fitted or not, in its order.
    describes : bool
        Whether the model describes the data.
    verdict : str
        The same in one or two sentences.
    """

    model: FloatArray
    residual: FloatArray
    residual_percent: FloatArray
    residual_normalised: FloatArray
    model_all: FloatArray
    statistics: ResidualStatistics
    validity: tuple[ValidityFact, ...]
    describes: bool
    verdict: str
    warnings: tuple[NamedWarning, ...]


@dataclass(frozen=True)
class LevelExplanation:
    """One slip that would explain the level of a heat capacity.

    Attributes
    ----------
    slip : str
        Its kind, e.g. ``"unit"``, ``"hydrate-water"``, ``"molar-mass"``.
    words : str
        What was slipped, e.g. ``"a molar mass without its 2 H2O"``.
    expected : float or None
        By what factor of the right one the slip changes the level; the mode sum over 3 per atom that it gives. None
        where it has no factor of its own (addenda, temperatures) or where several numbers of H2O fit.
    remedy : str
        What to do where it is the reason.
    """

    slip: str
    words: str
    expected: float | None
    remedy: str


@dataclass(frozen=True)
class LevelFinding:
    """Whether the level of a heat capacity is possible for its formula, and what would explain it where it is not.

    Attributes
    ----------
    verdict : {"plausible", "suspicious", "impossible", "not judged"}
    reason : str or None
        Why it cannot be judged.
    temperature : float or None
        The highest temperature of the points that are fitted, K.
    ratio_to_classical : float or None
        C there over 3nR.
    theta_low, theta_high : float or None
        Range of the Debye temperatures that single points have, K: of those above 50 K where there are any; None where
        no point has one.
    mode_sum_ratio, mode_sum_u : float or None
        Modes that the data show by their shape, over 3 per atom, with standard uncertainty; None where the data end
        below theta/2 or are too few.
    explanations : tuple of LevelExplanation
        At most three slips, the best first; empty where the level is plausible.
    sentence : str
        All of it in one sentence with numbers.
    """

    verdict: LevelVerdict
    reason: str | None
    temperature: float | None
    ratio_to_classical: float | None
    theta_low: float | None
    theta_high: float | None
    mode_sum_ratio: float | None
    mode_sum_u: float | None
    explanations: tuple[LevelExplanation, ...]
    sentence: str


@dataclass(frozen=True, eq=False)
class HeldParameters(Frozen):
    """Fixed parameters that carry an uncertainty of their own: names, and covariance in SI, shape (h, h)."""

    names: tuple[str, ...]
    covariance: FloatArray


@dataclass(frozen=True)
class Candidate:
    """One candidate model on the data of a comparison.

    `delta_aicc` is relative to the best plausible candidate; `weight` is the Akaike weight among the plausible ones
    (0 for the others); `reasons` say why a candidate is not plausible.
    """

    terms: str
    mode_sum: Literal["fixed", "free"]
    cp_cv: str
    free_parameters: int
    chi_square: float
    reduced_chi_square: float | None
    aicc: float | None
    bic: float | None
    delta_aicc: float | None
    weight: float
    plausible: bool
    reasons: tuple[str, ...]


@dataclass(frozen=True)
class Comparison:
    """Candidates on the same points with the same sigmas, the position of the chosen one, and why, in one sentence.

    `dropped` names the candidates that could not be fitted at all, each with its reason.
    """

    candidates: tuple[Candidate, ...]
    chosen: int
    because: str
    dropped: tuple[str, ...] = ()
