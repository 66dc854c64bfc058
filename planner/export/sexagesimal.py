"""Coordinates as observers type them."""

from __future__ import annotations

__all__ = ["dec_text", "ra_text"]


def ra_text(ra_deg: float) -> str:
    """Return a right ascension as ``hh:mm:ss.ss``, rounded, 24 h being 0 h."""
    return _text(round(ra_deg % 360.0 * 24000.0) % 8640000, 2)


def dec_text(dec_deg: float) -> str:
    """Return a declination as ``+dd:mm:ss.s``, rounded; the sign stands also before 00."""
    return ("-" if dec_deg < 0.0 else "+") + _text(round(abs(dec_deg) * 36000.0), 1)


def _text(parts: int, digits: int) -> str:
    """Return whole parts of a second, 10**-digits each; whole numbers carry without error."""
    seconds, part = divmod(parts, 10**digits)
    minutes, second = divmod(seconds, 60)
    whole, minute = divmod(minutes, 60)
    return f"{whole:02d}:{minute:02d}:{second:02d}.{part:0{digits}d}"
