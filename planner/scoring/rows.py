"""Small arrays as one short row of bytes, and back, bit by bit."""

from __future__ import annotations

import hashlib
import json
import math
import zlib
from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["packed", "unpacked"]

CHECK = 8
"""Bytes of checksum: a damaged row passes once in 2^64."""


def packed(key: str, arrays: Mapping[str, NDArray[Any]]) -> bytes:
    """Return arrays as one row: a checksum, then names, types, shapes and bytes, compressed.

    Raises `TypeError` for arrays that are not plain numbers, booleans, texts or times.
    """
    described, contents = [], []
    for name, array in arrays.items():
        if array.dtype.hasobject or np.dtype(array.dtype.str) != array.dtype:
            raise TypeError(f"{name}: arrays of {array.dtype} cannot be kept")
        described.append([name, array.dtype.str, *array.shape])
        contents.append(array.tobytes())
    head = json.dumps(described, separators=(",", ":")).encode()
    body = zlib.compress(b"\n".join([head, b"".join(contents)]), 6)
    return _check(key, body) + body


def unpacked(key: str, row: Any) -> dict[str, NDArray[Any]] | None:
    """Return the arrays of a row; None where it is not what was packed under this key."""
    if not isinstance(row, bytes) or row[:CHECK] != _check(key, row[CHECK:]):
        return None
    try:
        head, _, contents = zlib.decompress(row[CHECK:]).partition(b"\n")
        arrays, at = {}, 0
        for name, kind, *shape in json.loads(head):
            dtype, count = np.dtype(kind), math.prod(shape)
            flat = np.frombuffer(contents, dtype, count, at)
            arrays[name] = flat.reshape(shape).copy()
            at += count * dtype.itemsize
    except (ValueError, TypeError, zlib.error):
        return None
    return arrays if at == len(contents) else None


def _check(key: str, body: bytes) -> bytes:
    of_key = hashlib.sha256(key.encode()).digest()
    return hashlib.blake2b(body, digest_size=CHECK, key=of_key).digest()
