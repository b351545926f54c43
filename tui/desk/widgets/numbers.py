"""A fit in numbers, aligned on their decimal points, each with its unit and interval, beside the star alone."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from rich.cells import cell_len

from tui.desk.text import decimal_aligned, number, once_in, p_text, safe
from tui.desk.text import fit as cut
from tui.desk.widgets.rows import Row, Span, row
from tui.model import Evidence, Fit, Param

WIDE = 40  # columns from which full names, both ends of intervals and all fits find room
NOTHING = "--"
MODEL_WIDE = 26  # cells of a model's name
WHY_NOT = {"dip_stands": "a dip stands", "spectrum_misfits": "its spectrum misfits"}  # though the bands are met
LEVEL = " (95 %)"  # of a limit (Evidence keeps one-sided 95 % limits where a value lies at a bound)
ROUNDING = 1e-6  # by which a limit may miss the bound that it lies at
UP_TO = " up to "
UNLIKE = 1.25  # sides of an interval that differ by this factor or more are both told
LEAST: Mapping[str, float] = {  # where the ranges of the fits begin; the others begin at 0
    "dust_temperature": 20.0, "dust2_temperature": 20.0, "r_v": 2.3, "alpha": -math.inf,
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class ParamName:
    """How a parameter is called on the page, and by what its value is multiplied."""

    label: str
    short: str
    unit: str = ""
    factor: float = 1.0


NAMES: Mapping[str, ParamName] = {
    "teff": ParamName("star temperature", "T star", "K"),
    "teff1": ParamName("first temperature", "T 1st", "K"),
    "teff2": ParamName("second temperature", "T 2nd", "K"),
    "theta": ParamName("angular radius", "rad", "uas", 1e3),
    "av": ParamName("extinction A_V", "A_V", "mag"),
    "r_v": ParamName("extinction R_V", "R_V"),
    "flux_ratio": ParamName("second/first in Ks", "2nd/1st"),
    "dust_temperature": ParamName("dust temperature", "T dust", "K"),
    "dust_fractional_luminosity": ParamName("dust share of light", "L dust", "%", 100.0),
    "dust_radius": ParamName("dust distance", "R dust", "au"),
    "dust2_temperature": ParamName("second dust temperature", "T dust2", "K"),
    "dust2_fractional_luminosity": ParamName("second dust's share", "L dust2", "%", 100.0),
    "dust2_radius": ParamName("second dust's distance", "R dust2", "au"),
    "radius_ratio": ParamName("radius, second/first", "R 2nd/1st"),
    "slope": ParamName("slope of the power law", "slope"),
    "a_055": ParamName("dimming at 0.55 micron", "A 0.55", "mag"),
    "alpha": ParamName("slope alpha", "alpha"),
    "depth": ParamName("depth", "depth", "%", 100.0),
    "compact_temperature": ParamName("compact temperature", "T comp", "K"),
    "compact_radius": ParamName("compact radius", "R comp", "R_sun"),
}


@dataclass(frozen=True, slots=True)
class Beside:
    """A fit to hold the shown one against: the star alone, the fit before hands were laid on it, another check's."""

    label: str
    fit: Fit


def number_rows(width: int, fit: Fit, title: Row, beside: Beside | None, adequate: str = "") -> list[Row]:
    """A fit's statistics, what its p means, and what the evidence itself says."""
    rows = [title, *statistic_rows(width, fit, beside), *chance_rows(width, fit)]
    return rows + ([row(("adequate  ", "quiet"), adequate)] if adequate else [])


def fit_title(width: int, evidence: Evidence, index: int) -> Row:
    """The model's name, and which of how many fits it is."""
    count = len(evidence.fits)
    model = safe(evidence.fits[index].model)
    which = f"  fit {index + 1} of {count}" if count > 1 else ""
    short = which if len(model) + len(which) <= width else f" {index + 1}/{count}" if count > 1 else ""
    return row((model, "head"), (short, "quiet"))


def formal_row(fit: Fit, p_min: float) -> Row:
    """Above the numbers of a refused fit: its intervals take for granted that the model is right, which it is not."""
    return row(("errors formal: fit refused", "quiet")) if fit.p < p_min and fit.params else []


def adequate_word(evidence: Evidence, shown: int = 0, p_min: float = 0.0) -> str:
    """The evidence's own state, which is no ruling; where another fit than the shown one makes it so, which.

    Args:
        shown: index of the fit on view.
        p_min: below which a fit is refused.
    """
    if evidence.adequate is None:
        return "untestable"
    if not evidence.adequate:
        why = [words for fact, words in WHY_NOT.items() if evidence.facts.get(fact)]
        is_refused = evidence.best is None or evidence.best.p < p_min
        return f"no: {why[0]}" if why and not is_refused else "no"
    stand = [place for place, fit in enumerate(evidence.fits) if fit.p >= p_min]
    return "yes" if shown in stand or not stand else f"yes (by fit {stand[0] + 1})"


def statistic_rows(width: int, fit: Fit, beside: Beside | None) -> list[Row]:
    """chi2, dof, p and BIC, those of another fit beside them."""
    columns = [_statistics(fit)] + ([_statistics(beside.fit)] if beside else [])
    room = max(8, (width - 6) // 2 if width < WIDE else 12)
    label = cut(beside.label, min(cell_len(beside.label), room - 1)) if beside else ""
    rows = [row(" " * 6, ("this fit".rjust(room), "head"), (label.rjust(room) if label else "", "quiet"))]
    for line, name in enumerate(("chi2", "dof", "p", "BIC")):
        cells = [column[line].rjust(room) for column in columns]
        rows.append(row((name.ljust(6), "quiet"), (cells[0], "strong"), *((cell, "quiet") for cell in cells[1:])))
    return rows


def chance_rows(width: int, fit: Fit) -> list[Row]:
    """What p means, in words: how often chance makes so large a chi-square where the model is right."""
    if fit.p is None or math.isnan(fit.p):
        return []
    odds = once_in(fit.p)
    said = (
        f"if this model is right, a chi-square this large: {odds}",
        f"if right, a chi2 this large: {odds}",
        f"chi2 this large: {odds}",
        f"so large: {odds}",
    )
    return [row(next((text for text in said if len(text) <= width), said[-1]))]


def param_rows(width: int, params: Mapping[str, Param], held: Sequence[str] = (), chosen: str = "") -> list[Row]:
    """Parameters with units and 68 % intervals, or 95 % limits where they lie at a bound."""
    if not params:
        return []
    wide = width >= WIDE
    names = [param_name(key, param) for key, param in params.items()]
    labels = [
        f"{name.label if wide else name.short}{' ' + name.unit if name.unit and not wide else ''}" for name in names
    ]
    values, errors = [], []
    for key, name, param in zip(params, names, params.values(), strict=True):
        value, error = value_and_error(param, name.factor, wide, LEAST.get(key, 0.0))
        values.append(value if key not in held else number(param.value * name.factor, 4))
        errors.append(error if key not in held else " held")
    label_width = min(max(len(label) for label in labels), 24 if wide else 11)
    rows = []
    lines = zip(params, labels, decimal_aligned(values), errors, names, strict=True)
    for key, label, value, error, name in lines:
        mark = ">" if key == chosen else "=" if key in held else " "
        style = "chosen" if key == chosen else "quiet"
        tail = f" {name.unit}" if wide else ""
        if wide and error == LEVEL:
            error, tail = tail, LEVEL
        error = squeezed(error, width - label_width - 2 - len(value) - len(tail))
        rows.append(
            row((f"{mark}{label[:label_width].ljust(label_width)}", style), (f" {value}", "strong"), f"{error}{tail}")
        )
    return rows


def squeezed(error: str, room: int) -> str:
    """An interval in `room` columns: without its spaces, else rounder, or one side for both where they are alike.

    >>> squeezed(" +0.19 -0.11", 10), squeezed(" +0.19 -0.18", 7), squeezed(" +2.900 -0.011", 10)
    ('+0.19-0.11', '+-0.19', '+2.9-0.011')
    """
    if len(error) <= room:
        return error
    if error.startswith(UP_TO):
        return error.replace(UP_TO, " to ")
    tight = error.replace(" ", "")
    if len(tight) <= room or not tight.startswith("+") or tight.startswith("+-"):
        return tight
    more, _, less = tight[1:].partition("-")
    if "?" in tight:
        return f"+-{(more + less).strip('?')}"
    if not UNLIKE * float(less) > float(more) > float(less) / UNLIKE:
        rounder = [f"+{number(float(more), digits)}-{number(float(less), digits)}" for digits in (2, 1)]
        return next((text for text in rounder if len(text) <= room), rounder[-1].replace("0.", "."))
    return f"+-{max(more, less, key=float)}"


def param_name(key: str, param: Param) -> ParamName:
    """The name of a parameter on the page; one we do not know keeps its own."""
    known = NAMES.get(key)
    if known is not None:
        return known if not (key == "theta" and param.unit != "mas") else ParamName("scale", "scale", safe(param.unit))
    plain_name = safe(key).replace("_", " ")
    return ParamName(plain_name, plain_name, safe(param.unit))


def value_and_error(param: Param, factor: float = 1.0, wide: bool = False, least: float = 0.0) -> tuple[str, str]:
    """A value as far as its error reaches, and the error (one digit, two where it begins with 1); limits read as such.

    Args:
        least: the least value that the fits allow: a lower limit there says nothing, and is written as that.

    >>> value_and_error(Param(5612.3, 5572.0, 5652.0, "K"))
    ('5612', ' +-40')
    >>> value_and_error(Param(0.31, 0.2, 0.5, ""))
    ('0.31', ' +0.19 -0.11')
    >>> value_and_error(Param(4.9, 4.2, 4.9, "mag", limit=True))
    ('>4.2', ' (95 %)')
    >>> value_and_error(Param(4.9, 0.0, 4.9, "mag", limit=True))
    ('any', ' up to 4.9')
    """
    value, low, high = (factor * end for end in (param.value, param.low, param.high))
    if not math.isfinite(value):
        return NOTHING, ""
    if param.limit:
        return _limit(value, low, high, factor * least)
    up, down = high - value, value - low
    spread = [size for size in (up, down) if math.isfinite(size) and size > 0]
    if not spread:
        return number(value, 4), ""
    decimals = max(0, _error_digits(min(spread)) - 1 - math.floor(math.log10(min(spread))))
    if decimals > 6:
        return number(value, 3), f" +-{number(min(spread), 2)}"
    text, more, less = (f"{size:.{decimals}f}" for size in (value, up, down))
    if not (math.isfinite(up) and math.isfinite(down)):
        return text, f" {'+' + more if math.isfinite(up) else '+?'} {'-' + less if math.isfinite(down) else '-?'}"
    if more == less or not wide and max(spread) < UNLIKE * min(spread):
        return text, f" +-{max(more, less, key=float)}"
    return text, f" +{more} -{less}"


def _limit(value: float, low: float, high: float, least: float) -> tuple[str, str]:
    """A one-sided 95 % limit: below a value at the lower bound, above one at the upper bound, or none at all."""
    if math.isfinite(high) and high > value:
        return f"<{_limit_text(high)}", LEVEL
    if math.isfinite(low) and least * (1 + ROUNDING) < low < value:
        return f">{_limit_text(low)}", LEVEL
    if low == value:
        return number(value, 4), " at its bound"
    return "any", f"{UP_TO}{_limit_text(value)}"


def _limit_text(value: float) -> str:
    """Two digits, three where a temperature or the like has as many before its point."""
    return number(value, 2) if abs(value) < 1000 else number(float(f"{value:.3g}"), 3)


def _error_digits(error: float) -> int:
    return 2 if f"{error:e}"[0] == "1" else 1


def param_words(key: str, param: Param) -> str:
    """A parameter in running text: name, value, interval or limit, unit.

    >>> param_words("av", Param(0.0, 0.0, 0.55, "mag", limit=True))
    'extinction A_V <0.55 mag (95 %)'
    """
    name = param_name(key, param)
    value, error = value_and_error(param, name.factor, least=LEAST.get(key, 0.0))
    parts = (value, name.unit, error.strip()) if error == LEVEL else (value, error.strip(), name.unit)
    return " ".join(part for part in (name.label, *parts) if part)


def fits_table(width: int, fits: Sequence[Fit], shown: int) -> list[Row]:
    """All fits of a check, best first."""
    heads = ("chi2", "dof", "p", "BIC")
    columns = ([tenth(fit.chi2) for fit in fits], [str(fit.dof) for fit in fits], [p_text(fit.p) for fit in fits],
               [tenth(fit.bic) for fit in fits])  # fmt: skip
    tails = number_columns(heads, columns)
    room = max(8, min(MODEL_WIDE, width - 1 - len(tails[0])))
    rows = [row((f" {cut('fits of this check' if room >= 18 else 'its fits', room)}{tails[0]}", "head"))]
    for line, (one, cells) in enumerate(zip(fits, tails[1:], strict=True)):
        mark = ">" if line == shown else " "
        text = f"{mark}{cut(safe(one.model), room)}{cells}"
        rows.append([Span(text, "chosen" if line == shown else "", f"fit({line})")])
    return rows


def number_columns(heads: Sequence[str], columns: Sequence[Sequence[str]]) -> list[str]:
    """Columns of numbers under their heads, aligned by the decimal point, two spaces before each.

    >>> number_columns(("chi2", "p"), (["4.2", "596.9"], ["0.7", "<1e-300"]))
    ['   chi2        p', '    4.2   0.7   ', '  596.9  <1e-300']
    """
    lines = [""] * (1 + len(columns[0]))
    for head, column in zip(heads, columns, strict=True):
        aligned = decimal_aligned(column)
        size = max(len(head), *(len(text) for text in aligned))
        lines = [f"{line}  {text:>{size}}" for line, text in zip(lines, (head, *aligned), strict=True)]
    return lines


def _statistics(fit: Fit) -> list[str]:
    chi2, bic = decimal_aligned([tenth(fit.chi2), tenth(fit.bic)])
    return [chi2, f"{fit.dof}  ", _whole_e(p_text(fit.p)), bic]


def _whole_e(text: str) -> str:
    """Shift a short exponent number so that its last digit stands at the decimal points above."""
    return text if "." in text else f"{text}  " if "e" not in text else text


def tenth(value: float) -> str:
    """A statistic to a tenth, or shorter where it is huge."""
    if not math.isfinite(value):
        return NOTHING
    return f"{value:.1f}" if abs(value) < 1e6 else number(value, 3)
