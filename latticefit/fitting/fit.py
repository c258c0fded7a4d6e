"""From prepared data and a named model to a FitRecord."""

from __future__ import annotations

from dataclasses import replace
from typing import Literal, cast

import numpy as np
from numpy.typing import NDArray

from ..errors import FitError, InputError
from ..models import Model, Parametrisation, build_model
from ..records import (
    FitRecord,
    FloatArray,
    HeldParameters,
    ModelSettings,
    ParameterStatus,
    ParameterValue,
    PreparedData,
)
from .covariance import Covariance, at_bounds, carried_covariance, covariance
from .setup import check_names, default_mode_sum, parametrise
from .solve import Solution, minimise_with_lmfit
from .start import SearchResult, search

__all__ = ["fit_model", "refuse_cp_cv_of_cv", "requested_model"]


def requested_model(settings: ModelSettings) -> Model:
    """Return the model that is asked for: all that can be checked of a request before there are data.

    Raises
    ------
    InputError
        Without terms, for an unknown term or form of Cp-Cv, and for names that the model does not have.
    """
    if settings.terms is None:
        raise InputError("no model is named; give its terms, e.g. 'debye + einstein'")
    model = build_model(settings.terms, settings.cp_cv or "none")
    check_names(model, settings)
    return model


def refuse_cp_cv_of_cv(prepared: PreparedData, settings: ModelSettings) -> None:
    """Refuse a form of Cp - Cv for data that are Cv (InputError)."""
    if prepared.measurement.quantity == "Cv" and settings.cp_cv not in (None, "none"):
        raise InputError(
            f"the data are Cv, so there is no Cp-Cv to describe; leave --cp-cv {settings.cp_cv} out "
            "(or say --quantity Cp if they are heat capacities at constant pressure)"
        )


def fit_model(
    prepared: PreparedData, settings: ModelSettings, seed: int = 0, held: HeldParameters | None = None
) -> FitRecord:
    """Fit one model, without a guess.

    Parameters
    ----------
    prepared : PreparedData
    settings : ModelSettings
        With `terms` named.
    seed : int
        For the few starts that are drawn at random.
    held : HeldParameters, optional
        Uncertainty of fixed parameters, carried on to everything; without it they are taken as exact.

    Returns
    -------
    FitRecord
        The covariance is absolute where the sigmas are stated; where they are estimated it is scaled by the reduced
        chi-square (R. T. Birge, Phys. Rev. 40, 207 (1932)).

    Raises
    ------
    InputError
        For a model that cannot be fitted to these data.
    FitError
        When no minimum was found although the request is in order.
    """
    model = requested_model(settings)
    sample = prepared.measurement.sample
    data = (prepared.temperature, prepared.heat_capacity, prepared.sigma)
    refuse_cp_cv_of_cv(prepared, settings)
    if sample.insulator and any(each.term.name == "electronic" for each in model.placed):
        raise InputError(
            f"the sample is declared an insulator, but {model.expression!r} has an electronic term; leave one of the "
            "two out"
        )
    par = parametrise(model, settings, sample, data[0], data[1])
    if data[0].size < par.free.size:
        raise InputError(
            f"{data[0].size} points are too few for the {par.free.size} free parameters of {model.expression!r}; "
            "use fewer terms, fix a parameter, or widen the window"
        )
    found = search(par, *data, dict(settings.start), seed)
    solution = minimise_with_lmfit(found.best.parametrisation, found.best.values, *data)
    if not np.isfinite(solution.chi_square) or not np.isfinite(solution.values).all():
        raise FitError(
            f"{model.expression!r} could not be fitted to these data: {solution.message}; use fewer terms, or check "
            "bounds and fixed values"
        )
    return _record(prepared, settings, model, found, solution, held)


def _record(
    prepared: PreparedData,
    settings: ModelSettings,
    model: Model,
    found: SearchResult,
    solution: Solution,
    held: HeldParameters | None,
) -> FitRecord:
    data = (prepared.temperature, prepared.heat_capacity, prepared.sigma)
    par, values = solution.parametrisation, solution.values
    bound = at_bounds(par, values, *data)
    interior = par.hold(bound, values)
    absolute = covariance(interior, values, *data)
    dof = data[0].size - par.free.size
    reduced = solution.chi_square / dof if dof > 0 else 1.0
    scaled = prepared.sigma_kind == "estimated"
    matrix = absolute.matrix * (reduced if scaled else 1.0)
    carried = np.zeros_like(matrix) if held is None else carried_covariance(interior, values, *data, held)
    matrix = matrix + carried
    # misfit enlarges what comes from the data, not what held parameters bring along
    stated = (matrix - carried) * (1.0 if scaled else max(1.0, reduced)) + carried
    status = _statuses(par, bound, absolute, values, np.sqrt(np.diag(matrix)))
    order = _sorted_order(model, values, settings)
    parameters = _parameters(model, par, values, (matrix, stated), status, found.best.values, order)
    return FitRecord(
        terms=model.expression,
        mode_sum=cast(Literal["fixed", "free"], default_mode_sum(settings, prepared.measurement.sample)),
        cp_cv=model.cp_cv.name,
        atoms=prepared.measurement.sample.atoms,
        names=model.names,
        values=values[order],
        covariance=matrix[np.ix_(order, order)],
        parameters=parameters,
        covariance_kind="scaled" if scaled else "absolute",
        scale_factor=reduced,
        condition=absolute.condition,
        converged=solution.converged,
        message=solution.message,
        chi_square=solution.chi_square,
        degrees_of_freedom=dof,
        free_parameters=int(par.free.size),
        evaluations=solution.evaluations,
        starts_tried=found.starts_tried,
        distinct_minima=found.distinct_minima,
        carried=None if held is None else carried[np.ix_(order, order)],
    )


def _statuses(
    par: Parametrisation, bound: NDArray[np.intp], cov: Covariance, values: FloatArray, u: FloatArray
) -> list[ParameterStatus]:
    status: list[ParameterStatus] = []
    for i, spec in enumerate(par.model.specs):
        if i == par.tied:
            status.append("tied")
        elif i not in par.free:
            status.append("fixed")
        elif i in bound:
            status.append("at_bound")
        elif i in cov.undetermined or (spec.role == "scale" and u[i] > values[i]):
            status.append("undetermined")
        else:
            status.append("fitted")
    return status


def _parameters(
    model: Model,
    par: Parametrisation,
    values: FloatArray,
    covariances: tuple[FloatArray, FloatArray],
    status: list[ParameterStatus],
    start: FloatArray,
    order: NDArray[np.intp],
) -> tuple[ParameterValue, ...]:
    """Every parameter, equal terms in their order and named by their new places."""
    found = [_parameter(i, model, par, values, covariances, status[i], float(start[i])) for i in order]
    return tuple(replace(each, name=name) for each, name in zip(found, model.names, strict=True))


def _parameter(
    i: int,
    model: Model,
    par: Parametrisation,
    values: FloatArray,
    covariances: tuple[FloatArray, FloatArray],
    status: ParameterStatus,
    start: float,
) -> ParameterValue:
    spec = model.specs[i]
    u_fit, u = (float(np.sqrt(max(each[i, i], 0.0))) for each in covariances)
    # a mode count that follows from others, every one of them at a bound, is no better known than they are
    stuck = status == "tied" and u_fit == 0 and any(k in par.free for k in par.others)
    given = status not in ("undetermined", "at_bound") and not stuck
    return ParameterValue(
        name=model.names[i],
        value=float(values[i]),
        u=u if given else None,
        u_fit=u_fit if given else None,
        unit=spec.unit,
        status=status,
        low=float(par.low[i]),
        high=float(par.high[i]),
        start=start,
        meaning=spec.meaning,
    )


def _sorted_order(model: Model, values: FloatArray, settings: ModelSettings) -> NDArray[np.intp]:
    """Positions that put equal terms in order of theta, unless the user names one of their parameters."""
    named = {*settings.start, *settings.fix, *settings.bounds}
    order = np.arange(len(model.names))
    kinds = {each.term.name for each in model.placed}
    for kind in kinds:
        same = [each for each in model.placed if each.term.name == kind]
        if len(same) < 2 or any(model.names[i] in named for each in same for i in range(*each.slice.indices(10**6))):
            continue
        scale = next(k for k, spec in enumerate(same[0].term.parameters) if spec.role == "scale")
        ranked = sorted(same, key=lambda each: values[each.slice.start + scale])
        for place, each in zip(same, ranked, strict=True):
            order[place.slice] = np.arange(each.slice.start, each.slice.stop)
    return order
