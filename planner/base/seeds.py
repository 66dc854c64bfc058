"""Named random streams: the same file and seed give the same draws, in any order."""

from __future__ import annotations

from zlib import crc32

import numpy as np

__all__ = ["stream"]


def stream(seed: int, stage: str, *key: int | str) -> np.random.Generator:
    """Return the random stream of one stage of one run.

    Parameters
    ----------
    seed : int
        The campaign's seed, >= 0.
    stage : str
        Name of the stage that draws (``"weather"``, ``"lag"``, ...). A new stage shifts no other.
    *key : int or str
        What the draw belongs to, e.g. target name and trial number. Text enters by its CRC-32,
        so that adding a target to a list does not change the draws of the others.

    Returns
    -------
    numpy.random.Generator
        Independent of every stream with another seed, stage or key.
    """
    words = [crc32(k.encode()) if isinstance(k, str) else int(k) for k in (stage, *key)]
    sequence = np.random.SeedSequence(seed, spawn_key=tuple(words))
    return np.random.Generator(np.random.PCG64(sequence))
