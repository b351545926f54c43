"""The command line: parse, call workflow, print, exit status."""

from __future__ import annotations
