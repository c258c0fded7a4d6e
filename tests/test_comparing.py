"""The ladder, plausibility, ranking and the choice."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from helpers import invented_solid, prepared_data

from latticefit.comparing import LADDER, TIE, candidates, choose, compare, objections
from latticefit.errors import InputError
from latticefit.fitting import fit_model
from latticefit.records import Candidate, ModelSettings, PreparedData

T = np.geomspace(2.0, 300.0, 120)
METAL = ("debye + einstein + electronic", [330.0, 2.5, 120.0, 0.5, 7e-4, 4e-6])


def metal(points: np.ndarray = T, **options: object) -> PreparedData:
    return invented_solid(*METAL, points, cp_cv="nernst-lindemann", atoms=1, **options)  # type: ignore[arg-type]


def names(data: PreparedData, settings: ModelSettings | None = None) -> set[tuple[str, str]]:
    return {(each.terms or "", each.cp_cv or "") for each in candidates(data, settings or ModelSettings())}


def test_the_ladder_has_twenty_candidates_where_the_data_see_everything() -> None:
    """Five lattices, each with and without electrons and Cp-Cv, when points lie below 3 K and above theta/2."""
    assert len(names(metal())) == 4 * len(LADDER) == 20


def test_the_ladder_leaves_out_what_the_data_cannot_see() -> None:
    """No electronic term above max(3 K, theta/60) or for an insulator; no Cp-Cv below theta/2 or for Cv."""
    warm = names(metal(np.geomspace(8.0, 300.0, 80)))
    assert not any("electronic" in terms for terms, _ in warm)
    cold = names(metal(np.geomspace(1.0, 60.0, 80)))
    assert {form for _, form in cold} == {"none"}
    data = metal()
    declared = replace(data.measurement, sample=replace(data.measurement.sample, insulator=True))
    assert not any("electronic" in terms for terms, _ in names(replace(data, measurement=declared)))
    volume = invented_solid("debye + einstein", METAL[1][:4], T, atoms=1, quantity="Cv")
    assert {form for _, form in names(volume)} == {"none"}


def test_a_stiff_solid_shows_its_electrons_at_higher_temperatures() -> None:
    """With theta 900 K a lowest point at 12 K (below theta/60 = 15 K) lets the electronic term into the ladder."""
    data = invented_solid("debye + electronic", [900.0, 3.0, 2e-3], np.geomspace(12.0, 400.0, 80), atoms=1)
    assert any("electronic" in terms for terms, _ in names(data))


def test_a_form_or_parameter_that_is_named_holds_for_every_candidate() -> None:
    """--cp-cv and --fix narrow the ladder; a parameter that no candidate has is refused with the nearest."""
    data = metal()
    assert {form for _, form in names(data, ModelSettings(cp_cv="anharmonic"))} == {"anharmonic"}
    held = names(data, ModelSettings(fix={"electronic_gamma": 7e-4}))
    assert held
    assert all("electronic" in terms for terms, _ in held)
    with pytest.raises(InputError, match="did you mean 'electronic_gamma'"):
        candidates(data, ModelSettings(fix={"electronic_gama": 7e-4}))


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_the_true_model_is_chosen_or_ties(seed: int) -> None:
    """On data of a known model the ladder chooses it, or a simpler one that ties with it."""
    found = compare(metal(seed=seed), ModelSettings()).comparison
    chosen = found.candidates[found.chosen]
    assert (chosen.terms, chosen.cp_cv) == (METAL[0], "nernst-lindemann")
    assert chosen.plausible
    assert found.because


def test_every_candidate_has_the_same_points_and_sigma() -> None:
    """chi2 of the candidates is comparable: a nested richer model never fits worse."""
    found = compare(metal(), ModelSettings()).comparison
    by_name = {(each.terms, each.cp_cv): each.chi_square for each in found.candidates}
    for (terms, form), chi_square in by_name.items():
        richer = (terms.replace("debye", "debye + einstein", 1), form)
        if terms.startswith("debye") and "einstein" not in terms and richer in by_name:
            assert by_name[richer] <= chi_square * (1 + 1e-6)
    weights = [each.weight for each in found.candidates]
    assert sum(weights) == pytest.approx(1.0)
    assert all(each.weight == 0 for each in found.candidates if not each.plausible)
    assert min(each.delta_aicc or 0 for each in found.candidates if each.plausible) == 0


def row(aicc: float, parameters: int, plausible: bool = True, terms: str = "debye") -> Candidate:
    reasons = () if plausible else ("a parameter is at a bound",)
    return Candidate(terms, "fixed", "none", parameters, aicc, aicc, aicc, aicc, None, 0.0, plausible, reasons)


@pytest.mark.parametrize(
    ("rows", "chosen", "words"),
    [
        ([row(10, 3), row(30, 1)], 0, "lowest AICc"),
        ([row(10, 5), row(11.9, 3)], 1, "fewer parameters is kept"),
        ([row(10, 5), row(12.1, 3)], 0, "lowest AICc"),
        ([row(10, 3), row(11, 3)], 0, "lower AICc of those with the fewest"),
        ([row(5, 3, plausible=False), row(10, 2)], 1, "has a lower AICc but a parameter is at a bound"),
        ([row(5, 3, plausible=False), row(10, 2, plausible=False)], 0, "no candidate is plausible"),
    ],
)
def test_the_choice_follows_its_rule(rows: list[Candidate], chosen: int, words: str) -> None:
    """Ties are within 2 of the lowest plausible AICc; the fewest parameters win, then the lower AICc."""
    assert TIE == 2
    found, because = choose(tuple(rows))
    assert found == chosen
    assert words in because


def test_implausible_fits_are_named() -> None:
    """A superfluous electron term, and two terms at one temperature, are found implausible in words."""
    data = invented_solid("debye + einstein", [220.0, 3.5, 610.0, 2.5], T, atoms=2, quantity="Cv")
    surplus = objections(fit_model(data, ModelSettings("debye + einstein + electronic")), 2.0)
    assert any("electronic_gamma" in reason for reason in surplus)
    bounds = {"debye_theta": (300.0, 310.0), "einstein_theta": (300.0, 310.0)}
    close = objections(fit_model(data, ModelSettings("debye + einstein", bounds=bounds)), 2.0)
    assert any("cannot be told apart" in reason for reason in close)
    assert objections(fit_model(data, ModelSettings("debye + einstein")), 2.0) == ()


def test_an_einstein_model_is_not_chosen_where_the_data_cannot_test_it() -> None:
    """From 100 K up an Einstein term may fit best, but it has no acoustic modes; from 2 K up it may be chosen."""
    warm = np.geomspace(100.0, 900.0, 40)
    solid = invented_solid("einstein", [200.0, 3.0], warm, atoms=1, quantity="Cv")
    found = compare(solid, ModelSettings()).comparison
    reasons = {each.terms: each.reasons for each in found.candidates}
    assert any("no acoustic modes" in reason for reason in reasons["einstein"])
    cold = invented_solid("einstein", [200.0, 3.0], np.geomspace(12.0, 300.0, 80), atoms=1, quantity="Cv")
    chosen = compare(cold, ModelSettings()).comparison
    assert chosen.candidates[chosen.chosen].terms == "einstein"


def test_too_few_points_to_rank_are_said_so() -> None:
    """AICc is undefined for n <= k + 1: such a candidate is not plausible, and the reason says why."""
    few = np.array([5.0, 20.0, 60.0, 120.0, 300.0])
    data = invented_solid("debye", [280.0, 6.0], few, atoms=2, quantity="Cv")
    found = compare(data, ModelSettings()).comparison
    assert any("too few to rank" in " ".join(each.reasons) for each in found.candidates)
    assert found.candidates[found.chosen].terms == "debye"


def test_a_named_model_is_one_candidate() -> None:
    """With terms named there is no ladder."""
    found = compare(metal(), ModelSettings("debye")).comparison
    assert len(found.candidates) == 1
    assert found.because == "the terms were named by the user"


def test_an_insulator_with_an_electronic_term_is_refused() -> None:
    """A declared insulator and an electronic term contradict each other."""
    data = prepared_data(T, T, T, atoms=1)
    declared = replace(data.measurement, sample=replace(data.measurement.sample, insulator=True))
    with pytest.raises(InputError, match="declared an insulator"):
        fit_model(replace(data, measurement=declared), ModelSettings("debye + electronic"))


@pytest.mark.parametrize("seed", range(4))
def test_an_assumed_sigma_does_not_let_noise_buy_terms(seed: int) -> None:
    """14 points with 4 % noise and an assumed 1 %: neither a second Einstein term nor electrons are found in noise."""
    points = np.geomspace(4.0, 300.0, 14)
    data = invented_solid("debye + einstein", [240.0, 4.0, 380.0, 2.0], points, noise=0.04, seed=seed, atoms=2)
    assumed = replace(data, sigma=0.01 * np.array(data.heat_capacity), sigma_kind="estimated", sigma_assumed=True)
    found = compare(assumed, ModelSettings()).comparison
    assert found.candidates[found.chosen].free_parameters <= 3


@pytest.mark.parametrize(
    ("settings", "quantity", "words"),
    [
        (ModelSettings(cp_cv="nernst-lindemann"), "Cv", "the data are Cv"),
        (ModelSettings(bounds={"debye_theta": (-5.0, -1.0)}), "Cp", "outside the range"),
        (ModelSettings(fix={"debye_theta": 0.0}), "Cp", "lies outside"),
        (ModelSettings(fix={"debye_modes": 5.0}), "Cp", "add up to 5"),
    ],
)
def test_what_no_candidate_can_follow_is_refused_with_its_own_reason(
    settings: ModelSettings, quantity: str, words: str
) -> None:
    """A request that fails for every candidate is refused with the reason of the first, not with another."""
    data = invented_solid("debye + einstein", METAL[1][:4], T, atoms=1, quantity=quantity)  # type: ignore[arg-type]
    with pytest.raises(InputError, match=words):
        compare(data, settings)


def test_candidates_that_cannot_follow_are_named() -> None:
    """A mode count that only the mixed models can hold leaves the single Debye term out, with its reason."""
    data = invented_solid("debye + einstein", METAL[1][:4], T, atoms=1, quantity="Cv")
    found = compare(data, ModelSettings(fix={"debye_modes": 2.5})).comparison
    assert any(each.startswith("debye: ") and "add up to 2.5" in each for each in found.dropped)
    assert found.candidates[found.chosen].terms == "debye + einstein"
