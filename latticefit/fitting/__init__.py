"""Start values, minimisation and the record of a fit."""

from .covariance import Covariance, at_bounds, covariance
from .fit import fit_model, refuse_cp_cv_of_cv, requested_model
from .setup import default_mode_sum, parametrise
from .solve import Solution, minimise, minimise_with_lmfit
from .start import SearchResult, search

__all__ = [
    "Covariance",
    "SearchResult",
    "Solution",
    "at_bounds",
    "covariance",
    "default_mode_sum",
    "fit_model",
    "minimise",
    "minimise_with_lmfit",
    "parametrise",
    "refuse_cp_cv_of_cv",
    "requested_model",
    "search",
]
