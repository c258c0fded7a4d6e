"""How the special functions behave: limits, identities of thermodynamics, input, and accuracy at random x."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from functools import partial

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from latticefit import functions
from latticefit.errors import InputError
from latticefit.functions import debye

Function = Callable[[object], np.ndarray]

INFINITY = float("inf")

# name -> function, value at x = 0, value at infinity, whether it never rises with x (else: never falls)
FUNCTIONS: dict[str, tuple[Function, float, float, bool]] = {
    "debye_heat_capacity": (functions.debye_heat_capacity, 1, 0, True),
    "debye_energy": (functions.debye_energy, 1, 0, True),
    "debye_entropy": (functions.debye_entropy, INFINITY, 0, True),
    "debye_helmholtz": (functions.debye_helmholtz, -INFINITY, 0, False),
    "einstein_heat_capacity": (functions.einstein_heat_capacity, 1, 0, True),
    "einstein_energy": (functions.einstein_energy, 1, 0, True),
    "einstein_entropy": (functions.einstein_entropy, INFINITY, 0, True),
    "einstein_helmholtz": (functions.einstein_helmholtz, -INFINITY, 0, False),
} | {f"D{n}": (partial(functions.debye_function, n), 1, 0, True) for n in range(1, 11)}

DERIVATIVES: dict[str, tuple[Function, Function, float]] = {
    "debye_heat_capacity": (functions.debye_heat_capacity_derivative, functions.debye_heat_capacity, 0),
    "debye_energy": (functions.debye_energy_derivative, functions.debye_energy, -3 / 8),
    "einstein_heat_capacity": (functions.einstein_heat_capacity_derivative, functions.einstein_heat_capacity, 0),
    "einstein_energy": (functions.einstein_energy_derivative, functions.einstein_energy, -1 / 2),
} | {
    f"D{n}": (partial(functions.debye_function_derivative, n), partial(functions.debye_function, n), -n / (2 * (n + 1)))
    for n in range(1, 11)
}

ALL: dict[str, Function] = {name: entry[0] for name, entry in FUNCTIONS.items()} | {
    f"{name}_derivative": entry[0] for name, entry in DERIVATIVES.items()
}

each_function = pytest.mark.parametrize("name", ALL)
each_system = pytest.mark.parametrize("system", ["debye", "einstein"])
nonnegative = st.floats(0, INFINITY)
WIDE = np.concatenate([np.geomspace(1e-8, 1e4, 241), [0.25, 0.5, 1, 2, 3, 4, 5, 50, 80]])


def of(system: str, quantity: str) -> Function:
    """Return a function by its system and its quantity."""
    return ALL[f"{system}_{quantity}"]


# ---------------------------------------------------------------------------------------------------------- limits


@pytest.mark.parametrize("name", FUNCTIONS)
def test_limits_are_exact(name: str) -> None:
    """The limits at x = 0 and at infinity are exact: equipartition and the third law."""
    function, at_zero, at_infinity, _ = FUNCTIONS[name]
    assert list(function([0.0, INFINITY])) == [at_zero, at_infinity]


@pytest.mark.parametrize("name", DERIVATIVES)
def test_limits_of_the_derivatives_are_exact(name: str) -> None:
    """The slope at x = 0 is exactly the first coefficient of the series, and 0 at infinity."""
    derivative, _, at_zero = DERIVATIVES[name]
    assert list(derivative([0.0, INFINITY])) == [at_zero, 0]


@each_function
def test_no_floating_point_exception_at_any_x(name: str) -> None:
    """No overflow, underflow or invalid operation reaches the caller, whatever x and even while tables are built."""
    debye._heat_capacity_table.cache_clear()
    debye._heat_capacity_slope_table.cache_clear()
    debye._entropy_table.cache_clear()
    debye._order_table.cache_clear()
    x = [0.0, -0.0, 5e-324, 1e-310, 1e-300, 1e-8, 1, 4, 50, 80, 350, 709, 710, 745, 1e3, 1e4, 1e200, 1.7e308, INFINITY]
    with np.errstate(all="raise"):
        values = ALL[name]([*x, float("nan")])
    assert np.isnan(values[-1])
    assert not np.isnan(values[:-1]).any()


@each_system
def test_entropy_is_minus_logarithm_near_zero(system: str) -> None:
    """Near x = 0 the entropy is -ln x plus a constant (1, or 4/3 for a band), down to the smallest normal double."""
    constant = 4 / 3 if system == "debye" else 1
    x = np.array([2.3e-308, 1e-300, 1e-100, 1e-20])
    np.testing.assert_allclose(of(system, "entropy")(x), constant - np.log(x), rtol=1e-15)


def test_debye_heat_capacity_follows_the_cube_law() -> None:
    """At low temperature C/(3 N k_B) = (4 pi^4/5) (T/theta)^3."""
    # Source: P. Debye, Ann. Phys. (4th ser.) 39, 789-839 (1912).
    x = np.array([60.0, 100.0, 1e3, 1e6])
    np.testing.assert_allclose(functions.debye_heat_capacity(x) * x**3, 4 * np.pi**4 / 5, rtol=3e-15)


# ------------------------------------------------------------------------------------------------------ identities


@pytest.mark.parametrize("name", DERIVATIVES)
def test_derivatives_agree_with_central_differences(name: str) -> None:
    """Every x-derivative is the slope of its function, from five-point differences."""
    derivative, function, _ = DERIVATIVES[name]
    x = np.concatenate([np.geomspace(1e-2, 100, 60), [0.5, 1, 4, 50, 80]])
    step = 2e-4 * x
    slope = (function(x - 2 * step) - function(x + 2 * step) + 8 * (function(x + step) - function(x - step))) / (
        12 * step
    )
    allowed = 1e-7 * np.abs(derivative(x)) + 2e-11 * function(x) / x
    assert np.all(np.abs(slope - derivative(x)) <= allowed)


def test_debye_slope_is_three_times_einstein_minus_debye() -> None:
    """dC_D/dln theta = 3 (C_E - C_D), exactly."""
    # Source: differentiation of Debye's integral (P. Debye, Ann. Phys. (4th ser.) 39, 789-839 (1912)) by its limit.
    slope = WIDE * functions.debye_heat_capacity_derivative(WIDE)
    difference = 3 * (functions.einstein_heat_capacity(WIDE) - functions.debye_heat_capacity(WIDE))
    np.testing.assert_allclose(slope, difference, rtol=0, atol=2e-14)


@each_system
def test_heat_capacity_is_the_temperature_derivative_of_the_energy(system: str) -> None:
    """C = dU/dT, that is C = -x^2 d(u/x)/dx = u - x u' with u = U/(3 N k_B T)."""
    energy, slope = of(system, "energy")(WIDE), of(system, "energy_derivative")(WIDE)
    np.testing.assert_allclose(of(system, "heat_capacity")(WIDE), energy - WIDE * slope, rtol=1e-14)


@each_system
def test_entropy_derivative_is_heat_capacity_over_temperature(system: str) -> None:
    """DS/dT = C/T, that is dS/dln x = -C, from five-point differences in ln x."""
    x, step = np.geomspace(1e-3, 100, 60), 2e-4
    entropy = [of(system, "entropy")(x * np.exp(k * step)) for k in (-2, -1, 1, 2)]
    slope = (entropy[0] - entropy[3] + 8 * (entropy[2] - entropy[1])) / (12 * step)
    allowed = 1e-7 * of(system, "heat_capacity")(x) + 1e-11 * entropy[1]
    assert np.all(np.abs(slope + of(system, "heat_capacity")(x)) <= allowed)


@each_system
def test_helmholtz_is_energy_minus_temperature_times_entropy(system: str) -> None:
    """F = U - T S."""
    energy, entropy = of(system, "energy")(WIDE), of(system, "entropy")(WIDE)
    assert np.all(np.abs(of(system, "helmholtz")(WIDE) - (energy - entropy)) <= 1e-14 * entropy)


def test_debye_functions_of_order_three_are_the_energy() -> None:
    """debye_energy is D_3, and its derivative that of D_3."""
    assert np.array_equal(functions.debye_energy(WIDE), functions.debye_function(3, WIDE))
    assert np.array_equal(functions.debye_energy_derivative(WIDE), functions.debye_function_derivative(3, WIDE))


@pytest.mark.parametrize("x", [0.01, 0.3, 1.0, 4.0, 20.0])
def test_sum_over_the_level_ladder_equals_the_closed_form(x: float) -> None:
    """The explicit sum over the levels of one oscillator gives its energy and its heat capacity."""
    # Common practice, no source: levels k h nu, k = 0, 1, 2, ..., weighted by exp(-k x).
    level = np.arange(int(60 / x) + 10)
    weight = np.exp(-level * x)
    weight /= weight.sum()
    mean = np.sum(weight * level)
    variance = np.sum(weight * (level - mean) ** 2)
    assert functions.einstein_energy(x) == pytest.approx(x * mean, rel=1e-12)
    assert functions.einstein_heat_capacity(x) == pytest.approx(x**2 * variance, rel=1e-12)


def test_oscillator_energy_is_half_a_quantum_at_low_and_kT_at_high_temperature() -> None:
    """With the zero point added the energy goes to h nu/2 as T -> 0 and to k_B T at high T."""
    # Common practice, no source.
    cold = np.array([50.0, 1e3, 1e5])
    in_quanta = functions.einstein_energy(cold) / cold + 0.5
    np.testing.assert_allclose(in_quanta, 0.5, rtol=1e-15)
    hot = np.array([1e-1, 1e-3, 1e-6])
    in_kT = functions.einstein_energy(hot) + hot / 2
    assert np.all(np.abs(in_kT - 1) <= hot**2 / 12 + 1e-15)


# ----------------------------------------------------------------------------------------------------------- input


@each_function
@settings(max_examples=25, deadline=None)
@given(x=hnp.arrays(np.float64, hnp.array_shapes(min_dims=0, max_dims=3, min_side=0, max_side=5), elements=nonnegative))
def test_shape_is_preserved_and_values_do_not_depend_on_it(name: str, x: np.ndarray) -> None:
    """Any shape in, the same shape out, with the values of the flat array."""
    values = ALL[name](x)
    assert np.shape(values) == x.shape
    assert np.array_equal(np.ravel(values), ALL[name](x.ravel()))


@pytest.mark.parametrize("name", FUNCTIONS)
@settings(max_examples=50, deadline=None)
@given(pair=st.tuples(nonnegative, nonnegative))
def test_functions_are_monotonic(name: str, pair: tuple[float, float]) -> None:
    """Heat capacity, energy and entropy never rise with theta/T and the Helmholtz energy never falls (to rounding)."""
    function, _, _, falls = FUNCTIONS[name]
    low, high = function(sorted(pair)) if falls else -function(sorted(pair))
    assert low >= high * (1 - 8e-15 * np.sign(high)) or low == high


@each_function
def test_no_step_between_neighbouring_cells(name: str) -> None:
    """No step above rounding stands between neighbouring cells of the tables, nor at x = 1, 4, 50 and 80."""
    border = np.concatenate([np.arange(1, 4097) / 512, [50, 80]])
    before, after = ALL[name](np.nextafter(border, 0)), ALL[name](border)
    assert np.all(np.abs(after / before - 1) <= 8e-15 + 2 * np.spacing(border))


@each_function
@settings(max_examples=25, deadline=None)
@given(
    x=st.lists(st.one_of(st.just(float("nan")), nonnegative), min_size=1, max_size=6),
    negative=st.floats(-INFINITY, 0, exclude_max=True),
)
def test_nan_stays_and_negative_is_refused_even_beside_nan(name: str, x: list[float], negative: float) -> None:
    """NaN in gives NaN out at its place alone; one negative value is refused, wherever it stands."""
    assert np.array_equal(np.isnan(ALL[name](x)), np.isnan(x))
    with pytest.raises(
        InputError, match=f"must not be negative, found {negative:g} at index {len(x)}".replace("+", r"\+")
    ):
        ALL[name]([*x, negative])


@each_function
def test_scalar_gives_float(name: str) -> None:
    """A number or a 0-d array gives a float, equal to the value of an array."""
    for x in (2, 2.0, np.float32(2), np.array(2.0)):
        value = ALL[name](x)
        assert isinstance(value, float)
        assert value == ALL[name]([2.0])[0]


@each_function
@pytest.mark.parametrize("dtype", [np.int64, np.int8, np.uint16, np.float32, np.float16])
def test_integers_and_single_precision_are_computed_in_double(name: str, dtype: type) -> None:
    """Arrays of integers and of lower precision give the double-precision value of their numbers."""
    x = np.array([[1, 2, 3], [5, 20, 100]], dtype=dtype)
    values = ALL[name](x)
    assert values.dtype == np.float64
    assert np.array_equal(values, ALL[name](x.astype(np.float64)))


@each_function
def test_input_is_left_alone_and_strides_do_not_matter(name: str) -> None:
    """A read-only, strided or Fortran-ordered array gives the same values and is not changed."""
    x = np.asfortranarray(np.geomspace(1e-3, 1e3, 60).reshape(6, 10))
    x.flags.writeable = False
    kept = x.copy()
    values = ALL[name](x)
    assert np.array_equal(x, kept)
    assert np.array_equal(values[::2, ::3], ALL[name](x[::2, ::3]))


@each_function
def test_long_arrays_are_walked_through_in_full(name: str) -> None:
    """An array longer than one chunk gives what its parts give."""
    x = np.geomspace(1e-9, 1e5, 20001)
    parts = np.concatenate([ALL[name](part) for part in np.array_split(x, 7)])
    np.testing.assert_allclose(ALL[name](x), parts, rtol=1e-15)


def test_refusals_are_one_clear_sentence() -> None:
    """A negative value is named with its place; what is not a number is named as it was written."""
    with pytest.raises(InputError, match=r"^x = theta/T must not be negative, found -1.5: check the sign of theta"):
        functions.debye_heat_capacity(-1.5)
    with pytest.raises(InputError, match=r"found -3 at index 1, 0: check the sign of theta and of T$"):
        functions.einstein_entropy(np.array([[1, 2], [-3, -4]]))
    with pytest.raises(InputError, match=r"^x = theta/T must be a real number .*, found '300 K'$"):
        functions.debye_energy("300 K")
    for wrong in (None, True, 1j, ["a", "b"], [None, 1.0], np.array(["1.0"]), np.array([True])):
        with pytest.raises(InputError, match="must be a real number or an array of real numbers"):
            functions.einstein_energy(wrong)
    with pytest.raises(InputError, match="the rows given differ in length"):
        functions.debye_entropy([[1.0, 2.0], [3.0]])


@pytest.mark.parametrize("order", [0, 11, -1, 2.5, 3.0, "3", None, True])
def test_order_outside_one_to_ten_is_refused(order: object) -> None:
    """An order that is not a whole number from 1 to 10 is refused, with the value."""
    for function in (functions.debye_function, functions.debye_function_derivative):
        with pytest.raises(InputError, match=f"whole number from 1 to 10, found {order!r}"):
            function(order, 1.0)  # type: ignore[arg-type]


def test_numpy_integers_are_orders() -> None:
    """An order taken from a numpy array is as good as an int."""
    assert functions.debye_function(np.int64(2), 1.0) == functions.debye_function(2, 1.0)


def test_first_use_from_many_threads_gives_the_same_values() -> None:
    """Tables that several threads build at the same time give every thread the right values."""
    x = np.geomspace(0.01, 100, 500)
    expected = functions.debye_heat_capacity(x)
    debye._heat_capacity_table.cache_clear()
    with ThreadPoolExecutor(8) as pool:
        found = list(pool.map(lambda _: functions.debye_heat_capacity(x), range(32)))
    assert all(np.array_equal(values, expected) for values in found)


# -------------------------------------------------------------------------------------------------------- accuracy


def random_points() -> np.ndarray:
    """Return x log-uniform in 1e-8..1e4 and the doubles beside grid nodes and where a formula changes."""
    random = np.random.default_rng(20250101)
    nodes = np.array([1 / 512, 1.0, 2.0, 1537 / 512, 4.0, 4.006, 50.0, 80.0])
    return np.concatenate([10 ** random.uniform(-8, 4, 14), random.uniform(0.3, 30, 8), nodes, np.nextafter(nodes, 0)])


def exact_values(x: float) -> dict[str, mpmath.mpf]:
    """Return every function at x from its definition, by quadrature and closed forms with 45 digits.

    With x = 1e-8 the heat capacity's derivative loses 16 of them, which leaves nearly 30.
    """
    y = mpmath.mpf(x)
    ends = [mpmath.mpf(0)] + [end / y for end in (1, 4, 12, 30, 70) if end < y] + [min(1, 150 / y)]
    energy, occupation = y / mpmath.expm1(y), 1 / mpmath.expm1(y)
    heat_capacity = y**2 * occupation * (1 + occupation)
    helmholtz = -mpmath.log1p(occupation)
    values = {
        "einstein_heat_capacity": heat_capacity,
        "einstein_energy": energy,
        "einstein_entropy": energy - helmholtz,
        "einstein_helmholtz": helmholtz,
        "einstein_energy_derivative": (energy - heat_capacity) / y,
        "einstein_heat_capacity_derivative": heat_capacity * (2 / y - mpmath.coth(y / 2)),
    }
    for n in (1, 2, 3, 6, 10):
        d = n * mpmath.quad(lambda s, n=n: s ** (n - 1) * (y * s / mpmath.expm1(y * s) if s else 1), ends)
        values |= {f"D{n}": d, f"D{n}_derivative": n / y * (energy - d)}
    d = values["D3"]
    return values | {
        "debye_heat_capacity": 4 * d - 3 * energy,
        "debye_energy": d,
        "debye_entropy": 4 * d / 3 - helmholtz,
        "debye_helmholtz": helmholtz - d / 3,
        "debye_heat_capacity_derivative": 3 / y * (heat_capacity - 4 * d + 3 * energy),
        "debye_energy_derivative": values["D3_derivative"],
    }


def test_accuracy_at_random_points_and_beside_nodes() -> None:
    """Every function and derivative is within 1e-14 of its definition, wherever its value is a normal double."""
    # Source: the definitions (Einstein 1907; Debye 1912; Abramowitz & Stegun 27.1), evaluated by mpmath at 45 digits.
    wrong = []
    with mpmath.workdps(45):
        for x in random_points():
            for name, exact in exact_values(float(x)).items():
                value = float(ALL[name](x))
                if abs(exact) >= np.finfo(float).tiny and abs(mpmath.mpf(value) / exact - 1) > 1e-14:
                    wrong.append(f"{name}({x!r}) = {value!r}, exact {mpmath.nstr(exact, 20)}")
    assert not wrong, "\n".join(wrong)
