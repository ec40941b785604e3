"""Words that several messages share."""

from __future__ import annotations


def counted(count: int, noun: str) -> str:
    """Return ``1 row`` or ``2 rows``."""
    return f"{count} {noun}" if count == 1 else f"{count} {noun}s"
