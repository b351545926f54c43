"""What the mixture bound found, in sentences."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from tui.physics.spectral import is_point, stretches

TOLD = 0.25  # bands whose weight is at least this share of the largest are named in the sentence
STRETCHES = 2  # of a spectrum that are named
LIMITS_CAUTION = "Upper limits count as bands met or missed, so the bound's p is itself a bound."
SPECTRUM_CAUTION = (
    "The spectrum is not in the mixture bound: without photosphere spectra at its resolution "
    "an ordinary star's own lines would be refused."
)


def family(photosphere: str, added: Sequence[str] = ()) -> str:
    """What the mixtures are made of.

    >>> family("dwarfs"), family("planck", ["nebula"])
    ('dwarf photospheres and (modified) black bodies', '(modified) black bodies and the template nebula')
    """
    stars = {"dwarfs": ["dwarf photospheres"], "planck": []}.get(photosphere, ["the grid's photospheres"])
    templates = [f"the template{'s' if len(added) > 1 else ''} {listed(added)}"] if added else []
    return listed([*stars, "(modified) black bodies", *templates])


def natural_sentence(facts: Mapping[str, object]) -> str:
    """That a mixture is not refused, and how near the nearest comes."""
    how = "at most" if facts["at_most"] else "at least"
    return (
        f"A mixture of {facts['family']} is not refused: the nearest has chi-square {how} {facts['chi2']:.1f} "
        f"in {facts['points']} bands."
    )


def refusal_sentence(facts: Mapping[str, object], limited: set[str]) -> str:
    """The witness in one sentence; limits are called so."""
    weights = facts["witness"]
    least = TOLD * max((abs(u) for u in weights.values()), default=0.0)
    among = [name for name in weights if is_point(name)]
    bright = listed(gathered([name for name, u in weights.items() if u >= least], among) or ["the rest"])
    below = gathered([name for name, u in weights.items() if u <= -least], among)
    faint = listed([f"the limit in {name}" if name in limited else name for name in below] or ["the rest"])
    verb = "is" if " and " not in bright else "are"
    return (
        f"{bright} {verb} too bright against {faint}: no mixture of {facts['family']} comes nearer than "
        f"chi-square {facts['chi2']:.1f} in {facts['points']} bands (p at most {facts['p']:.2g})."
    )


def dark_caution(dark: Mapping[str, Sequence[str]]) -> str:
    """That user templates count as dark in bands that their spectra do not reach; template -> those bands."""
    told = [f"{name} in {listed(bands)}" for name, bands in dark.items()]
    return f"A template counts as dark where its spectrum does not reach: {'; '.join(told)}."


def gathered(names: Sequence[str], among: list[str]) -> list[str]:
    """Band names, those of points of a spectrum as the longest stretches that they make."""
    plain = [name for name in names if not is_point(name)]
    return plain + stretches([name for name in names if is_point(name)], among)[:STRETCHES]


def listed(names: Sequence[str]) -> str:
    """`A`, `A and B`, `A, B and C`.

    >>> listed(["A"]), listed(["A", "B", "C"])
    ('A', 'A, B and C')
    """
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"
