"""Template grids for candidates that carry a spectrum: the queue's own, and the spectrum's points beside them."""

from __future__ import annotations

import threading
from collections import OrderedDict
from collections.abc import Sequence
from typing import TYPE_CHECKING

from tui.model import Candidate, Spectrum
from tui.workflow.basis import Basis

if TYPE_CHECKING:
    from tui.physics.templates import Templates

KEPT = 8  # grids of spectra in memory; they are built in a fraction of a second and not kept on the disk
_memory: OrderedDict[tuple[str, str], Templates] = OrderedDict()
_lock = threading.Lock()

Group = tuple[list[Candidate], "Templates"]


def groups(candidates: Sequence[Candidate], basis: Basis) -> list[Group]:
    """Candidates with the grids that suit them: those without spectrum first, then those of one wavelength grid each."""
    plain = [one for one in candidates if not has_points(one, basis)]
    found: list[Group] = [(plain, basis.templates())] if plain else []
    alike: dict[str, list[Candidate]] = {}
    for one in candidates:
        if has_points(one, basis):
            alike.setdefault(key_of(one), []).append(one)
    return [*found, *((some, templates_of(some[0], basis)) for some in alike.values())]


def has_points(candidate: Candidate, basis: Basis) -> bool:
    """Whether the candidate has a spectrum and the photosphere source may speak of each of its points."""
    return candidate.spectrum is not None and basis.settings.photosphere != "dwarfs"


def key_of(candidate: Candidate) -> str:
    """Name of the wavelength grid of a candidate's spectrum; empty where it has none."""
    from tui.physics.spectral import grid_key

    return "" if candidate.spectrum is None else grid_key(candidate.spectrum)


def templates_of(candidate: Candidate, basis: Basis) -> Templates:
    """The grids for one candidate."""
    if not has_points(candidate, basis) or candidate.spectrum is None:
        return basis.templates()
    base = basis.templates()
    key = (base.digest, key_of(candidate))
    with _lock:
        found = _memory.get(key)
        if found is None:
            found = _memory[key] = with_points(base, candidate.spectrum, basis)
        _memory.move_to_end(key)
        while len(_memory) > KEPT:
            _memory.popitem(last=False)
    return found


def with_points(base: Templates, spectrum: Spectrum, basis: Basis) -> Templates:
    """The grids with a spectrum's points; as they were where the photosphere source resolves too few of them."""
    from tui.physics.joining import joined
    from tui.physics.spectral import INSTRUMENT, LEAST_POINTS, POINT_FLOOR, grid_key, points_of
    from tui.workflow.templates import grids_through

    bands = points_of(spectrum, basis.settings.floors.get(INSTRUMENT, POINT_FLOOR)).bands
    added = grids_through(list(bands), basis.settings, basis.queue)
    if len(bands) - len(added.silent) < LEAST_POINTS:
        return base
    return joined(base, added, grid_key(spectrum))
