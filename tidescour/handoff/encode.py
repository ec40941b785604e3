"""JSON as this program writes it."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any


def json_bytes(document: Mapping[str, Any]) -> bytes:
    """Return a document as UTF-8 JSON: keys in their order, full digits, a newline at the end.

    Raises
    ------
    ValueError
        If a number is NaN or infinite; an empty cell must be None.
    """
    return (json.dumps(document, ensure_ascii=False, allow_nan=False, indent=1) + "\n").encode("utf-8")
