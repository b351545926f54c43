"""Cautions from real stars' published types."""

from __future__ import annotations

import pytest

from tui.checks.cautions import age_and_gravity_cautions, class_cautions, class_rows, natural_cautions
from tui.data.load_flags import natural_class_rows


@pytest.fixture(scope="module")
def classes():
    return class_rows(natural_class_rows())


# Spectral types as SIMBAD gives them for well-known stars of each class.
@pytest.mark.parametrize(
    ("sp_type", "expected"),
    [
        ("B0.5IVe", "Be star"),  # gamma Cas
        ("K0Ve", "young"),  # T Tau
        ("G8III", "evolved"),  # Vindemiatrix
        ("M1-M2Ia-Iab", "asymptotic giant"),  # Betelgeuse
        ("C-N5+", "asymptotic giant"),  # carbon star
        ("S6/6e", "asymptotic giant"),  # chi Cyg
        ("WN6", "Wolf-Rayet"),
        ("DA1.9", "white dwarf"),  # Sirius B
        ("sdM1.5", "subdwarf"),  # Kapteyn's star
        ("T6", "brown dwarf"),
    ],
)
def test_spectral_type(classes, sp_type, expected):
    assert any(f"as {expected} " in text for text in class_cautions({"sp_type": sp_type}, classes))


@pytest.mark.parametrize("sp_type", ["G2V", "A0Va", "M5.5V", "K2V", "F5IV-V", "M1V", "B3V", "", None])
def test_ordinary_dwarfs_raise_nothing(classes, sp_type):
    assert class_cautions({"sp_type": sp_type}, classes) == ()


@pytest.mark.parametrize(
    ("otype", "expected"),
    [("TT*", "young"), ("Be*", "Be star"), ("RC*", "R CrB"), ("Sy*", "symbiotic"), ("AB*", "asymptotic giant"),
     ("QSO", "galaxy"), ("WD*", "white dwarf")],
)  # fmt: skip
def test_object_type(classes, otype, expected):
    (text,) = class_cautions({"otype": otype}, classes)
    assert expected in text


@pytest.mark.parametrize("otype", ["*", "PM*", "**", "HB*", "V*", "SB*"])
def test_plain_object_types_raise_nothing(classes, otype):
    assert class_cautions({"otype": otype}, classes) == ()


def test_age_and_gravity():
    assert "gas-rich" in age_and_gravity_cautions({"age_myr": 3.0})[0]
    assert "debris" in age_and_gravity_cautions({"age_myr": 40.0})[0]
    assert age_and_gravity_cautions({"age_myr": 4600.0, "logg": 4.44}) == ()  # the Sun
    assert "giant" in age_and_gravity_cautions({"logg": 1.6})[0]  # Arcturus
    assert "compact" in age_and_gravity_cautions({"logg": 8.0})[0]
    assert age_and_gravity_cautions({"age_myr": "unknown", "logg": None}) == ()


def test_all_together(classes):
    facts = {"sp_type": "K0Ve", "otype": "TT*", "age_myr": 1.0, "logg": 3.8}
    assert len(natural_cautions(facts, classes)) == 2  # one for the class, one for the age
