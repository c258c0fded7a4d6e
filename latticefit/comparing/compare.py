"""Candidates on the same data: fitted, ranked, and one chosen, with the reason in one sentence."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from math import exp, inf

from ..diagnosing import akaike, bayes
from ..errors import FitError, InputError, LatticefitError
from ..fitting import fit_model
from ..records import Candidate, Comparison, FitRecord, HeldParameters, ModelSettings, PreparedData
from .ladder import candidates
from .plausible import objections

__all__ = ["TIE", "Compared", "choose", "compare", "name_of"]

TIE = 2.0
"""AICc differences up to this are ties (K. P. Burnham and D. R. Anderson, Model Selection and Multimodel Inference,
2nd ed., Springer (2002))."""

_FAR = 20.0  # differences of AICc above which a candidate is called far worse


@dataclass(frozen=True)
class Compared:
    """A comparison, and the fit and settings of the candidate that was chosen."""

    comparison: Comparison
    fit: FitRecord
    settings: ModelSettings


def compare(
    prepared: PreparedData,
    settings: ModelSettings,
    seed: int = 0,
    held: HeldParameters | None = None,
    progress: Callable[[str], None] | None = None,
) -> Compared:
    """Fit every candidate to the same points with the same sigmas and choose one.

    Parameters
    ----------
    prepared : PreparedData
    settings : ModelSettings
        With `terms` named there is one candidate; without, those of the ladder.
    seed : int
    held : HeldParameters, optional
        Uncertainty of fixed parameters.
    progress : callable, optional
        Called with a few words at the beginning.

    Raises
    ------
    InputError, FitError
        What stands against the first candidate, when none can be fitted.
    """
    tell = progress or (lambda words: None)
    wanted = (settings,) if settings.terms is not None else candidates(prepared, settings, seed)
    fits: list[tuple[ModelSettings, FitRecord]] = []
    count = prepared.temperature.size
    if settings.terms is None:
        tell(f"comparing {len(wanted)} candidate models on {count} points")
    else:
        tell(f"fitting {settings.terms} to {count} points")
    dropped: list[tuple[ModelSettings, LatticefitError]] = []
    for each in wanted:
        try:
            fits.append((each, fit_model(prepared, each, seed, held)))
        except (InputError, FitError) as error:
            dropped.append((each, error))
    if not fits:
        raise dropped[0][1]
    rows = _with_weights([_candidate(prepared, fit) for _, fit in fits])
    chosen, because = _named() if settings.terms is not None else choose(rows)
    reasons = tuple(f"{name_of(each.terms or '', each.cp_cv)}: {error}" for each, error in dropped)
    return Compared(Comparison(rows, chosen, because, reasons), fits[chosen][1], fits[chosen][0])


def name_of(terms: str, cp_cv: str | None) -> str:
    """Name of a candidate for people: its terms, and its form of Cp - Cv where it has one."""
    return terms if cp_cv in (None, "none") else f"{terms}, {cp_cv}"


def _named() -> tuple[int, str]:
    return 0, "the terms were named by the user"


def _candidate(prepared: PreparedData, fit: FitRecord) -> Candidate:
    n, k = prepared.temperature.size, fit.free_parameters
    aicc = akaike(fit.chi_square, k, n, not prepared.sigma_assumed)
    reasons = objections(fit, float(prepared.temperature[0]))
    if aicc is None:
        reasons = (*reasons, f"{n} points are too few to rank {k} parameters")
    return Candidate(
        terms=fit.terms,
        mode_sum=fit.mode_sum,
        cp_cv=fit.cp_cv,
        free_parameters=k,
        chi_square=fit.chi_square,
        reduced_chi_square=fit.chi_square / fit.degrees_of_freedom if fit.degrees_of_freedom else None,
        aicc=aicc,
        bic=bayes(fit.chi_square, k, n, not prepared.sigma_assumed),
        delta_aicc=None,
        weight=0.0,
        plausible=not reasons,
        reasons=reasons,
    )


def _with_weights(rows: list[Candidate]) -> tuple[Candidate, ...]:
    """Differences of AICc to the best plausible candidate, and Akaike weights among the plausible ones."""
    ranked = [row.aicc for row in rows if row.plausible and row.aicc is not None]
    known = [row.aicc for row in rows if row.aicc is not None]
    if not known:
        return tuple(rows)
    best = min(ranked or known)
    total = sum(exp((best - each) / 2) for each in ranked)
    return tuple(
        replace(
            row,
            delta_aicc=None if row.aicc is None else row.aicc - best,
            weight=exp((best - row.aicc) / 2) / total if row.plausible and row.aicc is not None else 0.0,
        )
        for row in rows
    )


def _rank(row: Candidate) -> float:
    return inf if row.aicc is None else row.aicc


def choose(rows: tuple[Candidate, ...]) -> tuple[int, str]:
    """Return the position of the chosen candidate and why, in one sentence.

    Of the plausible candidates those within 2 of the lowest AICc are ties; the fewest parameters win, then the lower
    AICc. Where none is plausible the lowest AICc is taken and the sentence says so.
    """
    plausible = [k for k, row in enumerate(rows) if row.plausible]
    if not plausible:
        k = min(range(len(rows)), key=lambda i: _rank(rows[i]))
        objection = rows[k].reasons[0]
        return k, f"no candidate is plausible; this one has the lowest AICc, but {objection}"
    best = min(plausible, key=lambda i: _rank(rows[i]))
    ties = [i for i in plausible if _rank(rows[i]) - _rank(rows[best]) <= TIE]
    chosen = min(ties, key=lambda i: (rows[i].free_parameters, _rank(rows[i])))
    return chosen, _because(rows, chosen, best, ties)


def _because(rows: tuple[Candidate, ...], chosen: int, best: int, ties: list[int]) -> str:
    forms = any(row.cp_cv != "none" for row in rows)

    def name(k: int) -> str:
        row = rows[k]
        bare = f"{row.terms} without Cp-Cv" if forms and row.cp_cv == "none" else name_of(row.terms, row.cp_cv)
        return f"'{bare}'"

    def worse(k: int) -> str:
        difference = _rank(rows[k]) - _rank(rows[best])
        return f"{'far worse' if difference > _FAR else 'worse'} (AICc +{difference:.3g})"

    others = [k for k in ties if k != chosen]
    if others:
        text = f"{_listed([name(k) for k in others])} {'ties' if len(others) == 1 else 'tie'} with {name(chosen)} "
        text += f"(AICc, which charges the quality of a fit for its parameters, differs by less than {TIE:g}); "
        fewest = all(rows[chosen].free_parameters < rows[k].free_parameters for k in others)
        text += "the one with fewer parameters is kept" if fewest else "the lower AICc of those with the fewest is kept"
    else:
        text = f"{name(chosen)} has the lowest AICc (quality of the fit charged for parameters) of the plausible ones"
    rest = [k for k, row in enumerate(rows) if row.plausible and k not in ties and row.aicc is not None]
    if rest:
        runner = min(rest, key=lambda k: _rank(rows[k]))
        text += f"; next is {name(runner)}, {worse(runner)}"
    better = [k for k, row in enumerate(rows) if not row.plausible and _rank(row) < _rank(rows[chosen]) - TIE]
    if better:
        first = min(better, key=lambda k: _rank(rows[k]))
        text += f"; {name(first)} has a lower AICc but {rows[first].reasons[0]}"
    return text


def _listed(names: list[str]) -> str:
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"
