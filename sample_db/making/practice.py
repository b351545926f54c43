"""Three practice stars with their answers, as a file that the program carries: never part of a queue."""

from __future__ import annotations

import json
from dataclasses import dataclass, replace
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

from making.catalogues import Observer
from making.star import MARSH, Dust, Star
from making.tables import crossmatch

from tui.model import Candidate, Measurement
from tui.readers.tables import read_table
from tui.workflow.vocabulary import packaged_vocabulary

HEAD = """\
# source: made by sample_db/make_sample.py; no real star
# Practice stars: learn the walk on them. They belong to no queue and count nowhere.
# Each measurement: flux in Jy, error in Jy (none for a limit), what the catalogue's flags said.
"""
KEPT_FACTS = (
    "ra",
    "dec",
    "parallax",
    "parallax_error",
    "ruwe",
    "av_max",
    "phot_g_mean_mag",
    "phot_bp_mean_mag",
    "phot_rp_mean_mag",
    "bp_rp",
    "phot_bp_rp_excess_factor",
    "phot_bp_n_obs",
    "phot_bp_n_blended_transits",
)
PRACTICE = 104  # a family number that the survey does not use
KEPT_FLAGS = ("ph_qual", "cc_flags", "cc_flg", "ext_flg")


@dataclass(frozen=True, slots=True)
class Lesson:
    """One practice star and what to learn from it."""

    star: Star
    name: str
    title: str
    told: str  # at the end
    answers: tuple[tuple[str, str, str], ...]  # check, ruling, why


LESSONS = (
    Lesson(
        Star("spike", "instrument", 5700, 9.1, offset_mag={"W3": -0.7, "W4": -2.6}, wise={"cc_flags": "00DD"}),
        "practice-1",
        "An excess in two bands",
        "It was a diffraction spike of a bright star near by. A flag that was raised before anyone looked for "
        "an excess is evidence of its own; a misfit alone is not.",
        (
            (
                "star",
                "short",
                "W3 and W4 stand far above the star, the others fit: look at the residual strip, right end.",
            ),
            (
                "instrument",
                "explains",
                "AllWISE flags both bands as a possible diffraction spike (cc_flags D), and without them the "
                "star fits.",
            ),
            ("extinction", "short", "Dust in front dims the blue; it never brightens 12 and 22 micron."),
            ("blend", "short", "A galaxy behind would fit two points too. With the flag raised nothing asks for one."),
            (
                "dust",
                "short",
                "Dust of some temperature always fits two bands. That an explanation fits does not make it "
                "the right one.",
            ),
        ),
    ),
    Lesson(
        Star("warm disc", "dust", 7200, 8.7, parts=(Dust(260.0, 2.5e-3),)),
        "practice-2",
        "The same excess, and no flag",
        "It is a star with a disc of dust at 260 K that takes 0.25 % of its light. The fit gives both numbers "
        "with their intervals.",
        (
            ("star", "short", "W3 and W4 are both too bright, by many sigma."),
            (
                "instrument",
                "short",
                "No flag, no neighbour, no bright star: nothing speaks against the two bands but the misfit " "itself.",
            ),
            ("extinction", "short", "A_V stays at nothing: reddening cannot make an infrared excess."),
            (
                "blend",
                "short",
                "A power law from a galaxy has to bend to pass both bands, and bright galaxies are rare: see "
                "the chance alignment.",
            ),
            (
                "dust",
                "explains",
                "One temperature fits, between that of ice and of an oven, and f is far below 0.1: a debris disc.",
            ),
        ),
    ),
    Lesson(
        Star("reddened", "extinction", 18000, 9.3, av_mag=3.8, place=MARSH, facts={"av_max": 8.0}),
        "practice-3",
        "Too red for any dwarf",
        "It is a hot star behind nearly 4 mag of dust. No band carries the misfit: it bends through all of " "them.",
        (
            ("star", "short", "The residuals bend from band to band: no temperature makes this shape."),
            ("instrument", "short", "No flag, and no single band to blame: without any one of them the misfit stays."),
            (
                "extinction",
                "explains",
                "With A_V free all bands fit, and the line of sight holds 8 mag: more than is needed.",
            ),
            (
                "blend",
                "short",
                "Two stars also fit, as two free temperatures would, but nothing hints at a second star.",
            ),
            ("dust", "short", "There is no excess beyond the star once it is dereddened."),
        ),
    ),
)


def write_practice(path: Path, observer: Observer) -> None:
    """Observe the practice stars and write them with their answers."""
    stars = [replace(lesson.star, stream=(PRACTICE, place)) for place, lesson in enumerate(LESSONS)]
    found = candidates(stars, observer)
    path.write_text(HEAD + "".join(lesson_text(*pair) for pair in zip(LESSONS, found, strict=True)), encoding="utf-8")


def candidates(stars: list[Star], observer: Observer) -> list[Candidate]:
    """The stars as the program reads them from a cross-match."""
    known = packaged_vocabulary()
    with TemporaryDirectory() as folder:
        path = Path(folder) / "practice.vot"
        crossmatch(stars, observer).write(path, format="votable")
        return read_table(path, known.bands, known.aliases, known.facts, known.archives).candidates


def lesson_text(lesson: Lesson, candidate: Candidate) -> str:
    """One star as TOML."""
    facts = {**candidate.facts, **{key: lesson.star.facts[key] for key in lesson.star.facts if key in KEPT_FACTS}}
    lines = ["", "[[star]]", *(f"{key} = {json.dumps(getattr(lesson, key))}" for key in ("name", "title", "told"))]
    lines += [
        "[star.facts]",
        *(f"{key} = {json.dumps(facts[key])}" for key in KEPT_FACTS if facts.get(key) is not None),
    ]
    for measurement in candidate.measurements:
        lines += ["[[star.measurement]]", *(f"{key} = {text}" for key, text in cells(measurement).items())]
    for check, ruling, why in lesson.answers:
        lines += [f"[star.answers.{check}]", f"ruling = {json.dumps(ruling)}", f"why = {json.dumps(why)}"]
    return "\n".join(lines) + "\n"


def cells(measurement: Measurement) -> dict[str, Any]:
    """A measurement's keys as TOML values."""
    flags = {key: value for key, value in measurement.flags.items() if key in KEPT_FLAGS}
    row = {
        "band": json.dumps(measurement.band),
        "source": json.dumps(measurement.source),
        "flux_jy": f"{measurement.flux_jy:.5e}",
    }
    if measurement.limit:
        row |= {"limit": "true", "nsigma": f"{measurement.nsigma:g}"}
    else:
        row["error_jy"] = f"{measurement.error_jy:.4e}"
    if flags:
        row["flags"] = "{ " + ", ".join(f"{key} = {json.dumps(value)}" for key, value in flags.items()) + " }"
    return row
