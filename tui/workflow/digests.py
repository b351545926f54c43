"""What makes evidence outdated: the digest of everything that one kind of it rests on."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

from tui.model import CHECKS, Settings, digest

_FITS = ("photosphere", "law", "r_v", "av_prior", "p_min", "source_floor", "floors", "common")
RELEVANT = MappingProxyType(
    dict.fromkeys(CHECKS, (*_FITS, "ruwe_max"))
    | {"blend": (*_FITS, "ruwe_max", "n_searched"), "mixture": (*_FITS, "templates"), "dips": (*_FITS, "ruwe_max")}
)  # kind -> the settings that can change its numbers; the rules of consensus are not among them

_SHARED = ("star", "dips")  # a check compares with the star alone, and asks for the dips too where they stand
RESTS_ON = MappingProxyType(
    {"star": ("dips",), "instrument": _SHARED, "extinction": _SHARED, "blend": _SHARED, "dust": _SHARED}
    | {"mixture": ("star",), "dips": ()}
)  # kind -> the other kinds whose code has a part in its numbers


@dataclass(frozen=True, slots=True)
class Recipe:
    """What one kind of evidence is made with, apart from the candidate."""

    kind: str
    versions: tuple[int, ...]  # of its own code, then of the code that it rests on
    settings: str  # digest of the relevant settings
    templates: str  # digest of grids and packaged tables

    def digest_of(self, input_digest: str) -> str:
        """The digest of this kind of evidence for a candidate of that input digest."""
        return digest([self.kind, self.versions, input_digest, self.settings, self.templates])


def recipes(
    kinds: tuple[str, ...], versions: Mapping[str, int], settings: Settings, templates_digest: str
) -> dict[str, Recipe]:
    """The recipe of each kind."""
    return {
        kind: Recipe(
            kind,
            tuple(versions.get(one, 0) for one in (kind, *RESTS_ON[kind])),
            settings_digest(kind, settings),
            templates_digest,
        )
        for kind in kinds
    }


def settings_digest(kind: str, settings: Settings) -> str:
    """Digest of the settings that can change one kind of evidence."""
    return digest({name: getattr(settings, name) for name in RELEVANT[kind]})


