"""Outside files to candidates: VOTable, FITS, ECSV, CSV, TSV; public catalogues and the program's own columns."""

from tui.readers.archives import Archive, parse_archives
from tui.readers.records import Refused, SideContents, TableContents
from tui.readers.tables import read_parts, read_table

__all__ = ["Archive", "Refused", "SideContents", "TableContents", "parse_archives", "read_parts", "read_table"]
