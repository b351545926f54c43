"""One candidate as text: why it is odd, what was measured, and what each check's fits say."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from tui.cli.printing import NOTHING, figure, heading, line, signed, table
from tui.model import CHECK_TITLES, CHECKS, Dip, Evidence, Fit, Measurement, Neighbour, Param
from tui.workflow.lookalikes import LookAlikes
from tui.workflow.showing import Dossier

ADEQUATE = {True: "adequate: some fit explains the data", False: "not adequate: no fit explains the data"}
AGAINST = {"dip_stands": "a dip is unexplained", "spectrum_misfits": "the star's own spectrum misfits"}
BOUND = {True: "not refused", False: "refused", None: "not given"}
MOST_ALIKE = 10  # look-alikes listed
UNTESTABLE = "untestable with these data"


def print_dossier(found: Dossier) -> None:
    """Print everything; the reader's own stale rulings are said with their reason."""
    line(f"{found.candidate.name}   outcome: {found.view.outcome}   {place(found.candidate.facts)}".rstrip())
    line(oddness_sentence(found.oddness))
    print_measurements(found)
    print_neighbours(found.candidate.neighbours)
    for check in CHECKS:
        print_check(found, check)
    for kind, title in (("mixture", "mixture bound"), ("dips", "dips")):
        evidence = found.evidence.get(kind)
        if evidence is not None and (evidence.fits or evidence.cautions or evidence.facts):
            heading(f"{title}: {adequacy_words(evidence)}")
            print_evidence(evidence)
            if kind == "mixture" and found.drawn:
                line(found.drawn.sentence)
            print_depths(found.candidate.dips if kind == "dips" else ())
    print_look_alikes(found.look_alikes)


def print_neighbours(neighbours: Sequence[Neighbour]) -> None:
    """One row a neighbouring source, nearest first."""
    if not neighbours:
        return
    heading("neighbours")
    rows = [
        (figure(one.separation_arcsec, 3), figure(one.position_angle_deg, 3), one.source or NOTHING, fluxes_words(one))
        for one in neighbours
    ]
    table(("separation (arcsec)", "position angle (deg)", "source", "flux (mJy)"), rows, numbers=(0, 1))


def fluxes_words(one: Neighbour) -> str:
    """The neighbour's flux densities by band."""
    return "; ".join(f"{band} {figure(1000.0 * flux)}" for band, flux in one.fluxes_jy.items()) or NOTHING


def print_depths(dips: Sequence[Dip]) -> None:
    """One row a band of a dimming event: the share of the flux lost."""
    if dips:
        rows = [
            (one.event, one.band, figure(one.depth), figure(one.depth_error, 2), one.epoch or NOTHING) for one in dips
        ]
        table(("event", "band", "depth", "error", "epoch"), rows, numbers=(2, 3))


def print_look_alikes(found: LookAlikes | None) -> None:
    """What the candidates with a like pattern of pulls mean, and the most alike of them."""
    if found is None:
        return
    heading(f"look-alikes among {found.searched} candidates")
    line(found.sentence)
    if found.shared:
        line("p by chance: " + ", ".join(f"{name} {figure(p, 2)}" for name, p in found.shared.items()))
    if found.candidates:
        rows = [
            (one.name, figure(one.cosine, 3), signed(one.pull), figure(one.mag), figure(one.apart_deg, 3), one.epoch)
            for one in found.candidates[:MOST_ALIKE]
        ]
        heads = ("name", "cosine", f"{found.band} pull", f"{found.mag_band} mag", "apart (deg)", "epoch")
        table(heads, [(*cells[:-1], cells[-1] or NOTHING) for cells in rows], numbers=(1, 2, 3, 4))


def place(facts: Mapping[str, object]) -> str:
    """Where on the sky, in degrees, where the table said it."""
    if "ra" in facts and "dec" in facts:
        return f"ra {facts['ra']} dec {facts['dec']}"
    return ""


def oddness_sentence(oddness: Mapping[str, object]) -> str:
    """Why a search may have called it odd."""
    if not oddness or oddness.get("sigma") is None:
        return "Oddness: not computed."
    return f"Oddness: {figure(oddness['sigma'], 3)} sigma, most by {oddness['band']} ({signed(oddness['pull'])})."


def adequacy_words(evidence: Evidence | None, p_min: float = 0.0) -> str:
    """The evidence's own state in words.

    Args:
        p_min: from which a fit stands, for evidence that something else than its fits makes not adequate.
    """
    if evidence is None:
        return "no evidence yet"
    if evidence.kind == "mixture":
        return BOUND[evidence.adequate]
    if evidence.adequate is False and any(fit.p >= p_min > 0 for fit in evidence.fits):
        against = [words for name, words in AGAINST.items() if evidence.facts.get(name)]
        if against:
            return f"not adequate: the fit stands, but {' and '.join(against)}"
    return UNTESTABLE if evidence.adequate is None else ADEQUATE[evidence.adequate]


def print_measurements(found: Dossier) -> None:
    """One row a measurement, with its pull from the plain star where that was fitted."""
    star = found.evidence.get("star")
    pulls = star.best.pulls if star and star.best else {}
    heading("measurements")
    rows = [measurement_cells(one, pulls) for one in found.measurements]
    table(("band", "flux (mJy)", "error", "star pull", "source", "epoch", "flags"), rows, numbers=(1, 2, 3))


def measurement_cells(one: Measurement, pulls: Mapping[str, float]) -> tuple[str, ...]:
    """A measurement as cells; a limit is marked < and an excluded one says so."""
    flux = ("<" if one.limit else "") + figure(1000.0 * one.flux_jy)
    error = f"{one.nsigma:g} sigma" if one.limit else figure(1000.0 * one.error_jy, 2)
    flags = " ".join(f"{name}={value}" for name, value in one.flags.items())
    flags = f"{flags} (kept, not fitted)".strip() if one.exclude else flags
    pull = NOTHING if one.exclude else signed(pulls.get(one.band))
    return (one.band, flux, error, pull, one.source or NOTHING, one.epoch or NOTHING, flags or NOTHING)


def print_check(found: Dossier, check: str) -> None:
    """One check: its state, its evidence's, its fits and cautions."""
    evidence = found.evidence.get(check)
    heading(f"{CHECK_TITLES[check]}: {found.view.states.get(check, 'todo')}; {adequacy_words(evidence, found.p_min)}")
    if check in found.view.stale:
        line(f"stale: {found.view.stale[check]}")
    if evidence is not None:
        print_evidence(evidence)


def print_evidence(evidence: Evidence) -> None:
    """Fits, best first, then facts and cautions."""
    print_fits(evidence.fits)
    for name, value in evidence.facts.items():
        if isinstance(value, (str, int, float, bool)):
            line(f"{name.replace('_', ' ')}: {fact_words(value)}")
    for caution in evidence.cautions:
        line(f"caution: {caution}")


def fact_words(value: object) -> str:
    """A fact as text.

    >>> fact_words(True), fact_words(0.25), fact_words(3)
    ('yes', '0.2500', '3')
    """
    if isinstance(value, bool):
        return "yes" if value else "no"
    return figure(value) if isinstance(value, float) else str(value)


def print_fits(fits: Sequence[Fit]) -> None:
    """How well each model fits, then what it fitted."""
    if not fits:
        return
    rows = [
        (fit.model, figure(fit.chi2), str(fit.dof), p_words(fit.p), figure(fit.bic), largest_pull(fit)) for fit in fits
    ]
    table(("model", "chi2", "dof", "p", "BIC", "largest pull"), rows, numbers=(1, 2, 3, 4))
    fitted = [
        (fit.model, name.replace("_", " "), *param_cells(param)) for fit in fits for name, param in fit.params.items()
    ]
    if fitted:
        table(("model", "fitted", "value", "low", "high", "unit"), fitted, numbers=(2, 3, 4))


def p_words(p: float) -> str:
    """A chance probability; one too small for the machine's numbers reads as below them.

    >>> p_words(0.25), p_words(0.0)
    ('0.25', '<1e-300')
    """
    return "<1e-300" if p == 0 else figure(p, 2)


def param_cells(param: Param) -> tuple[str, str, str, str]:
    """A fitted number with its 68 % interval, or as the one-sided 95 % limit that it is.

    >>> param_cells(Param(5772.0, 5700.0, 5850.0, "K"))
    ('5772', '5700', '5850', 'K')
    >>> param_cells(Param(0.0, 0.0, 0.2, "mag", limit=True))
    ('0.000', '', '<0.2000', 'mag')
    """
    if not param.limit:
        return figure(param.value), figure(param.low), figure(param.high), param.unit
    low = f">{figure(param.low)}" if param.low != param.value else ""
    high = f"<{figure(param.high)}" if param.high != param.value else ""
    return figure(param.value), low, high, param.unit


def largest_pull(fit: Fit) -> str:
    """Band and pull farthest from the model."""
    if not fit.pulls:
        return NOTHING
    band = max(fit.pulls, key=lambda name: abs(fit.pulls[name]))
    return f"{band} {signed(fit.pulls[band])}"
