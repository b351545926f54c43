"""A reader with the packaged bands, facts and archives, and tables written on the spot."""

from __future__ import annotations

from types import SimpleNamespace

import pytest

from tui.data.archives import archive_texts
from tui.data.load import band_aliases, bands, read_rows
from tui.readers import parse_archives, read_neighbours, read_table


@pytest.fixture(scope="session")
def facts():
    rows = read_rows("facts.csv")
    return {row["name"]: SimpleNamespace(name=row["name"], unit=row["unit"], kind=row["kind"]) for row in rows}


@pytest.fixture(scope="session")
def archives():
    return parse_archives(archive_texts())


@pytest.fixture
def read(facts, archives):
    def read_it(path, **options):
        return read_table(path, bands(), band_aliases(), facts, archives, **options)

    return read_it


@pytest.fixture
def read_near(facts, archives):
    def read_it(path, **options):
        return read_neighbours(path, bands(), band_aliases(), facts, archives, **options)

    return read_it


@pytest.fixture
def write(tmp_path):
    """Writes a text or bytes under a name, and gives the path."""

    def write_it(content, name="t.csv"):
        path = tmp_path / name
        path.write_bytes(content if isinstance(content, bytes) else content.encode("utf-8"))
        return path

    return write_it


@pytest.fixture
def one(read, write):
    """The one candidate of a CSV text, its measurements by band."""

    def read_one(text, **options):
        contents = read(write(text), **options)
        assert len(contents.candidates) == 1, contents.refused
        candidate = contents.candidates[0]
        return candidate, {measurement.band: measurement for measurement in candidate.measurements}, contents

    return read_one
