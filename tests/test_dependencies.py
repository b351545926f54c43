"""Nothing in the dependency closure, tests included, is built from Rust."""

from __future__ import annotations

import re
from importlib.metadata import PackageNotFoundError, distribution

RUST_BUILDERS = ("maturin", "setuptools-rust", "setuptools_rust")


def requirement_names(name: str, extras: frozenset[str]) -> set[str]:
    """Names that an installed distribution asks for here, with some extras."""
    from packaging.requirements import Requirement

    found = set()
    for text in distribution(name).requires or ():
        requirement = Requirement(text)
        markers = [None] if requirement.marker is None else [*extras, ""]
        if requirement.marker is None or any(requirement.marker.evaluate({"extra": extra}) for extra in markers):
            found.add(requirement.name)
    return found


def closure(root: str, extras: frozenset[str]) -> set[str]:
    """Every distribution that `root` needs, itself included; what is not installed is not needed here."""
    seen, todo = set(), [(root, extras)]
    while todo:
        name, wanted = todo.pop()
        key = re.sub(r"[-_.]+", "-", name).lower()
        if key in seen:
            continue
        try:
            needs = requirement_names(name, wanted)
        except PackageNotFoundError:
            continue
        seen.add(key)
        todo.extend((need, frozenset()) for need in needs)
    return seen


def test_no_rust_in_the_closure():
    needed = closure("plainlight", frozenset({"test"}))
    assert {"textual", "numpy", "astropy", "pytest", "pyte"} <= needed
    for name in needed:
        wheel = distribution(name).read_text("WHEEL") or ""
        generator = next((line for line in wheel.splitlines() if line.startswith("Generator:")), "")
        assert not any(builder in generator for builder in RUST_BUILDERS), f"{name}: {generator}"
        names = [str(path) for path in distribution(name).files or ()]
        assert not any(path.endswith(("Cargo.toml", "Cargo.lock")) for path in names), name


def test_our_wheel_is_pure():
    wheel = distribution("plainlight").read_text("WHEEL") or ""
    assert "Root-Is-Purelib: true" in wheel
