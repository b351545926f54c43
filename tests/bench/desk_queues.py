"""Queues for the desk's benchmark: one of a million lines, one with 10,000 candidates that lack all evidence."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from tui.model import Candidate, Measurement
from tui.store import connect, reviewers
from tui.store.candidates import save_candidates
from tui.store.names import folded, ring
from tui.store.records import LoadRecord

UTC = "2026-03-04T05:06:07.000000Z"
PIVOT_UM = {
    "Gaia_BP": 0.511, "SDSS_g": 0.475, "V": 0.55, "Gaia_G": 0.622, "SDSS_r": 0.62, "SDSS_i": 0.75, "Gaia_RP": 0.777,
    "J": 1.235, "H": 1.662, "Ks": 2.159, "W1": 3.353, "W2": 4.603, "W3": 11.56, "W4": 22.09,
}  # fmt: skip


def make_long(path: Path, rows: int) -> None:
    """A queue of so many assessed candidates, as many as it takes to measure a list; no measurements."""
    connection = connect.open_queue(str(path), create=True)
    names = [f"SM-{i:07d}" for i in range(rows)]
    with connect.immediate(connection):
        connection.executemany("INSERT INTO candidate (id, name) VALUES (?, ?)", enumerate(names, 1))
        connection.executemany(
            "INSERT INTO queue_row (id, name, fold, ring, oddness, odd_band, odd_pull) VALUES (?, ?, ?, ?, ?, ?, ?)",
            ((i, name, folded(name), ring(name), (i * 7919 % rows) / rows * 12, "W3", i % 90 / 10)
             for i, name in enumerate(names, 1)),
        )  # fmt: skip
    reviewers.add_reviewer(connection, "heron", UTC)
    connection.close()


def make_measured(path: Path, rows: int) -> None:
    """A queue of stars of several temperatures in fourteen bands, some with dust; nothing is assessed."""
    rng = np.random.default_rng(1)
    connection = connect.open_queue(str(path), create=True)
    save_candidates(connection, (LoadRecord(star(rng, i), "bench") for i in range(rows)), UTC)
    reviewers.add_reviewer(connection, "heron", UTC)
    connection.close()


def star(rng: np.random.Generator, number: int) -> Candidate:
    """One of them: Planck's law, 2 % errors, every third with an excess beyond 5 micron."""
    wave = np.array(list(PIVOT_UM.values()))
    shape = wave**-3 / np.expm1(14387.77 / (wave * rng.uniform(3500, 9000)))  # c2: CODATA 2018, micron K
    excess = np.where(wave > 5, 1 + rng.exponential(0.5) * (number % 3 == 0), 1.0)
    flux = 10 ** rng.uniform(-3, -1) * shape / shape.max() * excess * rng.normal(1, 0.02, wave.size)
    seen = tuple(Measurement(band, float(one), float(one * 0.02)) for band, one in zip(PIVOT_UM, flux, strict=True))
    return Candidate(f"SM-{number:07d}", seen, {"ra": number * 0.03, "dec": 10.0, "parallax": 4.0, "parallax_error": 0.1})
