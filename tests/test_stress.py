"""Odd requests: every one ends in a record or in one sentence, never in another exception or a warning."""

from __future__ import annotations

import warnings

import numpy as np
import pytest
from helpers import invented_solid

from latticefit.deriving import derive
from latticefit.diagnosing import diagnose
from latticefit.errors import LatticefitError
from latticefit.fitting import fit_model
from latticefit.records import ModelSettings, PreparedData

TRUTH = ("debye + einstein + electronic", [330.0, 4.5, 150.0, 1.5, 9e-4])
DATA = {
    "ordinary": invented_solid(*TRUTH, np.geomspace(2, 300, 90), atoms=2),
    "cold": invented_solid(*TRUTH, np.geomspace(0.05, 2, 40), atoms=2),
    "hot": invented_solid(*TRUTH, np.linspace(600, 900, 30), atoms=2),
    "sparse": invented_solid(*TRUTH, np.array([2.0, 6.0, 20.0, 60.0, 110.0, 200.0, 300.0]), atoms=2),
    "Einstein only": invented_solid("einstein", [180.0, 6.0], np.geomspace(15, 300, 60), atoms=2),
}
REQUESTS = {
    "debye": ModelSettings("debye"),
    "einstein": ModelSettings("einstein"),
    "mixed": ModelSettings("debye + einstein"),
    "mixed metal": ModelSettings("debye + einstein + electronic", cp_cv="nernst-lindemann"),
    "free": ModelSettings("debye + einstein + electronic", "free", "anharmonic"),
    "three Debye": ModelSettings("3 debye"),
    "many": ModelSettings("debye + 5 einstein"),
    "too many": ModelSettings("debye + 9 einstein"),
    "narrow theta": ModelSettings("debye + einstein", bounds={"debye_theta": (300, 305)}),
    "theta beyond the data": ModelSettings("debye + einstein", bounds={"einstein_theta": (15000, 20000)}),
    "theta that excludes the data": ModelSettings("debye", bounds={"debye_theta": (900, 1000)}),
    "hardly any modes": ModelSettings("debye + einstein", bounds={"einstein_modes": (0, 1e-7)}),
    "impossible modes": ModelSettings(
        "debye + einstein", bounds={"einstein_modes": (0.1, 0.2), "debye_modes": (0.1, 0.2)}
    ),
    "no modes": ModelSettings("debye + einstein", "free", fix={"debye_modes": 0, "einstein_modes": 0}),
    "all fixed": ModelSettings("debye + einstein", fix={"debye_theta": 330, "einstein_theta": 150, "debye_modes": 4.5}),
    "same theta": ModelSettings("debye + einstein", fix={"debye_theta": 200, "einstein_theta": 200}),
    "gamma in mJ": ModelSettings("debye + electronic", fix={"electronic_gamma": 4.1}),
}


@pytest.mark.slow
@pytest.mark.parametrize("data", DATA.values(), ids=DATA.keys())
@pytest.mark.parametrize("settings", REQUESTS.values(), ids=REQUESTS.keys())
def test_every_request_ends_in_a_record_or_a_sentence(data: PreparedData, settings: ModelSettings) -> None:
    """No traceback, no warning; and no derived value is certain (u = 0) because a parameter was stuck."""
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        try:
            fit = fit_model(data, settings)
        except LatticefitError:
            return
        diagnosis = diagnose(data, fit)
        derived = derive(data, fit, diagnosis.describes)
    if any(each.status in ("at_bound", "undetermined", "fitted") for each in fit.parameters):
        values = [*derived.characteristic_temperatures, derived.zero_point_energy]
        assert not [each.key for each in values if each.u == 0]
        given = derived.table.entropy_u[np.isfinite(derived.table.entropy_u)]
        assert np.all(given > 0)
    assert np.isfinite(derived.table.temperature).all()


def test_a_gamma_typed_in_millijoules_is_named() -> None:
    """gamma = 4.1 J/(mol K^2) alone exceeds the data: the sentence names the unit."""
    with pytest.raises(LatticefitError, match=r"SI units, so 4\.1 mJ/\(mol K\^2\) is 0\.0041"):
        fit_model(DATA["ordinary"], REQUESTS["gamma in mJ"])


def test_einstein_solid_has_no_made_up_low_temperature_theta() -> None:
    """An Einstein solid fitted with a Debye term beside: theta_D(T->0) is not claimed."""
    fit = fit_model(DATA["Einstein only"], REQUESTS["mixed"])
    derived = derive(DATA["Einstein only"], fit)
    theta = derived.characteristic_temperatures[0]
    assert theta.key == "theta_debye_low_temperature"
    assert theta.status == "undetermined"
    assert theta.value is None


def test_cold_data_withhold_moments_and_zero_point_energy() -> None:
    """Data that end at 2 K give theta_D(T->0) but neither moments nor the zero-point energy."""
    fit = fit_model(DATA["cold"], ModelSettings("debye + electronic"))
    derived = derive(DATA["cold"], fit)
    by_key = {each.key: each.status for each in derived.characteristic_temperatures}
    assert by_key["theta_debye_low_temperature"] == "determined"
    assert by_key["theta_debye_moment_0"] == "undetermined"
    assert derived.zero_point_energy.value is None
    assert derived.zero_point_energy.status == "undetermined"
