"""A candidate's own low-resolution spectrum: as narrow bands in the fits, or compared in its broad shape."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from functools import lru_cache

import numpy as np

from tui.checks.remarks import source_named
from tui.model import Candidate, Evidence, Fit, FloatArray, Measurement, Settings
from tui.physics.spectral import (
    INSTRUMENT,
    LEAST_POINTS,
    SCALE_ERROR,
    Shape,
    broad_means,
    grid_key,
    is_point,
    points_of,
    shape_fit,
)
from tui.physics.statistics import chi2_tail, ln_chi2_tail
from tui.physics.templates import Templates

NEAR_LN_T = 0.2  # the star that makes the spectrum may differ by this in ln T from the one that the bands ask for
SOURCE_LABEL = "spectrum"
NO_LINES = (
    "The photosphere source planck has no lines: where a spectrum is fitted, a star's own lines count against it. "
    "Give spectra of stars (grid DIR)."
)
NOT_FITTED = "The spectrum is not in the fits: {source} does not know stars at its resolution. Give spectra (grid DIR)."
MISFITS = "The candidate's own spectrum is no plain star's ({points} {what}, chi-square {chi2:.1f}, p = {p:.2g})."
HAS_TO_BE_EXPLAINED = "The spectrum misfits a plain star, and {source} cannot say whether this check explains that."


def enters(candidate: Candidate, templates: Templates) -> bool:
    """Whether the templates hold the points of the candidate's spectrum."""
    spectrum = candidate.spectrum
    return bool(templates.points) and spectrum is not None and grid_key(spectrum) == templates.points


def as_measured(candidate: Candidate, templates: Templates) -> Candidate:
    """The candidate with its spectrum's points as measurements, where the templates hold them; else as it is."""
    if not enters(candidate, templates) or candidate.spectrum is None:
        return candidate
    points = points_of(candidate.spectrum)
    columns = zip(points.bands, points.flux_jy.tolist(), points.error_jy.tolist(), strict=True)
    added = tuple(Measurement(band.name, flux, error, source=SOURCE_LABEL) for band, flux, error in columns)
    return replace(candidate, measurements=(*candidate.measurements, *added), spectrum=None)


def own_settings(settings: Settings, templates: Templates) -> Settings:
    """The settings with a common error of the points' scale, where templates hold points and none is set."""
    if not templates.points or INSTRUMENT in settings.common:
        return settings
    return replace(settings, common={**settings.common, INSTRUMENT: SCALE_ERROR})


@lru_cache(maxsize=4)
def narrowed(templates: Templates, names: tuple[str, ...]) -> Templates:
    """Some bands of templates, the same object each time, since what is built on it is kept by it."""
    return templates.take(names)


def bound_templates(candidates: Sequence[Candidate], templates: Templates) -> Templates:
    """The bands that the mixture bound needs where templates hold points: those measured, points only with a grid."""
    if not templates.points:
        return templates
    used = {one.band for candidate in candidates for one in candidate.measurements}
    plain = templates.photosphere == "planck"
    return narrowed(templates, tuple(name for name in templates.names if name in used and not (plain and is_point(name))))


def parts(fit: Fit) -> list[tuple[float, int]]:
    """Chi-square and points of a fit's photometry and of its spectrum; empty where it has no spectrum.

    Many good points of a spectrum would hide one bad band in the chi-square of all.
    """
    points = [pull for band, pull in fit.pulls.items() if is_point(band)]
    if not points:
        return []
    bands = [pull for band, pull in fit.pulls.items() if not is_point(band)]
    return [(float(np.sum(np.square(pulls))), len(pulls)) for pulls in (bands, points) if pulls]


def ln_p_of_parts(fit: Fit) -> float:
    """ln of the smaller p of photometry and spectrum, twice that for the choice; 0 where there is no spectrum."""
    found = [float(ln_chi2_tail(chi2, points)) for chi2, points in parts(fit)]
    return min([0.0, *(one + np.log(2.0) for one in found)])


def with_spectrum(
    evidence: Evidence, candidate: Candidate, measured: Candidate, templates: Templates, settings: Settings
) -> Evidence:
    """Star evidence with what its candidate's spectrum says.

    Args:
        candidate: as loaded, with its spectrum.
        measured: the same as fitted, its spectrum among the measurements where templates hold its points.
        templates: all bands of the queue.
    """
    best = evidence.best
    if candidate.spectrum is None or best is None:
        return evidence
    inside = measured.spectrum is None
    told = own_shape(candidate, best, templates, inside)
    remarks = [] if inside else [NOT_FITTED.format(source=source_named(templates.photosphere))]
    if inside and templates.photosphere == "planck":
        remarks = [NO_LINES]
    if told is None:
        return replace(evidence, cautions=(*evidence.cautions, *remarks))
    shape, points = told
    p = float(chi2_tail(shape.chi2, shape.dof))
    misfits = p < settings.p_min
    facts = {
        "spectrum_chi2": shape.chi2,
        "spectrum_dof": shape.dof,
        "spectrum_p": p,
        "spectrum_teff": shape.teff_k,
        "spectrum_misfits": misfits,
    }
    if misfits:
        what = "points" if inside else "wide bands"
        remarks.insert(0, MISFITS.format(points=points, what=what, chi2=shape.chi2, p=p))
    return replace(
        evidence,
        adequate=False if misfits and evidence.adequate else evidence.adequate,
        facts={**evidence.facts, **facts},
        cautions=(*evidence.cautions, *remarks),
    )


def own_shape(candidate: Candidate, best: Fit, templates: Templates, inside: bool) -> tuple[Shape, int] | None:
    """The plain star nearest to a spectrum by itself, and the bands compared; None where too few can be.

    Args:
        inside: the templates hold the spectrum's points; else it is compared in the wide bands.
    """
    grids = templates if inside else templates.broad
    if grids is None or candidate.spectrum is None:
        return None
    if inside:
        points = points_of(candidate.spectrum)
        names, flux, error = [band.name for band in points.bands], points.flux_jy, points.error_jy
    else:
        names = list(grids.names)
        flux, error = broad_means(candidate.spectrum, grids.bands)
    place = {name: column for column, name in enumerate(grids.names)}
    columns = np.array([place[name] for name in names], dtype=np.intp)
    good = np.isfinite(flux) & (error > 0) & np.isfinite(grids.star.ln_flux[:, columns]).all(axis=0)
    if good.sum() < LEAST_POINTS:
        return None
    return near_star(flux[good], error[good], columns[good], best, grids), int(good.sum())


def near_star(flux: FloatArray, error: FloatArray, columns: np.ndarray, best: Fit, grids: Templates) -> Shape:
    """The best star near the fitted temperature."""
    ln_t = grids.star.low + grids.star.step * np.arange(grids.star.ln_flux.shape[0])
    rows = np.flatnonzero(np.abs(ln_t - np.log(best.params["teff"].value)) <= NEAR_LN_T)
    cells = np.ix_(rows, columns)
    spread = np.hypot(grids.spread[cells], grids.floor[columns])
    return shape_fit(flux, error, grids.star.ln_flux[cells], spread, np.exp(ln_t[rows]))


def asks_for_more(evidence: Evidence, star: Evidence, templates: Templates) -> Evidence:
    """A natural check's evidence with the remark that the spectrum, which is not in its fits, misfits."""
    if not star.facts.get("spectrum_misfits") or templates.points:
        return evidence
    remark = HAS_TO_BE_EXPLAINED.format(source=source_named(templates.photosphere))
    return replace(evidence, cautions=(*evidence.cautions, remark))


def named(bands: Sequence[str]) -> list[str]:
    """Band names to be read: points of a spectrum as one.

    >>> named(["J", "spectrum:0.5", "spectrum:0.52"])
    ['J', '2 points of the spectrum']
    """
    points = [band for band in bands if is_point(band)]
    plain = [band for band in bands if not is_point(band)]
    if not points:
        return plain
    return [*plain, f"{len(points)} point{'s' if len(points) > 1 else ''} of the spectrum"]
