"""From IPTS-68 to ITS-90: fixed points of both scales, the derivative, and what becomes of a run (invented data)."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose
from reading_helpers import messages, read_text
from scipy.integrate import trapezoid

from latticefit.errors import InputError
from latticefit.reading.settings import RUN, checked
from latticefit.reading.temperature_scale import scale_difference, scale_slope

# Values assigned to fixed points in the texts of IPTS-68 (edition of 1975) and ITS-90, both from memory. Triple points
# of equilibrium hydrogen, oxygen and argon, condensation point of oxygen, boiling point of neon, triple and boiling
# point of water, freezing points of tin and zinc.
FIXED_POINTS = (
    (13.81, 13.8033),
    (54.361, 54.3584),
    (83.798, 83.8058),
    (90.188, 90.1968),
    (273.16, 273.16),
    (373.15, 373.124),
    (505.1181, 505.078),
    (692.73, 692.677),
)


@pytest.mark.parametrize(("on_68", "on_90"), FIXED_POINTS)
def test_fixed_points_have_their_value_on_both_scales(on_68: float, on_90: float) -> None:
    """A fixed point converted from its IPTS-68 value has its ITS-90 value to 1 mK."""
    converted = on_68 + float(scale_difference(np.array([on_68]))[0])
    assert converted == pytest.approx(on_90, abs=1e-3)


@pytest.mark.parametrize(("on_68", "millikelvin"), [(14.0, -6), (20.0, -9), (50.0, -6)])
def test_differences_of_the_published_table(on_68: float, millikelvin: float) -> None:
    """T90 - T68 as R. N. Goldberg and R. D. Weir, Pure Appl. Chem. 64, 1545-1562 (1992) print it, to 1 mK."""
    assert 1e3 * float(scale_difference(np.array([on_68]))[0]) == pytest.approx(millikelvin, abs=0.6)


def test_the_two_polynomials_meet() -> None:
    """Across 83.8 K, where one polynomial takes over from the other, the difference steps by less than 1 mK."""
    below, above = scale_difference(np.array([np.nextafter(83.8, 0), 83.8]))
    assert abs(above - below) < 1e-3


def test_triple_point_of_water_does_not_move() -> None:
    """273.16 K is 273.16 K on both scales, to 0.01 mK."""
    assert abs(float(scale_difference(np.array([273.16]))[0])) < 1e-5


def test_slope_is_the_derivative_of_the_difference() -> None:
    """The factor of the heat capacity rests on d(T90 - T68)/dT68, here against central differences."""
    T = np.concatenate([np.linspace(13.9, 83.6, 80), np.linspace(84.0, 903.0, 80)])
    step = 1e-3
    numerical = (scale_difference(T + step) - scale_difference(T - step)) / (2 * step)
    assert_allclose(scale_slope(T), numerical, rtol=0, atol=2e-8)


def table(T: np.ndarray, C: np.ndarray) -> str:
    rows = "\n".join(f"{t:.17g},{c:.17g}" for t, c in zip(T, C, strict=True))
    return f"# invented data\nT (K),Cp (J/(mol K))\n{rows}\n"


def test_enthalpy_does_not_change_with_the_scale(tmp_path: Path) -> None:
    """Heat is the same whatever the scale: the integral of C dT over converted points equals that over the old ones."""
    T = np.linspace(90.0, 300.0, 2001)
    C = 25.0 * np.exp(-60.0 / T)
    old = read_text(tmp_path, table(T, C))
    new = read_text(tmp_path, table(T, C), temperature_scale="IPTS-68")
    before, after = (float(trapezoid(m.heat_capacity, m.temperature)) for m in (old, new))
    unmatched = float(trapezoid(old.heat_capacity, new.temperature))  # C left as it was: seen at this level
    assert after == pytest.approx(before, rel=2e-7)
    assert abs(unmatched / before - 1) > 1e-5


def test_size_of_the_conversion_is_stated_and_sigma_goes_along(tmp_path: Path) -> None:
    """T, C and sigma are converted, and one sentence says by how much."""
    text = "# invented data\nT (K),Cp (J/(mol K)),sigma (J/(mol K))\n100,10,0.1\n300,24,0.2\n600,26,0.3\n"
    found = read_text(tmp_path, text, temperature_scale="IPTS-68")
    plain = read_text(tmp_path, text)
    assert_allclose(found.temperature - plain.temperature, [0.0101, -0.0067, -0.0398], atol=6e-4)
    assert found.sigma is not None
    assert plain.sigma is not None
    assert_allclose(found.sigma / found.heat_capacity, plain.sigma / plain.heat_capacity, rtol=1e-12)
    assert messages(found)[0] == (
        "temperatures converted from IPTS-68 to ITS-90: by -0.040 to +0.010 K, heat capacities by up to 0.026 %"
    )
    assert found.readings[0].settings.temperature_scale == "IPTS-68"


def test_its_90_changes_nothing_and_says_nothing(tmp_path: Path) -> None:
    """Data declared to be on ITS-90 stay to the last bit, without a note."""
    text = "# invented data\nT (K),Cp (J/(mol K))\n100,10\n300,24\n"
    found, plain = read_text(tmp_path, text, temperature_scale="ITS-90"), read_text(tmp_path, text)
    assert found.temperature.tolist() == plain.temperature.tolist()
    assert found.heat_capacity.tolist() == plain.heat_capacity.tolist()
    assert messages(found) == messages(plain) == []


def test_points_below_the_scale_stay_and_are_counted(tmp_path: Path) -> None:
    """IPTS-68 begins at 13.81 K: colder points keep T and C, and their number is given."""
    text = "# invented data\nT (K),Cp (J/(mol K))\n4,0.01\n10,0.1\n20,1\n40,5\n"
    found = read_text(tmp_path, text, temperature_scale="IPTS-68")
    assert found.temperature[:2].tolist() == [4.0, 10.0]
    assert found.heat_capacity[:2].tolist() == [0.01, 0.1]
    assert found.temperature[2] == pytest.approx(19.991, abs=1e-3)
    assert messages(found)[1] == "2 rows below 13.81 K, where IPTS-68 is not defined: T and C kept as they are"


def test_points_above_the_conversion_are_refused_with_their_line(tmp_path: Path) -> None:
    """Beyond 903.75 K nothing is converted: refused, unless the settings keep the point out anyway."""
    text = "# invented data\nT (K),Cp (J/(mol K))\n300,24\n600,26\n950,27\n"
    with pytest.raises(InputError) as caught:
        read_text(tmp_path, text, temperature_scale="IPTS-68")
    assert str(caught.value) == (
        "run.csv: 950 K in line 5 lies above 903.75 K, where the conversion from IPTS-68 ends; leave out such rows, or "
        "convert the file beforehand"
    )
    found = read_text(tmp_path, text, temperature_scale="IPTS-68", window=((0.0, 900.0),))
    assert found.temperature[2] == 950.0
    assert messages(found)[1] == "1 row above 903.75 K not converted from IPTS-68 and not fitted"


def test_rows_left_out_are_converted_too(tmp_path: Path) -> None:
    """A row that cannot be used stands in the list of those on the same scale as the others."""
    text = "# invented data\nT (K),Cp (J/(mol K))\n100,10\n300,-1\n600,26\n"
    found = read_text(tmp_path, text, temperature_scale="IPTS-68")
    assert found.excluded[0].temperature == pytest.approx(299.9933, abs=2e-4)


def test_other_scale_is_refused_without_a_guess(tmp_path: Path) -> None:
    """A scale that is not known is not taken for a near one: the data must be converted first."""
    for scale in ("EPT-76", "IPTS-48"):
        with pytest.raises(InputError, match="only ITS-90 and IPTS-68 are known; convert data on another scale first"):
            checked({"temperature_scale": scale}, RUN)
