"""Candidates and evidence made for the desk's tests: the same for the same number; some names are made to do harm."""

from __future__ import annotations

import math
from types import MappingProxyType

import numpy as np

from tui.model import CHECKS, Candidate, Dip, Evidence, Fit, Measurement, Neighbour, Param, Spectrum

PIVOT_UM = {
    "Gaia_BP": 0.511, "Gaia_G": 0.622, "Gaia_RP": 0.777, "J": 1.235, "H": 1.662, "Ks": 2.159,
    "W1": 3.353, "W2": 4.603, "W3": 11.56, "W4": 22.09,
}  # fmt: skip
BANDS = tuple(PIVOT_UM)
HOSTILE_NAMES = (
    "[/]",
    "[@click=app.exit]leave[/]",
    "[bold red]SM[/bold red]",
    "\x1b[2J\x1b[31mred",
    "\x1b]0;title\x07bell\x07",
    "tab\tand\nnewline\r",
    "rtl \u202eedisrever\u202c name",
    "bom\ufeff sep\u2028 end\x85\x9b1m",
    "日本語の星 夜空の向こう",
    "👩\u200d🚀🔭❤\ufe0f e\u0301e\u0301 क्षि",
    "Gaia DR3 4472832130942575872",
    "x" * 200,
    "{0} %s {name} \\ $primary",
)
FIXED_UTC = "2026-03-04T05:06:07.000000Z"


def make_candidate(name: str, number: int) -> Candidate:
    """A star of 5600 K whose long bands are too bright by an amount that depends on `number`."""
    wave = np.array([PIVOT_UM[band] for band in BANDS])
    flux = 1e3 * wave**-3 / np.expm1(14387.77 / (wave * 5600.0)) * 1e-3
    excess = np.where(wave > 5, 1 + 0.3 * (number % 7), 1.0)
    measured = tuple(
        Measurement(band, float(f * e), float(f * 0.02), limit=band == "W4" and number % 5 == 0, source="archive",
                    epoch="2010.5", flags={"ph_qual": "A"}, value=12.0, value_error=0.02, unit="mag")
        for band, f, e in zip(BANDS, flux, excess, strict=True)
    )  # fmt: skip
    grid = np.geomspace(5, 14, 30)
    return Candidate(
        name,
        measured,
        MappingProxyType({"ra": 123.4567 + number, "dec": -45.678, "parallax": 4.2, "ruwe": 1.02, "sp_type": "G5V"}),
        (Neighbour(3.2, 120.0, {"J": 1e-4}, "archive"),) if number % 3 == 0 else (),
        (Dip("one", "Gaia_G", 0.02, 0.004),) if number % 11 == 0 else (),
        Spectrum(grid, np.full(30, 1e-3), np.full(30, 1e-4)) if number % 13 == 0 else None,
    )


def make_fit(model: str, number: int, strength: float) -> Fit:
    """A fit whose W3 and W4 are left over by an amount that depends on `strength`."""
    pulls = {band: math.sin(number + i) for i, band in enumerate(BANDS)}
    pulls |= {"W3": strength, "W4": strength * 0.8}
    chi2 = sum(pull**2 for pull in pulls.values())
    params = {"teff": Param(5612.3, 5570.0, 5655.0, "K"), "theta": Param(0.0212, 0.0209, 0.0215, "mas")}
    if "dust" in model:
        params |= {"dust_temperature": Param(310.0, 255.0, 390.0, "K"),
                   "dust_fractional_luminosity": Param(1.2e-3, 0.9e-3, 1.6e-3)}  # fmt: skip
    return Fit(model, chi2, len(BANDS) - len(params), math.exp(-chi2 / 2), chi2 + 4, chi2 + 6, params, pulls, chi2)


def make_evidence(number: int) -> dict[str, Evidence]:
    """Evidence of every kind for one candidate."""
    strength = 8.2 - 0.1 * number
    models = {
        "star": ("star",),
        "instrument": ("star",),
        "extinction": ("star + A_V",),
        "blend": ("bound pair", "free pair"),
        "dust": ("star + dust",),
    }
    made = {}
    for step, check in enumerate(CHECKS):
        fits = tuple(make_fit(model, number, strength / (1 + step)) for model in models[check])
        adequate = None if check == "extinction" and number % 6 == 3 else abs(strength / (1 + step)) < 3
        cautions = ("beam 6.5 arcsec and a faint excess: confusion is common.",) if check == "blend" else ()
        made[check] = Evidence(check, 1, adequate, fits, cautions, {}, f"{check}-{number}", BANDS)
    bound = make_fit("mixture", number, strength / 6)
    made["mixture"] = Evidence("mixture", 1, number % 4 != 0, (bound,), (), {"points": 10}, f"mixture-{number}", BANDS)
    made["dips"] = Evidence("dips", 1, None, (), (), {}, f"dips-{number}")
    return made
