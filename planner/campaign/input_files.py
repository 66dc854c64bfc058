"""Getting the content of an input file, or one sentence on why that cannot be."""

from __future__ import annotations

from pathlib import Path

__all__ = ["LARGEST_BYTES", "as_text", "read_bytes"]

LARGEST_BYTES = 20_000_000
"""No campaign file or target list is larger; beyond it, the wrong file was named."""


def read_bytes(path: Path) -> bytes:
    """Return the content of an input file.

    Raises
    ------
    ValueError
        If it is missing, not a plain file, unreadable, empty or too large; the message is of the
        form ``what was found; expected what would do``.
    """
    try:
        if path.is_dir():
            raise ValueError("is a folder; expected a file")
        if path.exists() and not path.is_file():
            raise ValueError("is a device or pipe; expected a plain file")
        size = path.stat().st_size
        if size > LARGEST_BYTES:
            raise ValueError(
                f"is too large ({size / 1e6:.0f} MB); expected at most {LARGEST_BYTES / 1e6:.0f} MB"
            )
        content = path.read_bytes()
    except FileNotFoundError:
        raise ValueError("no such file; expected the path of an existing file") from None
    except PermissionError:
        raise ValueError("no permission to read it; expected a readable file") from None
    except OSError as error:
        raise ValueError(f"cannot be read ({error.strerror}); expected a readable file") from None
    if not content.strip():
        raise ValueError("the file is empty; expected at least a few lines of text")
    return content


def as_text(content: bytes) -> str:
    """Decode UTF-8, with or without a byte-order mark.

    Raises
    ------
    ValueError
        If the content is not UTF-8 text.
    """
    if content[:2] in {b"\xff\xfe", b"\xfe\xff"}:
        raise ValueError("is written in UTF-16; expected text saved as UTF-8")
    if b"\0" in content:
        raise ValueError("is a binary file; expected text in UTF-8")
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        raise ValueError(f"is not UTF-8 text (see line {line}); expected UTF-8") from None
