"""Every registered term as an lmfit Model: usable alone, added with ``+``, with `guess` and an analytic Jacobian.

``DebyeModel``, ``EinsteinModel``, ``ElectronicModel`` ... are made from the registry of terms; the independent
variable is T (K), heat capacities are in J/(mol K).
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import lmfit
import numpy as np

from ..constants import GAS_CONSTANT
from ..errors import InputError
from ..records import FloatArray
from ..terms import TERMS, Term

__all__ = ["MODEL_CLASSES", "TermModel", "weighted_jacobian"]


def _function(term: Term) -> Callable[..., FloatArray]:
    """A plain function f(T, theta, modes) with named arguments, as lmfit wants to see them."""
    names = [spec.quantity for spec in term.parameters]

    def heat_capacity(T: FloatArray, *values: float, **named: float) -> FloatArray:
        return term.heat_capacity(np.asarray(T, dtype=float), *values, *(named[name] for name in names[len(values) :]))

    heat_capacity.__name__ = term.name
    # lmfit reads argument names from these when they are given
    heat_capacity.argnames = ["T", *names]  # type: ignore[attr-defined]
    heat_capacity.kwargs = []  # type: ignore[attr-defined]
    return heat_capacity


class TermModel(lmfit.Model):  # type: ignore[misc]
    """An lmfit Model of one registered term.

    Parameters
    ----------
    prefix : str
        Put before the parameter names; at least two characters when models are added.
    """

    term: Term

    def __init__(self, prefix: str = "", **kws: Any) -> None:
        kws.setdefault("nan_policy", "raise")
        kws.setdefault("independent_vars", ["T"])
        super().__init__(_function(self.term), prefix=prefix, **kws)
        for spec in self.term.parameters:
            start = {"theta": 300.0, "modes": 3.0}.get(spec.quantity, 1e-3)
            self.set_param_hint(spec.quantity, value=start, min=spec.low, max=spec.high)

    def guess(self, data: FloatArray, T: FloatArray, **kws: Any) -> lmfit.Parameters:
        """Start values from heat capacities `data` (J/(mol K)) at T (K).

        Modes from the largest heat capacity (Dulong and Petit), theta from the temperature of half of it, linear
        coefficients from the ratio to T at the lowest point.
        """
        data, T = np.asarray(data, dtype=float), np.asarray(T, dtype=float)
        values: dict[str, float] = {}
        largest = float(data.max())
        for spec in self.term.parameters:
            if spec.quantity == "modes":
                values["modes"] = largest / GAS_CONSTANT
            elif spec.quantity == "theta":
                half = float(T[np.argmin(np.abs(data - largest / 2))])
                values["theta"] = (4.0 if self.term.name == "debye" else 3.0) * half
            else:
                lowest = int(np.argmin(T))
                values[spec.quantity] = float(data[lowest] / T[lowest])
        return lmfit.models.update_param_vals(self.make_params(**values), self.prefix, **kws)

    def partials(self, parameters: lmfit.Parameters, T: FloatArray) -> dict[str, FloatArray]:
        """Derivatives of the term with respect to each of its parameters, by full name, each of shape (n,)."""
        names = [self.prefix + spec.quantity for spec in self.term.parameters]
        columns = self.term.partials(np.asarray(T, dtype=float), *(parameters[name].value for name in names))
        return dict(zip(names, columns, strict=True))


def _collect(model: lmfit.Model, parameters: lmfit.Parameters, T: FloatArray) -> dict[str, FloatArray]:
    if isinstance(model, TermModel):
        return model.partials(parameters, T)
    if isinstance(model, lmfit.model.CompositeModel) and getattr(model.op, "__name__", "") == "add":
        return _collect(model.left, parameters, T) | _collect(model.right, parameters, T)
    raise InputError("an analytic Jacobian is known only for latticefit's term models added with '+'")


def weighted_jacobian(model: lmfit.Model) -> Callable[..., FloatArray]:
    """Return a function to pass as ``fit_kws={"Dfun": ...}`` to ``model.fit``.

    lmfit's residual is (data - model) weights, so the columns are minus the partials times the weights, for the
    varying parameters in their order; a new array every call, because lmfit scales it in place.

    Parameters
    ----------
    model : lmfit.Model
        A `TermModel` or several added with ``+``. Parameters must not be tied by expressions (lmfit applies no
        chain rule to them): hold a mode sum by `latticefit.fit` instead.

    Raises
    ------
    InputError
        For another kind of model, or for a parameter with an expression.
    """

    def dfun(parameters: lmfit.Parameters, data: FloatArray, weights: FloatArray | None, T: FloatArray) -> FloatArray:
        tied = [name for name, each in parameters.items() if each.expr]
        if tied:
            raise InputError(f"parameter {tied[0]!r} has an expression; the analytic Jacobian does not follow it")
        columns = _collect(model, parameters, T)
        stacked = np.stack([-columns[name] for name, each in parameters.items() if each.vary], axis=1)
        return stacked if weights is None else stacked * np.asarray(weights, dtype=float)[:, None]

    return dfun


MODEL_CLASSES: dict[str, type[TermModel]] = {
    f"{term.name.capitalize()}Model": type(
        f"{term.name.capitalize()}Model",
        (TermModel,),
        {"term": term, "__doc__": f"lmfit Model of the {term.name} term. {term.source}.", "__module__": __name__},
    )
    for term in TERMS.values()
}
"""The lmfit Model classes by name, one for each registered term."""

globals().update(MODEL_CLASSES)
