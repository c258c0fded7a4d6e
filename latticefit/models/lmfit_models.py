"""Every registered term as an lmfit Model: usable alone, added with ``+``, with `guess` and an analytic Jacobian.

``DebyeModel``, ``EinsteinModel``, ``ElectronicModel`` ... follow from the registry of terms when they are first asked
for; the independent variable is T (K), heat capacities are in J/(mol K).
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import lmfit
import numpy as np

from ..errors import InputError
from ..records import FloatArray
from ..terms import TERMS, Term

__all__ = ["TermModel", "weighted_jacobian"]


class _HeatCapacity:
    """The heat capacity of a term as lmfit wants to see it: f(T, theta, modes) with named arguments."""

    def __init__(self, term: Term) -> None:
        self.term = term
        self.__name__ = term.name
        # lmfit reads argument names from these when they are given
        self.argnames = ["T", *(spec.quantity for spec in term.parameters)]
        self.kwargs: list[tuple[str, Any]] = []

    def __call__(self, T: FloatArray, *values: float, **named: float) -> FloatArray:
        rest = self.argnames[1 + len(values) :]
        return self.term.heat_capacity(np.asarray(T, dtype=float), *values, *(named[name] for name in rest))


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
        super().__init__(_HeatCapacity(self.term), prefix=prefix, **kws)
        for spec in self.term.parameters:
            self.set_param_hint(spec.quantity, value=spec.example, min=spec.low, max=spec.high)

    def guess(self, data: FloatArray, T: FloatArray, **kws: Any) -> lmfit.Parameters:
        """Start values from heat capacities `data` (J/(mol K)) at T (K) that this term alone describes.

        By the term's own `guess`; for a term without one, the examples of its parameters with the amplitudes scaled
        by one factor that fits the data best.
        """
        data, T = np.asarray(data, dtype=float), np.asarray(T, dtype=float)
        values = (self.term.guess or self._scaled_examples)(T, data)
        named = {spec.quantity: value for spec, value in zip(self.term.parameters, values, strict=True)}
        return lmfit.models.update_param_vals(self.make_params(**named), self.prefix, **kws)

    def _scaled_examples(self, T: FloatArray, data: FloatArray) -> tuple[float, ...]:
        expected = self.term.heat_capacity(T, *(spec.example for spec in self.term.parameters))
        factor = float(data @ expected) / float(expected @ expected)
        return tuple(spec.example * (factor if spec.role == "amplitude" else 1.0) for spec in self.term.parameters)

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


_CLASSES: dict[str, type[TermModel]] = {}


def __getattr__(name: str) -> type[TermModel]:
    """Return the lmfit Model class of a registered term, made on first use and the same one ever after."""
    for term in TERMS.values():
        if term.model_class_name == name:
            if name not in _CLASSES or _CLASSES[name].term is not term:
                doc = f"lmfit Model of the {term.name} term. {term.source}."
                _CLASSES[name] = type(name, (TermModel,), {"term": term, "__doc__": doc, "__module__": __name__})
            return _CLASSES[name]
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
