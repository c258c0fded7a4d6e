"""The Debye functions beside a published table, as text and as JSON."""

from __future__ import annotations

from typing import Any

from ..functions import PublishedCheck

__all__ = ["agrees", "verification_record", "verification_text"]

_LAST_DIGIT = 1.0  # units of the last printed digit: rounding allows 0.5, and three printed values are off by more


def agrees(check: PublishedCheck) -> bool:
    """Whether every value agrees with the printed one to a unit of its last digit."""
    return check.last_digit_deviation <= _LAST_DIGIT


def verification_record(check: PublishedCheck) -> dict[str, Any]:
    """Return the comparison as plain values."""
    return {
        "source": check.source,
        "x": check.x.tolist(),
        "heat_capacity_published": check.heat_capacity_published.tolist(),
        "heat_capacity": check.heat_capacity.tolist(),
        "energy_published": check.energy_published.tolist(),
        "energy": check.energy.tolist(),
        "heat_capacity_deviation": check.heat_capacity_deviation,
        "energy_deviation": check.energy_deviation,
        "last_digit_deviation": check.last_digit_deviation,
        "agrees": agrees(check),
    }


def verification_text(check: PublishedCheck) -> str:
    """Return the table, the largest deviations and what they mean, within 80 columns."""
    lines = [
        f"Published: {check.source}",
        "C/(3 N k_B) and D3 = U/(3 N k_B T) of the Debye model, x = theta_D/T",
        "",
        f"{'x':>6}  {'C published':>13} {'latticefit':>16}  {'D3 published':>13} {'latticefit':>16}",
    ]
    for x, c_printed, c, u_printed, u in zip(
        check.x, check.heat_capacity_published, check.heat_capacity, check.energy_published, check.energy, strict=True
    ):
        lines.append(f"{x:>6g}  {c_printed:>13.10g} {c:>16.13f}  {u_printed:>13.10g} {u:>16.13f}")
    lines += [
        "",
        f"largest relative deviation: C {check.heat_capacity_deviation:.1e} (rounding of the printed digits alone "
        f"{check.heat_capacity_rounding:.1e}),",
        f"                            D3 {check.energy_deviation:.1e} ({check.energy_rounding:.1e})",
        f"largest deviation {check.last_digit_deviation:.2f} units of the last printed digit; "
        f"{check.beyond_rounding} of {2 * check.x.size} printed values are off by more than",
        "their own rounding (half a unit): that is the table's, see the documentation of published_check",
        "",
        "The functions agree with the published table."
        if agrees(check)
        else "THE FUNCTIONS DO NOT AGREE WITH THE PUBLISHED TABLE: do not use this installation.",
    ]
    return "\n".join(lines)
