"""Whether the level of a heat capacity is possible for its formula, and which single slip would explain it if not.

Three looks at it: C(Tmax) against the 3nR of Dulong and Petit (Ann. Chim. Phys. 10, 395 (1819), from memory), the
Debye temperature that each point has, and the number of modes that the shape of the curve shows (`level_fit`).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from math import exp, hypot, inf, log

import numpy as np
from numpy.typing import NDArray

from ..constants import GAS_CONSTANT
from ..errors import InputError
from ..functions import invert_debye
from ..preparing import prepare
from ..records import FloatArray, LevelExplanation, LevelFinding, LevelVerdict, Measurement, PreparedData, Sample
from .hydrates import Slip, merged_waters
from .level_fit import ModeCount, count_modes
from .level_words import level_sentence
from .slips import addenda_left_in, kelvin_assumed, possible_slips
from .stiff import stiff_share

__all__ = ["LEVEL_IMPOSSIBLE", "examine_level", "examine_prepared_level", "explain_mode_sum", "level_not_judged"]

LEVEL_IMPOSSIBLE = 1.3
"""C(Tmax) over 3nR above which data are refused (common practice, no source)."""

_LOWEST_THETA, _HIGHEST_THETA = 15.0, 2500.0  # K, of any solid (common practice, no source)
_WARM = 50.0  # K: theta of single points is judged above
_HOT = 400.0  # K: above, vacancies, magnetism and the way to a melting point or a transition raise C by themselves
_HALF = 2.0  # theta over Tmax above which the modes are not counted
_AT_QUARTER = 0.503  # C/3nR at T = theta/4 (Debye 1912): below, the level is not judged
_COUNTED = 0.3  # C/3nR from which the modes of data that end below 50 K are counted
_LEAST, _SURE = 0.03, 3.0  # a mode sum off by less, or by fewer standard uncertainties, is no suspicion
_STATED_LEAST, _STATED_SURE = 0.02, 2.0  # the same where stated numbers contradict each other and explain it
_EXPLAINS = 2.5  # standard uncertainties within which a slip explains the level
_NEAR = 4.0  # in squares of them: slips worse than the best by more are not offered
_MOST_ADDENDA = 20.0  # times the sample's own heat capacity: nobody measures a sample on more
_MOST, _MOST_OF_A_KIND = 3, 2
_ROUGH_TOP, _ROUGH_U = 0.4, 0.2  # Tmax/theta from which a count may still tell slips apart, with this relative u
_SANE = 1.2  # times 3nR that a mended level may reach
_LARGEST_U, _SAVING_U = 0.1, 0.05  # of a mode sum that condemns a high level, and of one that saves it
_FEW = 3  # points up to 400 K that can do so
_SPREAD = 0.3  # relative spread of theta(T) of an ordinary solid
_ICE_POINT = 273.15  # K
_TELLING = 0.95  # C/3nR above which a point tells little of theta
_DRIFT = 0.5  # spread of ln theta from which temperatures may be in degC; with these it must fall to half and to 0.4
_STILL = 0.4
_HIGH_ENOUGH = 0.75  # C/3nR of data in degC whose modes cannot be counted
_FIRST = ("unit", "mass", "atoms", "molar-mass")  # slips that stand before water and formula unit


@dataclass(frozen=True)
class _Level:
    """The points against 3nR, and the count of modes over 3n."""

    T: FloatArray
    ratio: FloatArray
    count: ModeCount | None
    atoms: float

    @property
    def top(self) -> float:
        return float(self.T[-1])

    @property
    def judged(self) -> NDArray[np.intp]:
        """Positions of the points whose theta is judged: those above 50 K, or all where there are none."""
        warm = self.T > _WARM
        return np.flatnonzero(warm if warm.any() else np.ones_like(warm))

    def theta(self, factor: float = 1.0) -> FloatArray:
        """Debye temperature of each judged point with its level multiplied by a factor, K; NaN at or above 3nR."""
        return np.asarray(invert_debye(factor * self.ratio[self.judged]) * self.T[self.judged])

    @property
    def mode_sum(self) -> tuple[float, float] | None:
        """Modes over 3n and u, where the data reach theta/2."""
        if self.count is None or self.count.theta > _HALF * self.count.top:
            return None
        return self.count.modes / (3 * self.atoms), self.count.u / (3 * self.atoms)

    @property
    def rough_sum(self) -> tuple[float, float] | None:
        """The same with a generous u where they end a little lower: enough to tell slips apart."""
        if self.mode_sum is not None or self.count is None or self.count.top < _ROUGH_TOP * self.count.theta:
            return self.mode_sum
        found = self.count.modes / (3 * self.atoms)
        return found, _ROUGH_U * found


def examine_level(measurement: Measurement) -> LevelFinding:
    """Judge the level of the points of a measurement that would be fitted; nothing is refused here.

    Parameters
    ----------
    measurement : Measurement

    Returns
    -------
    LevelFinding
        "not judged", with the reason, where atoms or amount are not known or no point is left to fit.
    """
    try:
        prepared = prepare(measurement)
    except InputError as error:
        return level_not_judged(str(error))
    return examine_prepared_level(prepared)


def examine_prepared_level(prepared: PreparedData) -> LevelFinding:
    """Judge the level of the points that are fitted.

    Impossible: C(Tmax) above 1.3 x 3nR, or, where the data reach above 50 K, the Debye temperature outside 15 to 2500 K
    at every point above 50 K. A level that is high only at the top, by a transition, or above 400 K, on the way to a
    melting point, is not impossible: the mode sum or the points up to 400 K must be too high as well.

    Suspicious: the modes that the data show, counted where the data reach theta/2, miss 3 per atom by more than 3 % and
    3 u; fewer are no suspicion as far as stiff modes of light atoms may not be excited, unless a stated molar mass or
    number of atoms contradicts the formula and explains it. Suspicious as well: temperatures without a stated
    unit, where theta drifts as they are read, in K, and hardly changes with degC. Not judged: data that end below
    theta/4.

    Parameters
    ----------
    prepared : PreparedData

    Returns
    -------
    LevelFinding
    """
    measurement = prepared.measurement
    sample = measurement.sample
    if sample.atoms is None:
        return level_not_judged("the atoms per formula unit are not known; give --formula or --atoms")
    T = np.asarray(prepared.temperature)
    ratio = np.asarray(prepared.heat_capacity) / (3 * sample.atoms * GAS_CONSTANT)
    count = count_modes(prepared) if T[-1] > _WARM or ratio[-1] > _COUNTED else None
    level = _Level(T, ratio, count, sample.atoms)
    slips = possible_slips(measurement, level.top)
    verdict = _verdict(level, sample, slips)
    in_celsius = _in_celsius(level, prepared)
    if in_celsius and verdict != "impossible":
        verdict = "suspicious"
    explanations = _all_explanations(level, slips, measurement) if verdict in ("suspicious", "impossible") else ()
    explanations = (*in_celsius, *explanations)[:_MOST]
    reason = f"the data end at {level.top:.4g} K, below theta/4" if verdict == "not judged" else None
    theta = level.theta()
    defined = theta[np.isfinite(theta)]
    finding = LevelFinding(
        verdict=verdict,
        reason=reason,
        temperature=level.top,
        ratio_to_classical=float(ratio[-1]),
        theta_low=float(defined.min()) if defined.size else None,
        theta_high=float(defined.max()) if defined.size else None,
        mode_sum_ratio=None if level.mode_sum is None else level.mode_sum[0],
        mode_sum_u=None if level.mode_sum is None else level.mode_sum[1],
        explanations=explanations,
        sentence="",
    )
    return replace(finding, sentence=level_sentence(finding, _uncounted(level)))


def explain_mode_sum(prepared: PreparedData, ratio: float, u: float) -> tuple[LevelExplanation, ...]:
    """Return the slips that would give a mode sum found elsewhere, over 3 per atom and with its u, the best first.

    Parameters
    ----------
    prepared : PreparedData
        Of a sample with known atoms.
    ratio, u : float
    """
    atoms = prepared.measurement.sample.atoms or 1.0
    T = np.asarray(prepared.temperature)
    count = ModeCount(3 * atoms * ratio, 3 * atoms * u, 0.0, float(T[-1]))
    level = _Level(T, np.asarray(prepared.heat_capacity) / (3 * atoms * GAS_CONSTANT), count, atoms)
    return _all_explanations(level, possible_slips(prepared.measurement, level.top), prepared.measurement)


def level_not_judged(reason: str) -> LevelFinding:
    """Return the finding for data whose level cannot be judged, for a reason in words."""
    finding = LevelFinding("not judged", reason, None, None, None, None, None, None, (), "")
    return replace(finding, sentence=level_sentence(finding))


def _uncounted(level: _Level) -> str | None:
    """Why there is no mode sum, in words; None where there is one."""
    if level.mode_sum is not None:
        return None
    if level.count is not None:
        return f"the modes are not counted: the data end below theta/2 of theta_D[m=2] = {level.count.theta:.3g} K"
    if level.top <= _WARM:
        return f"the modes are not counted: the data end at {level.top:.4g} K"
    return "the modes are not counted: that takes 6 points over a factor of 2 in T, and a fit that succeeds"


# ---------------------------------------------------------------------------------------------------------- verdict


def _verdict(level: _Level, sample: Sample, slips: Sequence[Slip]) -> LevelVerdict:
    if _impossible(level):
        return "impossible"
    if _suspicious(level, sample, slips):
        return "suspicious"
    return "plausible" if level.ratio[-1] >= _AT_QUARTER else "not judged"


def _impossible(level: _Level) -> bool:
    if _too_high(level):
        return True
    if level.top <= _WARM:
        return False
    theta = level.theta()
    return bool(np.all((theta < _LOWEST_THETA) | (theta > _HIGHEST_THETA)))


def _too_high(level: _Level) -> bool:
    """Whether C(Tmax) is beyond 1.3 x 3nR, for more than one odd point, and not because the solid is hot."""
    if min(float(level.ratio[-1]), float(np.median(level.ratio[-3:]))) <= LEVEL_IMPOSSIBLE:
        return False
    counted = level.mode_sum
    if level.top <= _HOT:  # a transition at the very top is no slip where all that lies below is right
        right = counted is not None and counted[1] < _SAVING_U and abs(counted[0] - 1) <= _STATED_SURE * counted[1]
        return not right
    if counted is not None and counted[1] < _LARGEST_U:
        return counted[0] > LEVEL_IMPOSSIBLE
    ordinary = level.ratio[(level.T > _WARM) & (level.T <= _HOT)]
    return ordinary.size < _FEW or float(np.median(ordinary[-3:])) > LEVEL_IMPOSSIBLE


def _suspicious(level: _Level, sample: Sample, slips: Sequence[Slip]) -> bool:
    if level.mode_sum is None:
        return False
    found, u = level.mode_sum
    excess = found - 1
    deficit = 1 - stiff_share(sample, level.top) - found
    if max(excess, deficit) > max(_LEAST, _SURE * u):
        return True
    # numbers that contradict each other, one of which the data bear out and the other not
    return abs(excess) > max(_STATED_LEAST, _STATED_SURE * u) and any(
        each.doubt == 0 and abs(found - each.expected) < _STATED_SURE * u for each in slips
    )


# ------------------------------------------------------------------------------------------------------ explanations


def _all_explanations(level: _Level, slips: Sequence[Slip], measurement: Measurement) -> tuple[LevelExplanation, ...]:
    """The slips, behind the addenda where those may still be in the data: whatever their size, they raise the level."""
    found = _explanations(level, slips, measurement.sample)
    raised = float(level.ratio[-1]) if level.mode_sum is None else level.mode_sum[0]
    if not addenda_left_in(measurement) or not 1 < raised <= _MOST_ADDENDA:
        return found
    words = "the heat capacity of the addenda, still in the data"
    return (LevelExplanation("addenda", words, None, "give --addenda FILE"), *found[: _MOST - 1])


def _explanations(level: _Level, slips: Sequence[Slip], sample: Sample) -> tuple[LevelExplanation, ...]:
    """The slips that give a sane level: unit, mass and molar mass first, the best of them first."""
    stiff = stiff_share(sample, level.top)
    costs = [(min(_costs(level, each, stiff), default=inf), each) for each in slips]
    best = min((cost for cost, _ in costs), default=inf)
    near = sorted((pair for pair in costs if pair[0] < inf and pair[0] <= best + _NEAR), key=lambda pair: pair[0])
    waters = [each for _, each in near if each.waters is not None]
    kept: list[LevelExplanation] = []
    for _, each in sorted(near, key=lambda pair: pair[1].doubt > 0 and pair[1].kind not in _FIRST):
        if len(kept) == _MOST or sum(other.slip == each.kind for other in kept) == _MOST_OF_A_KIND:
            continue
        if each.waters is None:
            kept.append(LevelExplanation(each.kind, each.words, each.expected, each.remedy))
        elif each is waters[0]:
            full = [slip for slip in waters if _excited(level, slip)]
            kept.append(merged_waters(full, [slip for slip in waters if slip not in full], sample.formula))
    return tuple(kept)


def _excited(level: _Level, slip: Slip) -> bool:
    """Whether a slip explains the level within 1 u with all its modes excited, or no count says otherwise."""
    found = level.rough_sum
    return found is None or slip.stiff == 0 or abs(found[0] - slip.expected) <= found[1]


def _costs(level: _Level, slip: Slip, stiff: float) -> Iterator[float]:
    """How badly a slip explains the level, with all modes excited and with stiff ones not; none where it does not."""
    cost = _cost(level, slip.expected, slip.doubt)
    if cost is not None:
        yield cost
    found, stiff = level.rough_sum, slip.stiff or stiff
    if found is not None and stiff > 0:
        cost = _cost(level, min(max(found[0], slip.expected * (1 - stiff)), slip.expected), slip.doubt + 1)
        if cost is not None:
            yield cost


def _cost(level: _Level, expected: float, doubt: float) -> float | None:
    """How badly a factor explains the level, in squares of standard uncertainties; None where it does not."""
    factor = 1 / expected
    theta = level.theta(factor)
    if factor * level.ratio[-1] > _SANE or not ((theta >= _LOWEST_THETA) & (theta <= _HIGHEST_THETA)).any():
        return None
    found = level.rough_sum
    if found is not None and found[0] > 0:
        off = log(factor * found[0]) / hypot(found[1] / found[0], 0.005)
        return off * off + doubt if abs(off) <= _EXPLAINS else None
    # too low for a count: theta must be that of a solid at every point, and one that hardly changes is the likelier
    known = theta[np.isfinite(theta)]
    if known.min() < _LOWEST_THETA or known.max() > _HIGHEST_THETA or 2 * known.size < theta.size:
        return None
    return float(np.log(known.max() / known.min()) / _SPREAD) ** 2 + doubt


def _in_celsius(level: _Level, prepared: PreparedData) -> tuple[LevelExplanation, ...]:
    """Temperatures in degC read as K, where no file states their unit and degC make the level clearly saner."""
    if not kelvin_assumed(prepared.measurement):
        return ()
    now, then = _drift(level.T, level.ratio), _drift(level.T + _ICE_POINT, level.ratio)
    if now is None or then is None or now < _DRIFT or then > min(_STILL, now / 2):
        return ()
    count = count_modes(replace(prepared, temperature=prepared.temperature + _ICE_POINT))
    shifted = _Level(level.T + _ICE_POINT, level.ratio, count, level.atoms)
    found = shifted.mode_sum
    if found is None and (count is not None or not _HIGH_ENOUGH <= level.ratio[-1] <= _SANE):
        return ()
    if found is not None and abs(found[0] - 1) > max(_LEAST, _SURE * found[1]):
        return ()
    words = (
        "temperatures in degC that are read as K (with degC theta_D of single points varies by a factor of "
        f"{exp(then):.3g} in place of {exp(now):.3g})"
    )
    return (LevelExplanation("temperature-unit", words, None, "give --temperature-unit degC"),)


def _drift(T: FloatArray, ratio: FloatArray) -> float | None:
    """Spread of ln theta over the points below 0.95 x 3nR; None where they are few or theta is that of no solid."""
    telling = (ratio > 0) & (ratio <= _TELLING)
    theta = np.asarray(invert_debye(ratio[telling]) * T[telling])
    if theta.size < _FEW or not np.all(np.isfinite(theta)) or theta.max() > _HIGHEST_THETA:
        return None
    return float(np.log(theta.max() / theta.min()))
