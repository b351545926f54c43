"""Outside files to candidates: VOTable, FITS, ECSV, CSV, TSV; public catalogues and the program's own columns."""

from tui.readers.archives import Archive, parse_archives
from tui.readers.columnmap import read_column_map
from tui.readers.records import Refused, SideContents, TableContents
from tui.readers.sides import read_dips, read_neighbours, read_spectra
from tui.readers.tables import read_parts, read_table
from tui.readers.windows import read_windows

__all__ = [
    "Archive",
    "Refused",
    "SideContents",
    "TableContents",
    "parse_archives",
    "read_column_map",
    "read_dips",
    "read_neighbours",
    "read_parts",
    "read_spectra",
    "read_table",
    "read_windows",
]
