"""What the dust check remarks, and when: only where something asks for dust; the shell test."""

from __future__ import annotations

import numpy as np
import pytest

from tui.checks import star
from tui.checks.dust import asks_for_screen, assess, shell_remark
from tui.model import Candidate, Fit, Measurement, Param, Settings
from tui.physics.composite import STAR
from tui.physics.constants import C2_UM_K
from tui.physics.fitting import fit
from tui.physics.problem import build_problem

SETTINGS = Settings()


def planck_nu(wave_um, kelvin):
    """B_nu, any scale."""
    return wave_um**-3 / np.expm1(C2_UM_K / (wave_um * kelvin))


@pytest.fixture
def made(templates):
    """A 5600 K star of the templates; `f`, `kelvin`: dust of that fraction; `noise`: sigma by which bands are off."""

    def made(f=0.0, kelvin=300.0, noise=0.0, factor=None, **facts):
        ln_flux, _ = templates.star.at(np.array([np.log(5600.0)]))
        wave = np.array([templates.bands[i].pivot_um for i in range(len(templates.names))])
        flux = np.exp(ln_flux[0] - 44.5)
        last = int(np.argmax(wave))  # on the star's Rayleigh-Jeans side: scale the two black bodies there
        star_body, dust_body = planck_nu(wave, 5600.0), planck_nu(wave, kelvin)
        flux = flux + f * flux[last] * (5600.0 / kelvin) ** 4 * dust_body / star_body[last]
        flux = flux * (1 + 0.01 * noise * np.where(np.arange(wave.size) % 2, 1, -1))
        names = templates.names
        rows = (Measurement(n, x * (factor or {}).get(n, 1.0), 0.01 * x) for n, x in zip(names, flux, strict=True))
        return Candidate("one", tuple(rows), facts)

    return made


@pytest.fixture
def run(templates):
    def run(*candidates, av_max=5.0):
        count = len(candidates)
        nothing, most = np.full(count, np.nan), np.full(count, av_max)
        problem = build_problem(candidates, templates, parallaxes=(nothing, nothing), av_max=most)
        alone = fit(problem, STAR)
        return assess(candidates, problem, alone, star.assess(candidates, alone, SETTINGS), SETTINGS)

    return run


def test_warm_dust_is_found_and_an_extreme_fraction_told(run, made):
    little, much = run(made(f=0.01), made(f=0.2))
    assert little.adequate is True and much.adequate is True
    assert little.best.params["dust_temperature"].value == pytest.approx(300.0, rel=0.1)
    assert not any("f = " in said for said in little.cautions)
    assert any("extreme for a disc" in said for said in much.cautions)


@pytest.mark.parametrize("noise", [0.0, 0.8, 1.5])
def test_a_star_that_needs_no_dust_gets_no_remark_about_its_dust(run, made, noise):
    (found,) = run(made(noise=noise))
    assert not any("disc" in said or "f is" in said or "carries" in said for said in found.cautions)
    assert any(said.startswith("No dust needed") for said in found.cautions)


def test_a_refused_fit_gets_no_remark_about_its_dust(run, made):
    (found,) = run(made(factor={"J": 1.6, "W4": 9.0}))
    assert found.adequate is False
    assert not any("f = " in said or "shell" in said for said in found.cautions)


def test_a_shell_that_no_extinction_shows_is_a_conflict(run, made):
    """f = 5 dims by 2.5 log10(6) = 1.9 mag; ten bands of an unreddened star leave less than that to A_V at 3 sigma."""
    (found,) = run(made(f=5.0))
    assert found.best.model == "star + dust"  # A_V stands in another fit of this evidence
    assert any("A shell all round would dim the star by 1." in said for said in found.cautions)


def test_the_bare_fit_asks_for_the_screened_one():
    params = {"dust_temperature": Param(300, 290, 310, "K"), "dust_fractional_luminosity": Param(0.3, 0.2, 0.4)}
    bare = Fit("star + dust", 1.0, 5, 0.9, 1.0, 1.0, params)
    assert asks_for_screen(bare)
    assert not asks_for_screen(Fit("star + dust, A_V", 1.0, 5, 0.9, 1.0, 1.0, params | {"av": Param(0.1, 0, 0.2)}))
    assert not asks_for_screen(Fit("star + dust", 1.0, 5, 0.9, 1.0, 1.0, {}))


def test_shell_against_what_is_known_of_the_extinction():
    half = Param(0.5, 0.4, 0.6)  # 2.5 log10(1.5) = 0.440 mag
    assert "0.44 mag, and A_V 0.10 allows 0.25" in shell_remark(half, Param(0.1, 0.05, 0.15, "mag"), 3.0)[0]
    assert shell_remark(half, Param(0.3, 0.2, 0.4, "mag"), 3.0) == []
    nothing = float("nan")
    assert shell_remark(half, Param(0.0, nothing, nothing, "mag"), 3.0) == []
    assert "line of sight allows 0.30" in shell_remark(half, None, 0.3)[0]
    assert shell_remark(half, Param(0.3, 0.1, 0.3, "mag", limit=True), 0.3) == []  # at its ceiling
    assert shell_remark(Param(0.01, 0.0, 0.02), Param(0.0, 0.0, 0.0, "mag"), 3.0) == []
    # a one-sided 95 % limit of 0.16 mag is 1.65 sigma: three are 0.29
    assert "allows 0.29" in shell_remark(half, Param(0.0, 0.0, 0.16, "mag", limit=True), 3.0)[0]
