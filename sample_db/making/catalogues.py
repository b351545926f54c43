"""What the catalogues make of a star: noise, limits, flags, in the catalogues' own columns."""

from __future__ import annotations

from typing import Any

import numpy as np
from making.sky import Sky, magnitude
from making.star import MARSH, MEADOW, Star

from tui.checks.tables import Tables
from tui.physics.context import leak_fraction
from tui.physics.gaia import expected_excess, excess_sigma, quiet_scatter

FIELDS = {MARSH: (287.2, 8.6), MEADOW: (198.2, 24.3)}  # centres, degrees
GAIA_BANDS = {"g": "Gaia_G", "bp": "Gaia_BP", "rp": "Gaia_RP"}
TWOMASS_BANDS = {"j": "J", "h": "H", "k": "Ks"}
WISE_BANDS = ("W1", "W2", "W3", "W4")
STAR_TO_STAR = 0.022  # real stars scatter about their sequence
CALIBRATION = 0.8  # of each band's floor
FIRST_SOURCE_ID = 9_000_000_000_000_000_000  # above every identifier that Gaia gives
GAIA_YR, WISE_YR = 2016.0, 2010.55
TWOMASS_JD, WISE_MJD = 2451324.8, 55397.3  # in the middle of the survey
TWOMASS_DAYS = 1300  # that the survey lasted
JD_2000, DAYS_PER_YEAR = 2451545.0, 365.25
LIMIT_SIGMA = {"2MASS": 10.0, "WISE": 5.0, "SDSS": 5.0}  # at which the bands' usual depths are quoted
FAINT_JY = {
    "IRAC1": 2e-5,
    "IRAC2": 2e-5,
    "IRAC3": 5e-5,
    "IRAC4": 5e-5,
    "MIPS24": 2e-4,
    "AKARI_S9W": 1.2e-2,
    "AKARI_L18W": 3e-2,
    "PACS70": 2e-3,
    "PACS100": 3e-3,
    "PACS160": 6e-3,
    "GALEX_NUV": 4e-7,
    "B": 1e-5,
    "V": 1e-5,
    "Rc": 1e-5,
    "Ic": 1e-5,
    **dict.fromkeys(("PS1_g", "PS1_r", "PS1_i", "PS1_z", "PS1_y"), 2e-6),
    "BT": 2e-3,
    "VT": 2e-3,
    "IRAS12": 2e-2,
    "IRAS25": 2e-2,
}


class Observer:
    """Sees stars through the catalogues; every star and table has a random state of its own, made from one."""

    def __init__(self, sky: Sky, tables: Tables, state: int) -> None:
        self.sky, self.tables, self.state = sky, tables, state
        self.rng = np.random.default_rng(state)

    def turn_to(self, star: Star, table: int) -> None:
        """Begin to observe a star for one of the tables."""
        self.rng = np.random.default_rng([self.state, *star.stream, table])

    # --- flux densities ---

    def true_flux(self, star: Star, band: str) -> float:
        """Light in the band with that of neighbours that its beam lets in, and the catalogue's own error, Jy."""
        flux = self.sky.flux(star, band)
        beam = self.sky.bands[band].beam_fwhm_arcsec
        if np.isfinite(beam):
            flux += sum(
                leak_fraction(near[0], beam) * self.neighbour_flux(star, near, band) for near in star.neighbours
            )
        return float(flux) * 10 ** (-0.4 * star.offset_mag.get(band, 0.0))

    def neighbour_flux(self, star: Star, near: tuple[float, float, float, float], band: str) -> float:
        """Flux of a neighbour in a band, Jy."""
        _, _, teff, fainter = near
        theta2 = (
            self.sky.bands["Ks"].zero_point_jy * 10 ** (-0.4 * (star.ks_mag + fainter)) / self.sky.surface("Ks", teff)
        )
        return theta2 * self.sky.surface(band, teff)

    def seen(self, star: Star, band: str) -> tuple[float, float]:
        """Measured flux and the catalogue's error of it, Jy."""
        row = self.sky.bands[band]
        flux = self.true_flux(star, band)
        if row.instrument in LIMIT_SIGMA:
            faint = row.zero_point_jy * 10 ** (-0.4 * row.limit_mag) / LIMIT_SIGMA[row.instrument]
            share = 0.01 if row.instrument == "SDSS" else 0.02
        elif row.instrument == "Gaia":
            faint, share = 1e-7, 0.0005 if band == "Gaia_G" else 0.002
        else:
            faint, share = FAINT_JY[band], 0.02
        error = float(np.hypot(share * flux, faint))
        own = np.hypot(STAR_TO_STAR, CALIBRATION * row.floor) * flux
        return flux + own * self.rng.standard_normal() + error * self.rng.standard_normal(), error

    # --- catalogues ---

    def gaia(self, star: Star, number: int) -> dict[str, Any]:
        """Columns of Gaia DR3."""
        rng, odd = self.rng, dict(star.gaia)
        excess, scatter = odd.pop("excess", 0.0), odd.pop("scatter", 1.0)
        ra, dec = self.position(star)
        row: dict[str, Any] = {
            "source_id": FIRST_SOURCE_ID + 1000 * number + int(rng.integers(1000)),
            "ref_epoch": GAIA_YR,
            "ra": ra,
            "dec": dec,
            "ra_error": 0.02,
            "dec_error": 0.02,
            **self.parallax(star),
            "pmra_error": 0.03,
            "pmdec_error": 0.03,
            "ruwe": round(float(abs(rng.normal(1.01, 0.06))), 3),
            "ipd_frac_multi_peak": int(rng.integers(0, 3)),
            "ipd_gof_harmonic_amplitude": round(float(rng.uniform(0.01, 0.05)), 4),
            "duplicated_source": False,
            "non_single_star": 0,
            "phot_variable_flag": "NOT_AVAILABLE",
            "phot_proc_mode": 0,
            "teff_gspphot": round(float(star.teff_k * rng.normal(1, 0.02)), 1),
            "logg_gspphot": round(float(rng.normal(4.4, 0.1)), 3),
        }
        row.update(self.gaia_photometry(star, excess, scatter))
        return row | {key: round(value, 4) if isinstance(value, float) else value for key, value in odd.items()}

    def position(self, star: Star) -> tuple[float, float]:
        """Right ascension and declination at Gaia's epoch, degrees."""
        ra, dec = FIELDS[star.place]
        spread = self.rng.uniform(-1.4, 1.4, 2)
        return star.facts.get("ra", ra + spread[0] / np.cos(np.radians(dec))), star.facts.get("dec", dec + spread[1])

    def parallax(self, star: Star) -> dict[str, float]:
        """Parallax and proper motion with their errors; the zero point of -0.017 mas is in the catalogue's values."""
        true, error = 1000.0 / self.sky.distance_pc(star), 0.018
        scatter = 10 ** (-0.2 * self.rng.normal(0, 0.12))  # of real dwarfs about their sequence
        motion = self.rng.normal(0, 2.5 * true, 2) + star.motion_mas_yr
        return {
            "parallax": round(float(true * scatter - 0.017 + error * self.rng.standard_normal()), 4),
            "parallax_error": error,
            "pmra": round(float(motion[0]), 3),
            "pmdec": round(float(motion[1]), 3),
        }

    def gaia_photometry(self, star: Star, excess: float, scatter: float) -> dict[str, Any]:
        """Magnitudes of G, BP, RP, their errors, counts of transits and the excess factor."""
        rng, row = self.rng, {}
        mags: dict[str, float] = {}
        counts = {"g": int(rng.integers(180, 420)), "bp": int(rng.integers(18, 46)), "rp": int(rng.integers(18, 46))}
        for letter, band in GAIA_BANDS.items():
            if band in star.absent:
                continue
            flux, error = self.seen(star, band)
            mags[letter] = magnitude(flux, self.sky.bands[band])
            ratio = flux / error
            if letter == "g":
                quiet = float(quiet_scatter(np.array([mags["g"]]), self.tables.quiet)[0])
                ratio = np.sqrt(counts["g"]) / (quiet * scatter * rng.uniform(0.85, 1.2))
            row |= {
                f"phot_{letter}_mean_mag": round(mags[letter], 5),
                f"phot_{letter}_mean_flux_over_error": round(float(ratio), 2),
            }
        for letter, count in counts.items():
            row[f"phot_{letter}_n_obs"] = count
        for letter in ("bp", "rp"):
            row |= {
                f"phot_{letter}_n_blended_transits": int(rng.integers(0, 2)),
                f"phot_{letter}_n_contaminated_transits": 0,
            }
        if len(mags) == 3:
            colour, g = np.array([mags["bp"] - mags["rp"]]), np.array([mags["g"]])
            usual = (
                expected_excess(colour, self.tables.excess)
                + excess_sigma(g, self.tables.excess) * rng.standard_normal()
            )
            row |= {"bp_rp": round(float(colour[0]), 5), "phot_bp_rp_excess_factor": round(float(usual[0] + excess), 5)}
        return row

    def twomass(self, star: Star, gaia: dict[str, Any]) -> dict[str, Any]:
        """Columns of the 2MASS point source catalogue."""
        night = star.twomass.get("jdate") or self.night(star)
        ra, dec = self.moved(gaia, 2000.0 + (night - JD_2000) / DAYS_PER_YEAR, 0.07)
        row: dict[str, Any] = {
            "ra": ra,
            "dec": dec,
            "err_maj": 0.07,
            "jdate": night,
            "gal_contam": 0,
            "mp_flg": 0,
            "prox": round(float(self.rng.uniform(12, 60)), 1),
            "cc_flg": "000",
            "bl_flg": "",
            "rd_flg": "",
        }
        quality = ""
        for letter, band in TWOMASS_BANDS.items():
            if band in star.absent:
                quality, row["rd_flg"], row["bl_flg"] = quality + "X", row["rd_flg"] + "9", row["bl_flg"] + "0"
                continue
            flux, error = self.seen(star, band)
            ratio = flux / error
            found = ratio >= 5
            level = flux if found else max(flux, 0.0) + 1.645 * error  # 95 % limit
            row[f"{letter}_m"] = round(magnitude(level, self.sky.bands[band]), 3)
            row[f"{letter}_msigcom"] = round(float(1.0857 / ratio), 3) if found else None
            quality += "A" if ratio > 10 else "B" if ratio > 7 else "C" if found else "U"
            row["rd_flg"] += "2" if found else "0"
            row["bl_flg"] += "1" if found else "0"
        if star.neighbours:
            row["prox"] = round(star.neighbours[0][0], 1)
        return row | {"ph_qual": quality} | dict(star.twomass)

    def night(self, star: Star) -> float:
        """The Julian date on which 2MASS saw a star: some night of the survey, by a random state of its own."""
        share = np.random.default_rng([self.state, *star.stream, 9]).uniform(-0.5, 0.5)
        return round(float(TWOMASS_JD + TWOMASS_DAYS * share), 4)

    def wise(self, star: Star, gaia: dict[str, Any]) -> dict[str, Any]:
        """Columns of the AllWISE source catalogue."""
        ra, dec = self.moved(gaia, WISE_YR, 0.05, star.wise_offset_arcsec)
        odd = dict(star.wise)
        offsets = {band: odd.pop(f"{band.lower()}mag_offset", 0.0) for band in WISE_BANDS}
        row: dict[str, Any] = {
            "ra": ra,
            "dec": dec,
            "sigra": 0.05,
            "sigdec": 0.05,
            "nb": 1,
            "na": 0,
            "cc_flags": "0000",
            "ext_flg": 0,
            "var_flg": f"{self.rng.integers(0, 4)}{self.rng.integers(0, 4)}nn",
            "moon_lev": "0000",
            "w1mjdmean": WISE_MJD,
        }
        quality = ""
        for band in WISE_BANDS:
            if band in star.absent:
                quality += "X"
                continue
            letter, cells = self.wise_band(star, band, offsets[band])
            quality, row = quality + letter, row | cells
        return row | {"ph_qual": quality} | odd

    def wise_band(self, star: Star, band: str, aperture_offset: float) -> tuple[str, dict[str, Any]]:
        """The quality letter and the columns of one band."""
        key, row = band.lower(), self.sky.bands[band]
        flux, error = self.seen(star, band)
        ratio, found = flux / error, flux / error >= 2
        mag = magnitude(flux if found else max(flux, 0.0) + 2 * error, row)  # AllWISE gives 95 % limits there
        sigma = round(float(1.0857 / ratio), 3) if found else None
        saturated = max(0.0, 0.06 * (row.saturation_mag - mag))
        letter = "A" if ratio > 10 else "B" if ratio > 3 else "C" if found else "U"
        aperture = mag + aperture_offset + (0.6 * sigma * self.rng.standard_normal() if found else 0.0)
        return letter, {
            f"{key}mpro": round(mag, 3),
            f"{key}sigmpro": sigma,
            f"{key}snr": round(float(ratio), 1) + 0.0,
            f"{key}sat": round(saturated, 3),
            f"{key}rchi2": round(float(self.rng.normal(1.0, 0.08)), 2),
            f"{key}mag": round(float(aperture), 3) if found else None,
            f"{key}sigm": sigma,
        }

    def moved(
        self, gaia: dict[str, Any], year: float, sigma: float, offset: tuple[float, float] = (0.0, 0.0)
    ) -> tuple[float, float]:
        """Where another catalogue saw the star at its own epoch, degrees."""
        years = year - GAIA_YR
        east, north = (
            gaia[key] * years / 1000.0 + off + sigma * self.rng.standard_normal()
            for key, off in zip(("pmra", "pmdec"), offset, strict=True)
        )
        return (
            round(float(gaia["ra"] + east / 3600.0 / np.cos(np.radians(gaia["dec"]))), 7),
            round(float(gaia["dec"] + north / 3600.0), 7),
        )
