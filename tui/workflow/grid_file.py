"""Template grids as one file: a checked header, the records as JSON, the arrays as they lie in memory.

No pickle: a file that someone tampered with can at worst be refused. Layout, little-endian:
MAGIC, SHA-256 of all that follows, length of the JSON (8 bytes), the JSON, the arrays one after another.
"""

from __future__ import annotations

import dataclasses
import hashlib
import json
from collections.abc import Mapping
from typing import Any

import numpy as np

MAGIC = b"plainlight grids 1\n"
_DIGEST = 32
_LENGTH = 8


class DamagedError(ValueError):
    """The bytes are no grids, or not those that were written."""


def pack(record: Any) -> bytes:
    """A tree of dataclasses, tuples, mappings with text keys, arrays and plain values as bytes."""
    arrays: list[bytes] = []
    skeleton = json.dumps(_skeleton(record, arrays)).encode("ascii")
    body = b"".join([len(skeleton).to_bytes(_LENGTH, "little"), skeleton, *arrays])
    return MAGIC + hashlib.sha256(body).digest() + body


def unpack(raw: bytes, types: Mapping[str, type]) -> Any:
    """What `pack` was given.

    Args:
        types: the dataclasses that may occur, by name.
    Raises:
        DamagedError: the bytes are damaged, or hold another kind of record.
    """
    start = len(MAGIC) + _DIGEST
    body = memoryview(raw)[start:]
    if raw[: len(MAGIC)] != MAGIC or hashlib.sha256(body).digest() != raw[len(MAGIC) : start]:
        raise DamagedError("not grids, or damaged")
    length = int.from_bytes(body[:_LENGTH], "little")
    skeleton = json.loads(bytes(body[_LENGTH : _LENGTH + length]))
    try:
        return _rebuilt(skeleton, body[_LENGTH + length :], types)
    except (KeyError, TypeError) as error:
        raise DamagedError(f"grids of another program version: {error}") from error


def _skeleton(value: Any, arrays: list[bytes]) -> Any:
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        fields = {one.name: _skeleton(getattr(value, one.name), arrays) for one in dataclasses.fields(value)}
        return {"record": type(value).__name__, "fields": fields}
    if isinstance(value, np.ndarray):
        return _array(value, arrays)
    if isinstance(value, tuple):
        return {"tuple": [_skeleton(item, arrays) for item in value]}
    if isinstance(value, list):
        return {"list": [_skeleton(item, arrays) for item in value]}
    if isinstance(value, Mapping):
        return {"mapping": {str(key): _skeleton(item, arrays) for key, item in value.items()}}
    if isinstance(value, np.generic):
        value = value.item()
    if value is None or isinstance(value, (bool, int, float, str)):
        return {"value": value}  # NaN and infinities are read back by Python's own JSON
    raise TypeError(f"grids cannot hold a {type(value).__name__}")


def _array(value: np.ndarray, arrays: list[bytes]) -> dict[str, Any]:
    kind = {"f": "<f8", "i": "<i8", "b": "|b1"}.get(value.dtype.kind)
    if kind is None:
        raise TypeError(f"grids cannot hold an array of {value.dtype}")
    content = np.ascontiguousarray(value, dtype=kind).tobytes()
    arrays.append(content)
    return {"array": kind, "shape": list(value.shape), "size": len(content), "at": sum(map(len, arrays[:-1]))}


def _rebuilt(node: Any, arrays: memoryview, types: Mapping[str, type]) -> Any:
    if "record" in node:
        fields = {name: _rebuilt(item, arrays, types) for name, item in node["fields"].items()}
        return types[node["record"]](**fields)
    if "array" in node:
        part = arrays[node["at"] : node["at"] + node["size"]]
        return np.frombuffer(part, dtype=node["array"]).reshape(node["shape"])
    for kind, made in (("tuple", tuple), ("list", list)):
        if kind in node:
            return made(_rebuilt(item, arrays, types) for item in node[kind])
    if "mapping" in node:
        return {name: _rebuilt(item, arrays, types) for name, item in node["mapping"].items()}
    return node["value"]
