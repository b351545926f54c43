"""Real stars with published answers, read through the program's own reader."""

from __future__ import annotations

import csv
import math
from dataclasses import dataclass, replace
from pathlib import Path
from types import SimpleNamespace

from tui.data.archives import archive_texts
from tui.data.load import band_aliases, bands, read_rows
from tui.model import Candidate
from tui.readers import parse_archives, read_table

HERE = Path(__file__).parent
PARALLAX_ERROR_MAS = 0.05  # the answers' table gives none; Gaia's are smaller, and nothing here needs better


@dataclass(frozen=True)
class RealStar:
    """One star and what was published about it; NaN where nothing was."""

    candidate: Candidate
    group: str  # a dust, b no excess, c reddened, d pair, e contaminated
    sp_type: str
    teff_k: float
    t_dust_k: tuple[float, ...]
    l_ir_total: float
    a_v: float
    doubtful: bool

    @property
    def name(self) -> str:
        return self.candidate.name

    @property
    def magnitudes(self) -> dict[str, float]:
        """Band -> magnitude as catalogued, of detections that are fitted."""
        kept = [m for m in self.candidate.measurements if not (m.limit or m.exclude)]
        return {m.band: m.value for m in kept if m.unit.startswith("mag")}

    def up_to(self, longest_um: float) -> Candidate:
        """The candidate with its bands up to a wavelength only."""
        kept = tuple(m for m in self.candidate.measurements if bands()[m.band].pivot_um <= longest_um)
        return replace(self.candidate, measurements=kept)


def answers() -> list[dict[str, str]]:
    """Rows of the table of answers."""
    lines = (HERE / "real_stars.csv").read_text(encoding="utf-8").splitlines()
    return list(csv.DictReader(line for line in lines if not line.startswith("#")))


def read_real_stars() -> list[RealStar]:
    """Every star with photometry, in the order of the table of answers."""
    rows = read_rows("facts.csv")
    facts = {row["name"]: SimpleNamespace(name=row["name"], unit=row["unit"], kind=row["kind"]) for row in rows}
    table = read_table(
        HERE / "real_photometry.csv", bands(), band_aliases(), facts, parse_archives(archive_texts())
    )
    assert not table.refused and not table.unknown_columns
    measured = {candidate.name: candidate for candidate in table.candidates}
    return [_star(measured[row["name"]], row) for row in answers()]


def _star(candidate: Candidate, row: dict[str, str]) -> RealStar:
    def number(key: str) -> float:
        return float(row[key]) if row[key] else math.nan

    told = {}
    if row["parallax"]:
        told = {"parallax": number("parallax"), "parallax_error": PARALLAX_ERROR_MAS}
    return RealStar(
        candidate=replace(candidate, facts=told),
        group=row["group"],
        sp_type=row["sp_type"],
        teff_k=number("teff"),
        t_dust_k=tuple(number(key) for key in ("t_dust", "t_dust2") if row[key]),
        l_ir_total=number("l_ir_total"),
        a_v=number("a_v"),
        doubtful=row["doubtful"] == "true",
    )
