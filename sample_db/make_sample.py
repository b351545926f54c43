"""Make the sample again: python sample_db/make_sample.py (everything), or with --queue (the queue from its tables).

Saltmarsh is invented: no star, position or identifier in it is real. The tables follow from one random state. The
queue follows from the tables and from the program as it is, so that it is to be made again, with --queue, whenever
a check's version changes; a test says so.
"""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

FOLDER = Path(__file__).resolve().parent
sys.path[:0] = [str(FOLDER), str(FOLDER.parent)]
STATE = 20140611


def make_tables() -> int:
    """Write the tables, the pictures, the truth file and the practice stars; how many candidates there are."""
    from making.catalogues import Observer
    from making.practice import write_practice
    from making.recipes import all_stars
    from making.sky import Sky
    from making.tables import write_all

    from tui.model import Settings
    from tui.workflow.basis import packaged_tables
    from tui.workflow.templates import templates_for

    stars = all_stars(STATE)
    sky = Sky(templates_for(Settings()))
    for old in (FOLDER / "cutouts").glob("*.fits"):
        old.unlink()
    write_all(FOLDER, stars, Observer(sky, packaged_tables(), STATE))
    write_practice(FOLDER / "practice.toml", Observer(sky, packaged_tables(), STATE))
    return len(stars)


def main() -> None:
    """Parse, make, say what was made."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--queue", action="store_true", help="only the queue, from the tables as they are")
    if not parser.parse_args().queue:
        print(f"{make_tables()} candidates written to the tables in {FOLDER.name}/")
    from making.queue import make_queue

    print(make_queue(FOLDER))


if __name__ == "__main__":
    main()
