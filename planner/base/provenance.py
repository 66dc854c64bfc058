"""What a result was made from: versions and hashes."""

from __future__ import annotations

import hashlib
import platform
from collections.abc import Iterable
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

__all__ = ["file_hashes", "planner_version", "versions"]

_PACKAGES = ("numpy", "scipy", "numba", "astropy", "pyerfa", "astroplan", "dust_extinction",
             "pandas", "matplotlib", "pydantic", "pyyaml")  # fmt: skip


def planner_version() -> str:
    """Return the planner's own version."""
    try:
        return version("reverberation-planner")
    except PackageNotFoundError:
        return "not installed"


def versions() -> dict[str, str]:
    """Return the versions of Python and of every library that a result may depend on."""
    return {"python": platform.python_version()} | {name: version(name) for name in _PACKAGES}


def file_hashes(paths: Iterable[Path]) -> dict[str, str]:
    """Return the SHA-256 of each file, by name."""
    return {str(path): hashlib.sha256(path.read_bytes()).hexdigest() for path in paths}
