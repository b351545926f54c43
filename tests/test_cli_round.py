"""A whole round by commands alone: load, assess, join, show, rule, probe, with real evidence."""

from __future__ import annotations

import json

import pytest
from click.testing import CliRunner

from tui.cli.group import cli
from tui.model import CHECKS

# A Planck star of 5772 K with theta = 0.1 mas, in mJy at the bands' pivots, and ten times that in W3 and W4.
BANDS = ("J", "H", "Ks", "W1", "W2", "W3", "W4")
TABLE = f"""name,ra,dec,parallax,parallax_error,{",".join(f"{band}_flux,{band}_err" for band in BANDS)}
PLAIN,10,-5,10,0.02,1360,27,1130,22,770,15,391,8,223,4.4,38,0.8,11.4,0.3
DUSTY,11,-5,10,0.02,1360,27,1130,22,770,15,391,8,223,4.4,150,3,260,5
"""
CHECK_KEYS = ["state", "version", "digest", "stale", "adequate", "cautions", "fits", "facts"]
FIT_KEYS = ["model", "chi2", "dof", "p", "aic", "bic", "params", "pulls"]


@pytest.fixture(scope="module")
def queue(tmp_path_factory):
    folder = tmp_path_factory.mktemp("round")
    patch = pytest.MonkeyPatch()
    patch.setenv("PLAINLIGHT_CONFIG", str(folder / "none.toml"))
    patch.setenv("PLAINLIGHT_CACHE", str(folder / "cache"))
    units = "[units]\n" + "".join(f'{band}_flux = "mJy"\n{band}_err = "mJy"\n' for band in BANDS)
    (folder / "map.toml").write_text(units)
    (folder / "survey.csv").write_text(TABLE)
    path = str(folder / "q.db")
    assert run("load", path, str(folder / "survey.csv"), "--columns", str(folder / "map.toml")).exit_code == 0
    assert run("assess", path).exit_code == 0
    assert run("join", path, "heron").exit_code == 0
    yield path
    patch.undo()


def run(*arguments):
    return CliRunner().invoke(cli, arguments)


def shown(queue, name, *extra):
    result = run("show", queue, name, "--json", *extra)
    assert result.exit_code == 0
    return json.loads(result.stdout)


def test_assess_has_nothing_left_to_do(queue):
    assert run("assess", queue).stdout == "All evidence is there and up to date.\n"


def test_show_json_has_the_documented_keys(queue):
    found = shown(queue, "DUSTY")
    assert list(found) == ["name", "outcome", "oddness", "measurements", "checks", "mixture", "dips", "look_alikes"]
    assert list(found["checks"]) == list(CHECKS)
    assert list(found["checks"]["dust"]) == CHECK_KEYS
    best = found["checks"]["dust"]["fits"][0]
    assert list(best) == FIT_KEYS
    assert list(next(iter(best["params"].values()))) == ["value", "low", "high", "unit", "limit"]
    assert [one["band"] for one in found["measurements"]] == list(BANDS)


def test_fits_come_best_first(queue):
    for check in shown(queue, "DUSTY")["checks"].values():
        bics = [fit["bic"] for fit in check["fits"] if "without" not in fit["model"]]
        assert bics == sorted(bics)
        # a fit to fewer bands cannot be compared by it
        assert all(fit["bic"] is None for fit in check["fits"] if "without" in fit["model"])


def test_the_evidence_tells_the_plain_star_from_the_dusty_one(queue):
    dusty = shown(queue, "DUSTY")
    assert dusty["checks"]["star"]["adequate"] is False and dusty["checks"]["dust"]["adequate"] is True
    assert dusty["oddness"]["band"] in ("W3", "W4") and dusty["oddness"]["pull"] > 5
    assert shown(queue, "PLAIN")["oddness"]["sigma"] < dusty["oddness"]["sigma"]


def test_show_as_text_has_every_check_and_fitted_number(queue):
    text = run("show", queue, "DUSTY", "--as", "heron").stdout
    for words in ("warm dust: todo; adequate", "dust temperature", "mixture bound", "W4", "largest pull"):
        assert words in text
    assert not any(line != line.rstrip() for line in text.splitlines())


def test_probe_holds_what_is_fixed_and_drops_what_is_dropped(queue):
    text = run("probe", queue, "DUSTY", "dust", "--fix", "T=250", "--drop", "W3").stdout
    assert "250.0" in text and "without W3" in text and "\nW3 " not in text
    assert run("probe", queue, "DUSTY", "dust", "--drop", "W3,J,H,Ks,W1,W2,W4").exit_code == 2
    assert run("probe", queue, "DUSTY", "dust", "--fix", "beauty=1").exit_code == 2
    assert run("probe", queue, "DUSTY", "dust", "--fix", "T=nan").exit_code == 2


@pytest.mark.parametrize("check", ["extinction", "blend", "dust"])
def test_probe_begins_from_the_leading_model_and_gives_its_intervals(queue, check):
    lead = shown(queue, "DUSTY")["checks"][check]["fits"][0]
    lines = run("probe", queue, "DUSTY", check).stdout.splitlines()
    assert lines[2].startswith(lead["model"])
    fitted = [line for line in lines[3:] if line.startswith(lead["model"])]
    assert len(fitted) >= 2 and not any(line.split()[-1] == "-" for line in fitted)


def test_probe_takes_another_model_by_name(queue):
    text = run("probe", queue, "DUSTY", "blend", "--model", "star + galaxy").stdout
    assert "star + galaxy" in text and "slope" in text
    refused = run("probe", queue, "DUSTY", "blend", "--model", "star + dust")
    assert refused.exit_code == 2 and "free pair" in refused.stderr


@pytest.mark.parametrize(
    ("check", "fixed", "words"),
    [
        ("dust", "T=-4", "20 to 2000"),
        ("dust", "T=1e308", "20 to 2000"),
        ("extinction", "A_V=-1", "outside its range"),
        ("star", "theta=0", "outside its range"),
    ],
)
def test_probe_refuses_values_outside_the_range_of_a_parameter(queue, check, fixed, words):
    result = run("probe", queue, "DUSTY", check, "--fix", fixed)
    assert result.exit_code == 2 and result.stdout == "" and words in result.stderr


def test_a_ruling_cites_todays_evidence_and_can_be_withdrawn(queue):
    digest = shown(queue, "PLAIN")["checks"]["dust"]["digest"]
    assert run("rule", queue, "PLAIN", "dust", "short", "--as", "heron", "--note", "no excess").exit_code == 0
    assert shown(queue, "PLAIN", "--as", "heron")["checks"]["dust"]["state"] == "short"
    assert shown(queue, "PLAIN")["checks"]["dust"]["state"] == "sealed" and len(digest) == 64
    assert run("rule", queue, "PLAIN", "dust", "withdrawn", "--as", "heron").exit_code == 0
    assert shown(queue, "PLAIN", "--as", "heron")["checks"]["dust"]["state"] == "todo"


def test_an_unknown_candidate_is_refused(queue):
    result = run("show", queue, "NOBODY")
    assert result.exit_code == 2 and "NOBODY" in result.stderr
