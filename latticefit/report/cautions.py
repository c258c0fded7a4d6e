"""What every report says about the use of its numbers: one place for the wording."""

from __future__ import annotations

from typing import Final

__all__ = ["CAUTIONS"]

CAUTIONS: Final[tuple[str, ...]] = (
    "Extrapolated or modelled values do not replace measured data, local codes or licensed practice where they could "
    "size cryogenic equipment, vents or relief devices.",
    "Cryogens: boil-off displaces the air of a closed room without warning (asphyxiation), a closed volume that warms "
    "builds up pressure until it bursts, and cold liquid, gas and metal burn the skin.",
)
"""Cautions on extrapolated values and on cryogens, one sentence or two each."""
