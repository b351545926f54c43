"""Could the data be wrong: is the anomaly carried by bands that independent evidence speaks against?"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import replace

import numpy as np

from tui.checks.carrier import Carrier, find_carriers, removal_trials
from tui.checks.carrier_words import carrier_facts, carrier_sentences
from tui.checks.colours import w4_red_excess, w4_sentence
from tui.checks.doubts import Doubt, sentences
from tui.checks.neighbours import measured_fluxes, neighbour_sentences
from tui.checks.quality import Quality, all_gaia_facts, candidate_quality
from tui.checks.record import any_stands, stands
from tui.checks.tables import Tables
from tui.model import Candidate, Evidence, Fit, FloatArray, Settings
from tui.physics.composite import STAR
from tui.physics.fitting import FitBatch, fit
from tui.physics.removal import chi2_without

KIND = "instrument"
VERSION = 4  # raise it whenever the same candidate could get other numbers
FEW = 2  # degrees of freedom without the suspects, up to which a caution is given

Record = Callable[[FitBatch], list[Fit]]  # how fitted rows become fits


def assess(
    candidates: Sequence[Candidate],
    batch: FitBatch,
    star: Sequence[Evidence],
    record: Record,
    tables: Tables,
    settings: Settings,
) -> list[Evidence]:
    """Instrument evidence for each candidate; order kept.

    Args:
        batch: star-only fits of these candidates, one row each.
        star: their star evidence; its fit enters as it is.
        record: makes fits of a batch's rows, as the star check does.
    """
    bands = {band.name: band for band in batch.problem.templates.bands}
    quality = [
        candidate_quality(candidate, bands, tables, facts, anomalies)
        for candidate, facts, anomalies in zip(
            candidates, all_gaia_facts(candidates, bands, tables), star_anomalies(batch), strict=True
        )
    ]
    carriers = batch_carriers(batch)
    present = batch.problem.detected | batch.problem.limited
    suspects = np.array([[name in one.suspects for name in bands] for one in quality], dtype=bool)
    suspects = suspects.reshape(present.shape) & present
    without = fits_without(batch, suspects, record)
    return [
        one_evidence(candidates[row], star[row], quality[row], carriers[row], without.get(row), tuple(bands), settings)
        for row in range(len(candidates))
    ]


def star_anomalies(batch: FitBatch) -> list[dict[str, float]]:
    """Measured minus star-only model of each detection, Jy, one mapping a candidate."""
    left = batch.problem.flux_jy - batch.prediction.flux
    names = batch.problem.templates.names
    return [
        {names[column]: float(left[row, column]) for column in np.flatnonzero(batch.problem.detected[row])}
        for row in range(len(batch.problem))
    ]


def batch_carriers(batch: FitBatch) -> list[Carrier | None]:
    """The carrier of each row of star-only fits, errors held as the fit left them."""
    problem = batch.problem
    present, names = problem.detected | problem.limited, problem.templates.names
    trials = removal_trials(present, names, [band.instrument for band in problem.templates.bands])
    rows = np.arange(len(problem))
    nothing = np.zeros((rows.size, present.shape[1]), dtype=bool)
    chi2 = chi2_without(batch, np.concatenate([rows, trials.row]), np.concatenate([nothing, trials.dropped]))
    pulls: FloatArray = np.nan_to_num(batch.pulls)
    return find_carriers(trials, names, chi2[: rows.size], present.sum(axis=1), chi2[rows.size :], pulls)


def fits_without(batch: FitBatch, suspects: np.ndarray, record: Record) -> dict[int, Fit]:
    """Row -> star-only fit without its suspect bands, for rows that have any and keep a band to fit.

    Its information criteria are left open: they cannot be compared with those of a fit to more data.
    """
    kept = (batch.problem.detected & ~suspects).sum(axis=1)
    rows = np.flatnonzero(suspects.any(axis=1) & (kept > 0))
    if not rows.size:
        return {}
    anew = fit(batch.problem.take(rows).without(suspects[rows]), STAR)
    names = np.array(batch.problem.templates.names)
    return {
        int(row): replace(
            found,
            model=f"star without {', '.join(names[suspects[row]].tolist())}",
            aic=float("nan"),
            bic=float("nan"),
        )
        for row, found in zip(rows, record(anew), strict=True)
    }


def one_evidence(
    candidate: Candidate,
    star: Evidence,
    quality: Quality,
    carrier: Carrier | None,
    without: Fit | None,
    bands: Sequence[str],
    settings: Settings,
) -> Evidence:
    """Put one candidate's evidence together."""
    suspects = tuple(name for name in bands if name in quality.suspects and name in star.bands)
    answer = None if without is None else stands(without, len(without.pulls), settings)
    facts = quality.as_facts()
    facts["suspect_bands"] = list(suspects)
    facts["p_without_suspects"] = None if without is None else without.p
    if carrier is not None:
        facts.update(carrier_facts(carrier, suspects))
    red = w4_red_excess({name: flux for name, (flux, _) in measured_fluxes(candidate).items()})
    if red > 0:
        facts["w4_reads_high"] = red
    beyond = is_beyond_photometry(star, settings)
    fits = (*star.fits[:1],) if without is None else order(star.fits[:1], without, star.adequate, answer)
    cautions = (
        *([] if quality.is_loaded else [NOTHING_LOADED]),
        *([NOT_THE_DATA] if beyond else []),
        *(() if star.adequate is not False else carrier_sentences(carrier, suspects, bands, star.bands, settings)),
        *sentences(of_the_fit(quality.doubts, star.bands)),
        *neighbour_sentences(list(quality.leaks)),
        *few_left(without),
        *w4_sentence(red),
    )
    adequate = any_stands([star.adequate, False if beyond else answer]) if quality.is_loaded else None
    return Evidence(KIND, VERSION, adequate, fits, cautions, facts, bands=star.bands)


def of_the_fit(doubts: Iterable[Doubt], fitted: Sequence[str]) -> list[Doubt]:
    """Doubts about fitted bands as they are; those about bands that were measured only say so."""
    return [doubt if doubt.band in fitted else replace(doubt, band=f"{doubt.band} (not fitted)") for doubt in doubts]


NOTHING_LOADED = (
    "No flag, epoch, aperture, neighbour or quality column was loaded: nothing could speak against a band."
)
NOT_THE_DATA = "A dip or the spectrum misfits as well, and no error of a band explains that."


def is_beyond_photometry(star: Evidence, settings: Settings) -> bool:
    """Whether a dip or a spectrum, which no bad band explains, refuses the star alone."""
    if star.facts.get("dip_stands") or star.facts.get("spectrum_misfits"):
        return True
    found = star.best
    return star.adequate is False and found is not None and stands(found, len(found.pulls), settings) is True


def few_left(without: Fit | None) -> tuple[str, ...]:
    """A caution where hardly anything is tested once the suspects are out."""
    if without is None or without.dof > FEW:
        return ()
    return (f"Without the suspect bands {len(without.pulls)} are left to fit: that tests little.",)


def order(star: tuple[Fit, ...], without: Fit, alone: bool | None, answer: bool | None) -> tuple[Fit, ...]:
    """The fit that decides first: their BIC cannot be compared, since they are not of the same data."""
    return (without, *star) if answer is True and alone is not True else (*star, without)
