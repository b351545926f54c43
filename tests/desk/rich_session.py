"""One candidate of which everything is known, every text of it made to do harm: for the pages that show it all."""

from __future__ import annotations

from dataclasses import replace
from types import MappingProxyType

import numpy as np

from tests.desk.fake_session import FakeSession
from tests.desk.made import BANDS, FIXED_UTC, HOSTILE_NAMES, make_candidate, make_evidence
from tui.model import Dip, Neighbour, Param, Spectrum
from tui.workflow.dip_curves import DipCurve
from tui.workflow.lookalikes import LookAlike, LookAlikes
from tui.workflow.records import Cutout, RulingLine, StoryLine

RICH = "日本 [/] \x1b[2J\u202e e\u0301"  # wide, markup, steering, right to left, combining
BAD = "[bold]夜\x1b[31m[/]"
WAVE = np.geomspace(0.4, 0.9, 24)

FACTS = {
    "star": {
        "oddness": 10.978138, "odd_band": "Gaia_BP", "odd_pull": 7.57905, "over_luminosity": 0.523162,
        "over_luminosity_error": 0.28148, "spectrum_chi2": 55.361, "spectrum_dof": 5, "spectrum_p": 1.1000958e-10,
        "spectrum_teff": 5189.537, "spectrum_misfits": True, BAD: BAD,
    },
    "instrument": {
        "c_star": -0.00055, "c_star_sigma": 0.00701, "c_star_significance": -0.07885, "gaia_scatter": 0.00329,
        "flags": [{"band": "W4", "column": "ph_qual", "value": BAD, "meaning": "an upper limit", "cause": "faint",
                   "severity": "informative", "catalogue": BAD}],
        "doubts": [{"band": "J", "kind": "neighbour", "text": f"leaks 2 % {BAD}", "severity": "suspicion"}],
        "epochs": {"W1": {"n": 4, "scatter": 0.208841, "p": 0.0}, BAD: {"n": 12, "scatter": 0.0006, "p": 0.31}},
        "apertures": {"W1": {"difference": 0.001, "error": 0.0311}},
        "carrier_band": "WISE", "carrier_bands": ["W1", "W2"], "carrier_pull": 7.579, "carrier_p": 1.739168652e-29,
    },
    "blend": {
        "ruwe": 1.104, "bp_blended_share": 0.023, "chance_alignment": 0.0001075114606, "chance_band": "W2",
        "chance_mag": 10.8823, "chance_radius": 4.43819,
        "neighbour_leaks": [
            {"band": "Gaia_G", "leak_jy": 8.9e-225, "share": 1e-223, "anomaly_share": None, "nearest_arcsec": 3.84,
             "in_beam": 0},
            {"band": "W1", "leak_jy": 0.002, "share": 0.3791, "anomaly_share": 1.81, "nearest_arcsec": 3.84,
             "in_beam": 1},
        ],
        "matches": [{"catalogue": BAD, "separation": 0.1421295712, "sigma": 0.07, "d2": 4.1, "p": 0.127, "moved": 0.338,
                     "nearest_other": None}],
        "centroid_shifts": [{"catalogue": "AllWISE", "shift": 0.027, "sigma": 0.05, "p": 0.86, "share": 0.239,
                             "source": 0.11, "within": 0.53}],
    },
    "dust": {
        "delta_chi2": 114.1843749, "carried_by": ["W3", "spectrum:0.55"],
        "limit_temperature_k": [30.0, 300.0, 1200.0], "limit_fractional_luminosity": [7.111, 0.0009989, 0.01159],
    },
    "mixture": {
        "sentence": f"No mixture comes near: {BAD}.", "chi2": 245.44648, "points": 15, "p": 0.0, "at_most": False,
        "family": BAD, "chi2_found": 245.46115, "witness": {"SDSS_r": -0.7221, "SDSS_g": 0.5057, "J": 0.001},
        "parts": [
            {"family": "planck", "temperature": 100000.0, "av": 4.8105844, "r_v": 2.3, "share": 0.54523762},
            {"family": "feature", "temperature": 328.63, "centre_um": 3.5551, "av": 0.0, "r_v": 3.1, "share": 0.0001},
            {"family": BAD, "teff": 5000.0, "av": 0.0, "r_v": 3.1, "share": 0.2},
        ],
    },
    "dips": {
        "stands": True, "events": [BAD], "standing_events": [BAD], "slope": 0.00284, "slope_low": -0.0228,
        "slope_high": 0.02868, "slope_is_limit": False, "delta_chi2_grey": -1.390887437, "refused": ["grey"],
    },
}  # fmt: skip


class RichSession(FakeSession):
    """The fake queue, its first candidate under a hostile name and with everything that can be known of one."""

    def __init__(self) -> None:
        super().__init__([RICH, *(f"SM-{i:04d}" for i in range(2, 9))])
        theirs = RulingLine(
            "x", "blend", "curlew", "r-x", "explains", f"{BAD}\nsecond", FIXED_UTC, True, True, f"W3 {BAD}"
        )
        self.other[RICH] = [theirs, replace(theirs, id="y", handle="plover", current=False, stale="")]
        for check in ("star", "blend"):
            self.rule(RICH, check, "short", f"{BAD} and\nmore \x07")

    def view(self, name):
        seen = super().view(name)
        if name != RICH:
            return seen
        return replace(seen, done=True, seal_open=True, others=self.other[RICH], outcome="pending",
                       pending_reason="split:blend", states=seen.states | {"blend": "split"})  # fmt: skip

    def candidate(self, name):
        plain = make_candidate(name, self.id_of(name))
        if name != RICH:
            return plain
        told = {"source": BAD, "epoch": "JD 2451472.7629", "flags": {"ph_qual": BAD}}
        marked = tuple(replace(one, exclude=one.band == "H", **told) for one in plain.measurements)
        facts = dict(plain.facts) | {"parallax_error": 0.018, "phot_g_mean_mag": 11.43268, "age_myr": 4.0, BAD: BAD}
        near = (Neighbour(3.66, 358.0, {"J": 0.0624, "W1": 0.0308}, BAD), Neighbour(17.0, 80.0, {}, "cat"))
        dips = tuple(Dip(BAD, band, 0.2, 0.004, "2014-06-11") for band in ("Gaia_BP", "J", "Ks"))
        flux = np.interp(WAVE, [0.4, 0.9], [0.04, 0.07])
        return replace(plain, measurements=marked, facts=MappingProxyType(facts), neighbours=near, dips=dips,
                       spectrum=Spectrum(WAVE, flux, flux / 40))  # fmt: skip

    def stored_evidence(self, name):
        made = make_evidence(self.id_of(name))
        if name != RICH:
            return made
        bound = Param(4.9, 4.2, 4.9, "mag", limit=True), Param(2000.0, 20.0, 2000.0, "K", limit=True)
        limits = dict(zip(("av", "dust_temperature"), bound, strict=True))
        for kind, facts in FACTS.items():
            fits = tuple(replace(fit, p=0.0, params={**fit.params, **limits}) for fit in made[kind].fits)
            cautions = (*made[kind].cautions, f"W1: {BAD}", f"W2: {BAD}")
            made[kind] = replace(made[kind], facts=facts, fits=fits, cautions=cautions)
        return made

    def cutouts(self, name):
        image = np.add.outer(np.arange(24.0), np.arange(24.0))
        return [Cutout(band, image, 1.4) for band in ("W1", "W2", "J")]

    def dip_curves(self, name):
        wave = np.geomspace(0.4, 2.5, 20)
        return [
            DipCurve(BAD, "grey", 1.0, 2, 0.6, wave, np.full(20, 0.2)),
            DipCurve(BAD, BAD, 9e3, 1, 0.0, wave, 0.1 / wave),
        ]

    def look_alikes(self, name, star=None):
        alike = tuple(LookAlike(one, 0.95, 8.1, 9.123, BAD, 1.5) for one in HOSTILE_NAMES)
        return LookAlikes(RICH, "W4", "Gaia_G", 60, 15, 0.5, 0.01, {"magnitude": 0.01, "place": float("nan")}, True,
                          f"15 candidates share this pattern {BAD}.", alike)  # fmt: skip

    def story(self, name):
        return [
            StoryLine("2026-03-01T10:00:00.000000Z", "measured", BAD, "", f"{' '.join(BANDS)} {BAD}"),
            StoryLine("2026-03-02T11:30:00.000000Z", "ruled", "heron", "star", f"short: {BAD} W3 is odd"),
            StoryLine("2026-03-03T11:30:00.000000Z", "withdrawn", "heron", "dust", "withdrawn"),
            StoryLine("2026-03-04T09:15:00.000000Z", "corrected", "archive", "", "W3 measured anew", True),
        ]
