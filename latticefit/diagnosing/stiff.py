"""How many modes of a solid may lie too high to be excited: what lowers a mode sum without any slip."""

from __future__ import annotations

from types import MappingProxyType

from ..records import Sample
from ..sample import element_counts

__all__ = ["stiff_share"]

# modes of one atom that may lie so high, and theta in K: stretching of bonds between light atoms, all three of hydrogen
# (orders of magnitude, from memory)
_STIFF = MappingProxyType(
    {
        "H": (3, 5000.0),
        "D": (3, 3600.0),
        "T": (3, 3000.0),
        "B": (2, 2200.0),
        "C": (2, 3000.0),
        "N": (2, 3000.0),
        "O": (1, 1450.0),
    }
)
_EXCITED = 5.0  # theta/T above which an oscillator gives less than a sixth of its classical value
_LIGHT, _LIGHT_SHARE = 0.012, 1 / 3  # kg/mol per atom below which an unknown composition is taken for organic


def stiff_share(sample: Sample, warmest: float) -> float:
    """Return the largest share of the modes that may not be excited at a temperature in K."""
    if sample.formula is None:
        known = sample.molar_mass is not None and sample.atoms is not None
        light = known and (sample.molar_mass or 0.0) / (sample.atoms or 1.0) < _LIGHT
        return _LIGHT_SHARE if light else 0.0
    counts = element_counts(sample.formula)
    stiff = sum(
        _STIFF[name][0] * count
        for name, count in counts.items()
        if name in _STIFF and _STIFF[name][1] > _EXCITED * warmest
    )
    return stiff / (3 * sum(counts.values()))
