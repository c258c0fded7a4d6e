"""Named warnings: how far the data reach."""

from __future__ import annotations

from ..records import NamedWarning
from .case import Case
from .reach import REACH_STOP, REACH_WARN, TOP_STOP, high_temperature_ratio, low_temperature_reach, theta_debye_two

__all__ = [
    "cp_cv_from_melting_point",
    "cp_cv_missing",
    "gamma_reach",
    "reach_down",
    "reach_up",
]

_HALF = 0.5
_COLD, _COLD_THETA = 3.0, 60.0  # K, and theta over this: where gamma can be seen


def reach_down(case: Case) -> NamedWarning | None:
    """The lowest point is too high for theta_D(T->0)."""
    reach = low_temperature_reach(case.model, case.fit, float(case.prepared.temperature[0]))
    if reach is None or reach.status == "reached":
        return None
    stop = reach.status == "withheld"
    return NamedWarning(
        code="low-temperature-reach",
        level="stop" if stop else "warn",
        concerns="theta_debye_low_temperature",
        message=(
            f"{reach.reason}; theta_D(T->0) follows from the choice of model, not from the data: "
            f"{'it is withheld' if stop else 'quote it only with that remark'}"
        ),
        found=reach.ratio,
        threshold=REACH_STOP if stop else REACH_WARN,
        advice=f"measure a few points between {reach.theta / 100:.2g} and {reach.theta / REACH_WARN:.2g} K",
    )


def reach_up(case: Case) -> NamedWarning | None:
    """The highest point is too low for the moments of the spectrum."""
    ratio = high_temperature_ratio(case.model, case.fit, float(case.prepared.temperature[-1]))
    if ratio is None or ratio <= TOP_STOP:
        return None
    return NamedWarning(
        code="high-temperature-reach",
        level="stop",
        concerns="theta_debye_moment, zero_point_energy",
        message=(
            f"the data end at {case.prepared.temperature[-1]:.4g} K, theta_D[m=2]/{ratio:.2g}: most modes are not "
            "excited yet, so moments and zero-point energy follow from the choice of model and are withheld"
        ),
        found=ratio,
        threshold=TOP_STOP,
        advice="measure to higher temperatures; values above the data are extrapolated and carry no u",
    )


def gamma_reach(case: Case) -> NamedWarning | None:
    """An electronic term is free and no point lies low enough to see it beside the dispersion of the lattice."""
    free = [each for each in case.fit.parameters if each.name == "electronic_gamma" and each.status == "fitted"]
    limit = max(_COLD, theta_debye_two(case.model, case.fit) / _COLD_THETA)
    lowest = float(case.prepared.temperature[0])
    reach = low_temperature_reach(case.model, case.fit, lowest)
    in_law = reach is None or reach.status != "withheld"
    if not free or (lowest <= limit and in_law):
        return None
    return NamedWarning(
        code="gamma-reach",
        level="warn",
        concerns="electronic_gamma",
        message=(
            f"from {lowest:.3g} K up dispersion of the lattice alone can make up a gamma; it is seen below "
            f"{limit:.2g} K, with the lattice in its T^3 range"
        ),
        found=lowest,
        threshold=limit,
        advice="fix gamma from other knowledge, leave the term out, or measure lower",
    )


def cp_cv_missing(case: Case) -> NamedWarning | None:
    """Cp data reach high enough to need a form of Cp - Cv, and the model has none."""
    if case.prepared.measurement.quantity != "Cp" or case.model.cp_cv.parameter is not None:
        return None
    theta = theta_debye_two(case.model, case.fit)
    ratio = float(case.prepared.temperature[-1]) / theta
    if ratio <= _HALF:
        return None
    return NamedWarning(
        code="cp-cv-missing",
        level="warn",
        concerns="theta_debye_moment, modes",
        message=(
            f"the data are Cp up to {ratio:.2g} times theta_D[m=2] = {theta:.4g} K, where Cp-Cv is 1 % or more, and "
            "the model has no form for it"
        ),
        found=ratio,
        threshold=_HALF,
        advice="use --cp-cv nernst-lindemann; characteristic temperatures are biased without it, S and H hardly",
    )


def cp_cv_from_melting_point(case: Case) -> NamedWarning | None:
    """The Cp - Cv coefficient comes from the melting point."""
    melting_point, atoms = case.prepared.measurement.sample.melting_point, case.fit.atoms
    rule, last = case.model.cp_cv.from_melting_point, case.fit.parameters[-1]
    if rule is None or melting_point is None or atoms is None or last.status != "fixed":
        return None
    if last.value != rule(atoms, melting_point):  # held by the user at a value of their own
        return None
    return NamedWarning(
        code="cp-cv-from-melting-point",
        level="warn",
        concerns=last.name,
        message=(
            f"the coefficient of Cp-Cv is held at {last.value:.3g} {last.unit}, what the melting point, "
            f"{melting_point:.5g} K, gives for {case.fit.cp_cv}; that rule is good to tens of percent and its error is "
            "in no u"
        ),
        found=last.value,
        threshold=None,
        advice="leave the melting point out and let the coefficient be fitted where the data reach above theta/2",
    )
