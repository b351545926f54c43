"""Pictures around a candidate as half-block cells: two square pixels to a character, in three stretches."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tui.desk.text import number, safe, short_band
from tui.desk.widgets.rows import Row, Span, beside, fit_row, row
from tui.model import Band, FloatArray
from tui.workflow.records import Cutout

HALF_BLOCK = "\u2580"
DENSITY = " .:-=+*#%@"
LEAST_RING = 3.5  # pixels on the screen: a smaller ring would hide the star; the beam stands in the head in any case
RING = (242, 207, 99)
MOST = 96  # columns of one picture: larger shows nothing more of a small cutout


@dataclass(frozen=True, slots=True)
class Stretch:
    """How fluxes become brightness: percentiles that turn black and white, and how much the faint is lifted (asinh)."""

    name: str
    black: float
    white: float
    lift: float


STRETCHES = (Stretch("faint", 5.0, 98.0, 30.0), Stretch("middle", 1.0, 99.7, 8.0), Stretch("bright", 0.5, 100.0, 0.0))


def cutout_rows(
    width: int,
    height: int,
    cutouts: Sequence[Cutout],
    bands: Mapping[str, Band],
    stretch: int,
    first: int,
    unicode: bool,
) -> list[Row]:
    """As many pictures side by side as fit, from the `first` on, each with its band, scale and beam."""
    if not cutouts:
        return []
    count = max(1, min(len(cutouts), (width + 2) // 26))
    columns = min(MOST, (width - 2 * (count - 1)) // count)
    lines = max(4, height - 2)
    block: list[Row] = []
    for place in range(count):
        cutout = cutouts[(first + place) % len(cutouts)]
        own = picture_rows(columns, lines, cutout, bands.get(cutout.band), STRETCHES[stretch], unicode)
        block = own if not block else beside(block, own, (columns + 2) * place - 2, 2)
    return block


def picture_rows(
    columns: int, lines: int, cutout: Cutout, band: Band | None, stretch: Stretch, unicode: bool = True
) -> list[Row]:
    """One picture in at most `columns` x `lines` cells under its head line, the beam drawn as a ring."""
    scale = cutout.arcsec_per_pixel
    beam = band.beam_fwhm_arcsec if band is not None else math.nan
    said = _head_words(cutout, beam, stretch, columns)
    levels = stretched(cutout.image, stretch)
    if levels is None:
        return [fit_row(row((said, "head")), columns), row(("no pixel has a value", "quiet"))]
    shrink = min(columns / levels.shape[1], 2 * lines / levels.shape[0])
    shown = resampled(levels, max(2, 2 * round(levels.shape[0] * shrink / 2)), max(1, round(levels.shape[1] * shrink)))
    ring = beam / scale * shrink / 2 if math.isfinite(beam) and math.isfinite(scale) and scale > 0 else math.nan
    cells = _blocks(shown, ring) if unicode else _letters(shown)
    return [fit_row(row((safe(said), "head")), columns), *cells]


def _head_words(cutout: Cutout, beam_arcsec: float, stretch: Stretch, columns: int) -> str:
    said = f"{short_band(cutout.band)} {stretch.name}"
    if math.isfinite(cutout.arcsec_per_pixel) and cutout.arcsec_per_pixel > 0 and cutout.image.ndim == 2:
        said += (
            f' {number(cutout.arcsec_per_pixel * cutout.image.shape[1], 2)}" {"wide" if columns >= 30 else ""}'.rstrip()
        )
    return said + (f' beam {beam_arcsec:g}"' if math.isfinite(beam_arcsec) else "")


def stretched(image: FloatArray, stretch: Stretch) -> FloatArray | None:
    """Brightness 0..1 of every pixel, shape as given; None where no pixel is finite or there is no picture."""
    image = np.asarray(image, dtype=float)
    if image.ndim != 2 or not image.size or not np.isfinite(image).any():
        return None
    low, high = np.nanpercentile(np.where(np.isfinite(image), image, np.nan), (stretch.black, stretch.white))
    if not high > low:
        return np.zeros_like(image)
    share = np.clip((np.nan_to_num(image, nan=low, posinf=high, neginf=low) - low) / (high - low), 0.0, 1.0)
    return np.arcsinh(stretch.lift * share) / np.arcsinh(stretch.lift) if stretch.lift else share


def resampled(levels: FloatArray, lines: int, columns: int) -> FloatArray:
    """The picture in another number of pixels: means where it shrinks, repeats where it grows; first line lowest."""
    for axis, wanted in ((0, lines), (1, columns)):
        have = levels.shape[axis]
        edges = np.linspace(0, have, wanted + 1)
        if wanted >= have:
            levels = np.take(levels, np.minimum(edges[:-1].astype(int), have - 1), axis=axis)
        else:
            starts = edges[:-1].astype(int)
            counts = np.diff(np.append(starts, have))
            shape = (-1, 1) if axis == 0 else (1, -1)
            levels = np.add.reduceat(levels, starts, axis=axis) / counts.reshape(shape)
    return levels[::-1]


def _blocks(levels: FloatArray, ring: float) -> list[Row]:
    grey = np.repeat((np.clip(levels, 0, 1) * 255).astype(int)[:, :, None], 3, axis=2)
    if ring >= LEAST_RING:
        y, x = np.indices(levels.shape)
        away = np.hypot(y - (levels.shape[0] - 1) / 2, x - (levels.shape[1] - 1) / 2)
        grey[np.abs(away - ring) < 0.5] = RING
    rows: list[Row] = []
    for line in range(0, levels.shape[0], 2):
        rows.append(
            _joined([(_hex(upper), _hex(lower)) for upper, lower in zip(grey[line], grey[line + 1], strict=True)])
        )
    return rows


def _joined(pairs: Sequence[tuple[str, str]]) -> Row:
    """Neighbouring cells of one colour pair as one span."""
    spans: Row = []
    for upper, lower in pairs:
        style = f"{upper} on {lower}"
        if spans and spans[-1].style == style:
            spans[-1] = Span(spans[-1].text + HALF_BLOCK, style)
        else:
            spans.append(Span(HALF_BLOCK, style))
    return spans


def _letters(levels: FloatArray) -> list[Row]:
    pairs = (levels[0::2] + levels[1::2]) / 2
    steps = np.clip((pairs * len(DENSITY)).astype(int), 0, len(DENSITY) - 1)
    return [row("".join(DENSITY[step] for step in line)) for line in steps]


def _hex(colour: Sequence[int]) -> str:
    return f"#{colour[0]:02x}{colour[1]:02x}{colour[2]:02x}"
