"""Candidates, evidence and rulings as the tests of the store need them."""

from __future__ import annotations

from tui.model import CHECKS, Candidate, Evidence, Fit, Measurement, Param, Ruling
from tui.store.candidates import save_candidates
from tui.store.evidence import save_evidence
from tui.store.records import LoadRecord
from tui.store.rulings import append_ruling


def utc(second: float = 0.0) -> str:
    """A time of the test's own clock."""
    minutes, rest = divmod(second, 60)
    hours, minutes = divmod(int(minutes), 60)
    return f"2026-03-01T{hours:02d}:{minutes:02d}:{rest:09.6f}Z"


def star(name: str, **fluxes: float) -> Candidate:
    """A candidate with one 2MASS flux a band."""
    fluxes = fluxes or {"J": 1.0, "H": 0.8, "Ks": 0.5}
    measured = tuple(Measurement(band, flux, 0.02 * flux, source="2MASS") for band, flux in fluxes.items())
    return Candidate(name, measured, {"ra": 10.5, "dec": -3.25})


def evidence(kind: str, adequate: bool | None = False, digest: str = "first", pull: float = 8.0) -> Evidence:
    """Evidence as a check would give it."""
    fit = Fit(kind, 70.0, 2, 1e-16, 74.0, 75.0, {"teff": Param(5600.0, 5500.0, 5700.0, "K")}, {"J": 0.5, "W3": pull})
    fits = () if adequate is None else (fit,)
    return Evidence(kind, 1, adequate, fits, ("a caution",), {"note": [1, 2.5]}, f"{kind}-{digest}", ("J", "W3"))


def rule(connection, reviewer, name: str, check: str, word: str = "short", second: float = 100.0, **more) -> Ruling:
    """Append one ruling of a reviewer."""
    return append_ruling(connection, Ruling(name, check, reviewer.id, word, utc=utc(second), **more))


def walk(connection, reviewer, name: str, word: str = "short", second: float = 100.0) -> None:
    """Rule all five checks alike."""
    for check in CHECKS:
        rule(connection, reviewer, name, check, word, second)


def fill(connection, names, untestable=()) -> None:
    """Load candidates and give each evidence on every check."""
    save_candidates(connection, [LoadRecord(star(name), "table") for name in names], utc())
    rows = [(name, evidence(check, None if check in untestable else False)) for name in names for check in CHECKS]
    save_evidence(connection, rows)
