"""Published worked examples to the digits printed, and the krippendorff library on random ratings."""

from __future__ import annotations

import krippendorff
import numpy as np
import pytest

from tui.consensus import agreement as ag
from tui.errors import InputError

# Cohen 1960, Educ. Psychol. Meas. 20, 37: Table 2 as counts of 200; Table 1 as proportions of 200. The others are
# the 2 x 2 examples found in most textbooks and encyclopaedias.
COHEN = {
    "1960 table 2": ("88 14 18/10 40 10/2 6 12", 0.492, 3),
    "1960 table 1": ("50 26 24/24 4 32/6 30 4", -0.09, 2),
    "yes or no": ("20 5/10 15", 0.4, 1),
    "same total, a": ("45 15/25 15", 0.1304, 4),
    "same total, b": ("25 35/5 35", 0.2593, 4),
}

# Fleiss 1971, Psychol. Bull. 76, 378, Table 1: 30 patients, 6 psychiatrists, 5 diagnoses.
FLEISS_1971 = (
    "00060 03003 01401 00006 03030 20400 00402 20310 20040 00006 10050 11040 03300 10050 02031 "
    "00501 30012 51000 02040 10203 00006 01050 02013 20040 10041 05010 40002 02040 10500 00006"
)
# The 10 subjects and 14 raters of the encyclopaedia's example of Fleiss' kappa.
FLEISS_10 = "0,0,0,0,14 0,2,6,4,2 0,0,3,5,6 0,3,9,2,0 2,2,8,1,1 7,7,0,0,0 3,2,6,3,0 2,5,3,2,2 6,5,2,1,0 0,2,2,3,7"

# Krippendorff 2011, Computing Krippendorff's Alpha-Reliability, sections C, B, A; then the example of
# Content Analysis (1980, 2004) with three coders. A row is an observer, a star no value.
ALPHA = {
    "section C": (["123321412***", "1233224125*3", "*3332342251*", "12332441251*"], 0.743),
    "section B": (["112243335441", "212223335444"], 0.692),
    "section A": (["0100000010", "1110010000"], 0.095),
    "three coders": (["*****3412113 3*3", "1*2133 43*******", "**21344*211 33*4"], 0.691),
}


def matrix(text: str) -> np.ndarray:
    return np.array([[float(cell) for cell in row.split()] for row in text.split("/")])


def ratings(rows: list[str]) -> np.ndarray:
    return np.array([[-1 if cell == "*" else int(cell) for cell in row if cell != " "] for row in rows])


@pytest.mark.parametrize(("text", "printed", "digits"), COHEN.values(), ids=COHEN)
def test_cohen(text, printed, digits):
    assert round(ag.cohen_kappa(matrix(text)), digits) == printed


def test_cohen_1960_table_2_parts():
    counts = matrix(COHEN["1960 table 2"][0])
    one = np.repeat(np.arange(9) // 3, counts.ravel().astype(int))
    two = np.repeat(np.arange(9) % 3, counts.ravel().astype(int))
    both = ag.tallied(np.array([one, two]), 3)
    assert ag.raw_agreement(both) == pytest.approx(0.700, abs=1e-12)  # printed p_o
    assert ag.kappa_from(ag.confusion_parts(one, two, 3).sum(axis=0)) == ag.cohen_kappa(counts)


def test_fleiss_1971():
    counts = np.array([[float(cell) for cell in row] for row in FLEISS_1971.split()])
    assert counts.sum(axis=0).tolist() == [26, 26, 30, 55, 43]  # the printed margins: the table was copied whole
    assert round(ag.fleiss_kappa(counts), 3) == 0.430
    assert round(ag.raw_agreement(counts), 4) == 0.5556


def test_fleiss_of_ten_subjects():
    counts = np.array([[float(cell) for cell in row.split(",")] for row in FLEISS_10.split()])
    assert round(ag.fleiss_kappa(counts), 3) == 0.210 and round(ag.raw_agreement(counts), 3) == 0.378


@pytest.mark.parametrize(("rows", "printed"), ALPHA.values(), ids=ALPHA)
def test_krippendorff_alpha(rows, printed):
    assert round(ag.krippendorff_alpha(ag.tallied(ratings(rows), 6)), 3) == printed


@pytest.mark.parametrize("seed", range(40))
def test_alpha_against_the_krippendorff_library(seed):
    dice = np.random.default_rng(seed)
    table = dice.integers(-1, 4, size=(dice.integers(2, 7), dice.integers(15, 60)))
    truth = dice.integers(0, 4, size=table.shape[1])
    table = np.where(dice.random(table.shape) < 0.5, np.where(table >= 0, truth, -1), table)
    library = krippendorff.alpha(np.where(table < 0, np.nan, table), level_of_measurement="nominal")
    assert ag.krippendorff_alpha(ag.tallied(table, 4)) == pytest.approx(library, abs=1e-9)


def test_undefined_stays_undefined():
    same = np.array([[3.0, 0.0, 0.0]] * 5)
    assert ag.krippendorff_alpha(same) is None and ag.fleiss_kappa(same) is None
    assert ag.cohen_kappa(np.array([[9.0, 0.0], [0.0, 0.0]])) is None
    assert ag.raw_agreement(same) == 1.0
    alone = np.array([[1.0, 0.0], [0.0, 1.0]])
    assert ag.krippendorff_alpha(alone) is None and ag.raw_agreement(alone) is None
    empty = np.zeros((0, 3))
    assert ag.fleiss_kappa(empty) is None and ag.krippendorff_alpha(empty) is None
    assert ag.cohen_kappa(np.zeros((2, 2))) is None


def test_fleiss_refuses_unequal_numbers_of_ratings():
    with pytest.raises(InputError, match="same number"):
        ag.fleiss_kappa(np.array([[2.0, 1.0], [1.0, 1.0]]))


def simulated(dice, candidates=120, reviewers=3):
    truth = dice.integers(0, 2, candidates)
    return np.where(dice.random((reviewers, candidates)) < 0.8, truth, 1 - truth)


def test_bootstrap_interval_holds_what_a_large_sample_gives():
    dice = np.random.default_rng(5)
    large = ag.krippendorff_alpha(ag.tallied(simulated(dice, 200_000), 2))
    held = 0
    for _ in range(60):
        parts = ag.alpha_parts(ag.tallied(simulated(dice), 2))
        low, high = ag.bootstrap_interval(parts, ag.alpha_from, dice, draws=400)
        held += low <= large <= high
    assert held >= 51  # 57 expected of 60 at 95 %; fewer than 51 has a chance of 1 %, a little under-covering allowed


def test_bootstrap_repeats_with_the_same_generator_and_knows_its_limits():
    parts = ag.alpha_parts(ag.tallied(simulated(np.random.default_rng(1)), 2))
    one, two = (ag.bootstrap_interval(parts, ag.alpha_from, np.random.default_rng(3), draws=150) for _ in range(2))
    assert one == two
    assert ag.bootstrap_interval(parts[:1], ag.alpha_from, np.random.default_rng(3)) is None
    rare = ag.alpha_parts(np.array([[2.0, 0.0]] * 9 + [[1.0, 1.0]]))  # a third of the draws hold one class only
    assert ag.bootstrap_interval(rare, ag.alpha_from, np.random.default_rng(3)) is None


def test_prevalence_caution():
    assert "96 % of these rulings say short" in ag.prevalence_caution(np.array([[1.0, 24.0]]), ("explains", "short"))
    assert ag.prevalence_caution(np.array([[11.0, 14.0]]), ("explains", "short")) == ""
    assert ag.prevalence_caution(np.zeros((0, 2)), ("explains", "short")) == ""
