"""What the mixture bound refuses, what it does not, and what it costs; run by hand, prints tables.

    python tests/bench/bench_cone.py [false discs doppler screens notches certificate speed] [--count N]

The yardstick beside the screens comes from another computation. It says that a notch at 3.4 micron is never refused
once dust features are in the cone; here it is, from depth 0.3 on, and the section `notches` shows why that must be so.
The same cone written out densely by other means (`dense_cone.py`, scipy's nnls) leaves chi-square 32.3 in 10 bands at
depth 0.3 without any noise, where the program certifies 31.4; 91.5 and 90.2 at depth 0.4; 3035 and 3034 at depth 1.
Features do help (76 without any dust at depth 0.3, 45 with modified black bodies), but they only add light, longward of
3 micron, and the notch lacks it: no source of the family has less W1 for its Ks than 0.404 (grains of 2000 K with the
steepest emissivity; 0.425 for black bodies however hot), a 5772 K star has 0.491, so 18 % is all that a mixture could
hide even if no other band had to be met. At 12 micron the same computation agrees with the yardstick: chi-square stays
below 1.1 at any depth in S1, since hotter stars behind dust have fainter tails and features fill the bands about the
notch; five more optical bands (S2) or a spectrum (S3) fix the star, and then depth 1 is refused in nine of ten draws.
"""

from __future__ import annotations

import argparse
import os
import sys
import tempfile
import time
from pathlib import Path

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
sys.path.insert(0, str(Path(__file__).parent))

import numpy as np
from dense_cone import dense_cone, least_chi2
from natural_mixtures import FOURTEEN, S1, S2, Sky, in_order, observed, random_mixture, refused
from scipy.optimize import nnls
from scipy.stats import beta

from tui.checks import mixture
from tui.model import Candidate, Measurement, Settings
from tui.physics.cone import Fluxes, certificate, mixture_bound
from tui.physics.natural_sources import build_generators, drude, generators_of
from tui.physics.photometry import Quadrature, quadrature
from tui.physics.planck import planck_jy
from tui.workflow.cone_file import KeptCone
from tui.workflow.templates import build

INFRARED = ("V", "J", "H", "Ks", "W1", "W2", "W3", "W4", "MIPS24", "PACS70", "PACS160")
BAND_SETS = {"S1": S1, "S2": S2, "optical to 160 um": INFRARED, "Gaia alone": S1[:3]}
COMMON = {"Gaia": 0.02, "2MASS": 0.02, "WISE": 0.03, "SDSS": 0.02}


def upper(count, total):
    """95 % Clopper-Pearson upper limit of a share."""
    return float(beta.ppf(0.95, count + 1, total - count)) if count < total else 1.0


def false_refusals(templates, count):
    """Random natural mixtures: p < 0.01 must come in at most 1 of 100."""
    print(f"\nFalse refusals of random natural mixtures at p < 0.01 (nominal 0.0100), {count} each")
    print(f"{'bands':<20}{'common':>8}{'limits':>8}{'refused':>9}{'95 % upper':>12}{'ms each':>9}")
    for name, bands in BAND_SETS.items():
        sky, rng = Sky(templates, in_order(templates, bands)), np.random.default_rng(11)
        truth = [random_mixture(rng, sky) for _ in range(count)]
        for common in ({}, COMMON):
            stars = [
                observed(rng, sky, *one, depth=10.0 ** rng.uniform(-4, -1.3), noise=noise, common=common)
                for one, noise in zip(truth, rng.choice([0.005, 0.02], count), strict=True)
            ]
            start = time.process_time()
            share, _ = refused(stars, templates, Settings(common=common))
            cost = (time.process_time() - start) / count * 1e3
            limits = np.mean([any(m.limit for m in star.measurements) for star in stars])
            top = upper(round(share * count), count)
            print(f"{name:<20}{'yes' if common else 'no':>8}{limits:>8.2f}{share:>9.4f}{top:>12.4f}{cost:>9.2f}")


def discs(templates, count):
    """Sun-like stars with ordinary discs, which the cone must hold."""
    print(f"\nOrdinary discs about a 5772 K star, {count} each (nominal 0.0100)")
    sky, rng = Sky(templates, in_order(templates, INFRARED)), np.random.default_rng(12)
    star = sky.star(5772.0)

    def disc(fraction, spectrum):
        flux = sky.seen(spectrum)
        return star + fraction * star[-4] * flux / flux[-4]

    silicate = np.array([9.7]), np.array([0.25])
    kinds = {
        "black grains 150 K": lambda w: planck_jy(w, 150.0),
        "beta 1 beyond 20 um": lambda w: planck_jy(w, 150.0) * np.minimum(1, 20 / w),
        "beta 1 beyond 1 um": lambda w: planck_jy(w, 250.0) * np.minimum(1, 1 / w),
        "silicates 9.7 um": lambda w: planck_jy(w, 300.0) * (0.3 + 2 * drude(w, *silicate)[0]),
        "PAH 7.7, 11.3 um": lambda w: planck_jy(w, 350.0)
        * (0.1 + drude(w, np.array([7.7]), np.array([0.1]))[0] + drude(w, np.array([11.3]), np.array([0.03]))[0]),
        "two belts": lambda w: planck_jy(w, 400.0) + 300 * planck_jy(w, 60.0),
    }
    for name, spectrum in kinds.items():
        flux = disc(5.0, spectrum)
        stars = [observed(rng, sky, flux, star * sky.spread(5772.0)) for _ in range(count)]
        share, evidence = refused(stars, templates)
        middle = np.median([one.facts["chi2"] for one in evidence])
        print(f"{name:<24} refused {share:.4f}, median chi-square found {middle:.1f}")


def doppler(templates, count):
    """Planck sources in motion: the shifted spectrum is a Planck source of another temperature."""
    sky, rng = Sky(templates, in_order(templates, S2)), np.random.default_rng(13)
    stars = []
    for _ in range(count):
        temperature, shift = np.exp(rng.uniform(np.log(300), np.log(30000))), np.exp(rng.uniform(-0.7, 0.7))
        flux = sky.seen(lambda w: shift**3 * planck_jy(w * shift, temperature))  # nu' = shift nu
        flux = np.maximum(flux, 1e-8 * flux.max())
        least = 1e-7 * flux.max()
        rows = (Measurement(band, one, 0.03 * one + least) for band, one in zip(sky.names, flux, strict=True))
        stars.append(Candidate("c", tuple(rows)))
    share, evidence = refused(stars, templates)
    worst = max(one.facts["chi2"] for one in evidence)
    print(f"\nDoppler-shifted Planck sources without noise: {count}, refused {share:.4f}, chi-square to {worst:.2f}")


SCREENS = {
    "pass 10 % at 0.55": (lambda w: np.abs(w - 0.55) <= 0.0275, "1.0 / 0.7 / 0.2"),
    "pass 30 % at 0.55": (lambda w: np.abs(w - 0.55) <= 0.0825, "0.9 / 0.4 / 0.15"),
    "short-pass 0.6": (lambda w: w <= 0.6, "0.9 / 0.6 / 0.2"),
    "long-pass 0.7": (lambda w: w >= 0.7, "0.7 / 0.5 / 0.3"),
    "notch 30 % at 0.65": (lambda w: np.abs(w - 0.65) > 0.0975, "never / 0.4 / 0.2"),
    "notch 30 % at 1.25": (lambda w: np.abs(w - 1.25) > 0.1875, "0.3 in all"),
    "notch 30 % at 1.65": (lambda w: np.abs(w - 1.65) > 0.2475, "0.3 in all"),
    "notch 30 % at 3.4": (lambda w: np.abs(w - 3.4) > 0.51, "never"),
    "notch 30 % at 12": (lambda w: np.abs(w - 12.0) > 1.8, "never"),
}
DEPTHS = (0.1, 0.15, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0)


def fine_rule(band):
    """A quadrature fine enough for the edges of a screen."""
    return quadrature(band, 2000) if band.wave_um.size > 1 else quadrature(band)


def yardstick_sets(templates):
    """Name -> (generators, quadratures, star's flux over its Planck value), S3 with a spectrum of 30 points."""
    teff = np.exp(templates.star.low + templates.star.step * np.arange(templates.star.ln_flux.shape[0]))
    centres = np.geomspace(0.40, 1.0, 30)
    half = 0.5 * np.diff(np.log(centres))[0]
    points = [Quadrature(w := c * np.exp(np.linspace(-half, half, 21)), np.full(w.size, 1 / w.size)) for c in centres]
    black = np.stack([np.log([np.sum(p.weight * planck_jy(p.wave_um, t)) for p in points]) for t in teff])
    out = {}
    for name, bands, extra in (("S1", S1, False), ("S2", S2, False), ("S3", S1, True)):
        local = templates.take(in_order(templates, bands))
        rules = [quadrature(band, 120) for band in local.bands] + (points if extra else [])
        planck = np.stack([np.log(planck_jy(r.wave_um[None], teff[:, None]) @ r.weight) for r in rules], axis=1)
        stars = np.hstack([local.star.ln_flux, black + np.log(np.pi)]) if extra else local.star.ln_flux
        one = np.argmin(np.abs(teff - 5772.0))
        wide = [fine_rule(band) for band in local.bands] + (points if extra else [])
        out[name] = build_generators(rules, teff, stars), wide, np.exp(stars[one] - planck[one]), teff[one]
    return out


def screened(rules, ratio, teff, passes, depth):
    """Band fluxes of a star behind a screen that dims all it does not pass by `depth`."""
    return ratio * [
        np.sum(r.weight * planck_jy(r.wave_um, teff) * np.where(passes(r.wave_um), 1.0, 1.0 - depth)) for r in rules
    ]


def screens(templates, count):
    """Share of draws refused at p < 0.01, by depth of the screen, all errors 3 %."""
    print(f"\nScreens before a 5772 K star, 3 % errors, {count} draws: share refused at p < 0.01 by depth")
    print(f"{'screen':<20}{'set':<4}" + "".join(f"{depth:>6}" for depth in DEPTHS) + "   90 % at   yardstick S1/S2/S3")
    sets, rng = yardstick_sets(templates), np.random.default_rng(14)
    for name, (passes, yardstick) in SCREENS.items():
        for label, (generators, rules, ratio, teff) in sets.items():
            shares = []
            for depth in DEPTHS:
                flux = screened(rules, ratio, teff, passes, depth)
                noise = 0.03 * np.maximum(flux, 1e-3 * flux.max())
                draws = flux + noise * rng.standard_normal((count, flux.size))
                covariance = np.broadcast_to(np.diag(noise**2), (count, flux.size, flux.size))
                there = np.ones(draws.shape, bool)
                bound = mixture_bound(generators, Fluxes(draws, covariance, there, ~there), 0.01)
                shares.append(np.mean(bound.p < 0.01))
            reached = [depth for depth, share in zip(DEPTHS, shares) if share >= 0.9]
            tail = f"{min(reached) if reached else 'never':>9}   {yardstick}"
            print(f"{name:<20}{label:<4}" + "".join(f"{share:>6.2f}" for share in shares) + tail)


def certificates(templates, count):
    """Unfinished solves: chi2_cert never above the true least chi-square (scipy, on the columns themselves)."""
    rng, violations, tried, closeness = np.random.default_rng(15), 0, 0, []
    for _ in range(count):
        bands, columns = int(rng.integers(3, 15)), int(rng.integers(3, 60))
        g = np.exp(-rng.uniform(0, 8, (1, columns)) * np.linspace(0, 1, bands)[:, None] ** rng.uniform(0.3, 3))
        flux = rng.uniform(0.05, 1, bands) * np.exp(rng.normal(0, 0.5, bands))
        root = np.diag(0.05 * flux) + 0.02 * rng.random((bands, bands)) * flux
        covariance = root @ root.T
        half = np.linalg.inv(np.linalg.cholesky(covariance))
        least = nnls(half @ g, half @ flux, maxiter=10_000)[1] ** 2
        weight = 1 / np.sqrt(np.diag(covariance))
        for _ in range(10):
            c = rng.random(columns) * (rng.random(columns) < 0.2) * rng.random()
            r = np.linalg.solve(covariance, flux - g @ c)
            delta = np.array([max(np.max(r @ g / (weight @ g)), 0.0)])
            chi2, _ = certificate(flux[None], covariance[None], r[None], weight[None], delta)
            violations += chi2[0] > least * (1 + 1e-9) + 1e-9
            closeness.append(chi2[0] / max(least, 1e-12))
            tried += 1
    print(
        f"\nCertificate on unfinished solves: {tried} tried, {violations} above the least chi-square, "
        f"median share of it {np.median(closeness):.2f}"
    )


def reading_ms(templates, names):
    """What reading the columns of some bands from the cache costs."""
    with tempfile.TemporaryDirectory() as folder:
        os.environ["PLAINLIGHT_CACHE"] = folder
        KeptCone("bench", templates, {})(templates, names)
        start = time.perf_counter()
        KeptCone("bench", templates, {})(templates, names)
        spent = time.perf_counter() - start
        del os.environ["PLAINLIGHT_CACHE"]
    return f"those of {len(names)} bands read from the cache in {1e3 * spent:.0f} ms"


def speed(templates, count):
    """CPU time per candidate, the arrays built apart."""
    print("\nCPU time per candidate, one core, 14 bands")
    sky, rng = Sky(templates, in_order(templates, FOURTEEN)), np.random.default_rng(16)
    start = time.process_time()
    generators_of(templates)
    print(f"columns built in {time.process_time() - start:.2f} s, {reading_ms(templates, sky.names)}")
    fluxes, spreads = zip(*[random_mixture(rng, sky) for _ in range(min(count, 500))], strict=True)
    pivots = sky.local.pivot_um
    sun = sky.star(5772.0)
    passed = sun * np.where(np.abs(pivots - 0.55) < 0.1, 1, 0.4)
    notched = sun * np.where(np.abs(pivots - 1.65) < 0.1, 0.6, 1)
    sets = {
        "natural": [observed(rng, sky, *one) for one in zip(fluxes, spreads, strict=True)] * max(count // 500, 1),
        "hard: pass band": [observed(rng, sky, passed, 0.03 * sun) for _ in range(count)],
        "hard: notch in H": [observed(rng, sky, notched, 0.03 * sun) for _ in range(count)],
    }
    mixture.assess(sets["hard: pass band"][:2], templates, Settings())  # so that the columns are there
    for name, stars in sets.items():
        known = np.full(len(stars), np.nan)
        problem = mixture.build_problem(stars, templates, parallaxes=(known, known), av_max=known)
        for label, chi2 in (("solved", known), ("a fit is known", np.full(len(stars), 8.0))):
            start = time.process_time()
            evidence = mixture.assess_problem(problem, templates, Settings(), chi2)
            cost = (time.process_time() - start) / len(stars) * 1e3
            share = np.mean([one.adequate is False for one in evidence])
            print(f"{name:<18}{label:<16}{cost:>7.3f} ms, refused {share:.3f}")
    one = sets["hard: pass band"][:1]
    start = time.perf_counter()
    mixture.assess(one, templates, Settings())
    print(f"one hard candidate alone: {(time.perf_counter() - start) * 1e3:.0f} ms")


def notches(templates, count):
    """Screens in the infrared without noise: the least chi-square over a cone written out densely, beside ours."""
    local = templates.take(in_order(templates, S1))
    cone, names = dense_cone(local), ("star", "planck", "modified", "feature")
    size = sum(flux.shape[1] for flux in cone.values())
    print(f"\nNotches without noise, S1, 3 % errors: least chi-square over {size} columns, and what is certified")
    print(f"{'notch':<20}{'depth':>6}{'no dust':>10}{'modified':>10}{'features':>10}{'certified':>11}{'p':>10}")
    generators, rules, ratio, teff = yardstick_sets(templates)["S1"]
    for name in ("notch 30 % at 1.65", "notch 30 % at 3.4", "notch 30 % at 12"):
        for depth in (0.1, 0.2, 0.3, 0.4, 0.6, 1.0):
            flux = screened(rules, ratio, teff, SCREENS[name][0], depth)
            error = 0.03 * np.maximum(flux, 1e-3 * flux.max())
            dense = [least_chi2(cone, flux, error, names[:upto]) for upto in (2, 3, 4)]
            there = np.ones((1, flux.size), bool)
            ours = mixture_bound(generators, Fluxes(flux[None], np.diag(error**2)[None], there, ~there), 2.0)
            columns = "".join(f"{one:>10.2f}" for one in dense)
            print(f"{name:<20}{depth:>6}{columns}{ours.chi2[0]:>11.2f}{ours.p[0]:>10.1e}")
    ks, w1 = local.names.index("Ks"), local.names.index("W1")
    shines = {family: flux[:, flux[ks] > 1e-6 * flux.max(axis=0)] for family, flux in cone.items()}
    least = ", ".join(f"{family} {np.min(flux[w1] / flux[ks]):.3f}" for family, flux in shines.items())
    sun = screened(rules, ratio, teff, SCREENS["notch 30 % at 3.4"][0], 0.0)
    print(f"W1 over Ks: {sun[w1] / sun[ks]:.3f} for the star; least of any column: {least}")


SECTIONS = {
    "false": (false_refusals, 2000), "discs": (discs, 500), "doppler": (doppler, 500), "screens": (screens, 100),
    "notches": (notches, 1), "certificate": (certificates, 4000), "speed": (speed, 1000),
}  # fmt: skip


def main():
    """Run the sections asked for."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("section", nargs="*", choices=[*SECTIONS, []])
    parser.add_argument("--count", type=int)
    chosen = parser.parse_args()
    templates = build(Settings(), {})
    for name in chosen.section or SECTIONS:
        run, count = SECTIONS[name]
        run(templates, chosen.count or count)


if __name__ == "__main__":
    main()
