"""What each column of a table is for, by name: decided once, before any cell is read."""

from __future__ import annotations

from dataclasses import dataclass, field

from tui.model import Band
from tui.readers.records import FactRow, Refused


@dataclass(frozen=True, slots=True)
class FlagColumn:
    """A flag of one band: the whole text of a column, or one letter of it."""

    key: str  # the catalogue's name of the flag
    column: str
    position: int | None = None
    width: int = 0  # letters that the text must have


@dataclass(frozen=True, slots=True)
class BandColumns:
    """The columns that make one band's measurement; names of columns, "" where there is none."""

    band: Band
    source: str
    value: str
    is_mag: bool
    unit: str  # of the value, where its column has none
    error: str = ""
    error_unit: str = ""
    over_error: str = ""
    snr: str = ""
    counts: str = ""
    counts_error: str = ""
    counts_zero: float = float("nan")  # magnitude of a source of one count
    limit: str = ""  # a column of truth values
    limit_flag: FlagColumn | None = None
    limit_letters: str = ""
    limit_nsigma: float = 2.0
    sure_flag: FlagColumn | None = None  # says which values without an error are detections all the same
    sure_letters: str = ""
    upper: str = ""  # a column of limits, for rows without a value
    upper_unit: str = ""
    upper_nsigma: float = 3.0
    nsigma: str = ""
    null_error: float | None = None  # a null error means a limit at so many sigma
    epoch: str = ""
    epoch_word: str = ""
    exclude: str = ""
    note: str = ""
    source_column: str = ""
    flags: tuple[FlagColumn, ...] = ()


@dataclass(frozen=True, slots=True)
class FactColumn:
    """The column of one fact."""

    fact: FactRow
    column: str
    unit: str = ""  # where the column has none; "": the fact's own
    days: str = ""  # MJD or JD: to be turned into a Julian year


@dataclass(frozen=True, slots=True)
class Plan:
    """A table's columns, sorted by use."""

    name: str
    name_prefix: str
    bands: tuple[BandColumns, ...]
    facts: tuple[FactColumn, ...]
    unknown: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    refused: tuple[Refused, ...] = field(default=())
    units: dict[str, str] = field(
        default_factory=dict
    )  # column -> unit of the column map, which goes before the file's
