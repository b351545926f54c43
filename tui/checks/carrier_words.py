"""What the carrier of an anomaly means, as facts and in words."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from tui.checks.carrier import Carrier
from tui.model import Settings
from tui.physics.spectral import INSTRUMENT


def carrier_facts(carrier: Carrier, suspects: Sequence[str]) -> dict[str, Any]:
    """The carrier as the evidence stores it."""
    return {
        "carrier_band": carrier.name,
        "carrier_bands": list(carrier.bands),
        "carrier_p": carrier.p,
        "carrier_p1": carrier.p1,
        "carrier_tried": carrier.tried,
        "carrier_pull": carrier.pull,
        "carrier_p_without": carrier.p_without,
        "carrier_suspect": any(band in suspects for band in carrier.bands),
    }


def carrier_sentences(
    carrier: Carrier | None, suspects: Sequence[str], bands: Sequence[str], fitted: Sequence[str], settings: Settings
) -> tuple[str, ...]:
    """What the carrier means, in words."""
    if carrier is None or carrier.p >= settings.p_min:
        return ("No single band or instrument carries the anomaly.",)
    if carrier.p_without < settings.p_min:
        share = carrier.delta_chi2 / max(carrier.delta_chi2 + carrier.chi2_without, 1e-300)
        return (
            f"{carrier.name} carries the largest part of the anomaly ({carrier.pull:+.1f} sigma, {share:.0%} of "
            f"chi-square); without it the star alone is still refused, p = {carrier.p_without:.2g}.",
        )
    said = [
        f"{carrier.name} carries the anomaly ({carrier.pull:+.1f} sigma): without it the star alone has "
        f"p = {carrier.p_without:.2g}."
    ]
    if any(band in suspects for band in carrier.bands):
        return tuple(said)
    said.append(f"Nothing independent speaks against {carrier.name}: a bad value and a real one look the same here.")
    spread = [name for name in bands if name in fitted]
    at_end = carrier.bands[0] == spread[0] or carrier.bands[-1] == spread[-1]
    if at_end and carrier.name != INSTRUMENT:
        said.append(f"{carrier.name} lies at the end of the spectrum: no band beyond it can tell which it is.")
    return tuple(said)
