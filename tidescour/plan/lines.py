"""In which line of the plan file each key stands; a help for messages, never for meaning."""

from __future__ import annotations

import re
import tomllib
from typing import Any

from tidescour.plan.problems import KeyPath, Mark, existing

_HEADER = re.compile(r"""^\s*(\[\[?)((?:[^\[\]"'#]|"[^"]*"|'[^']*')+)\]\]?\s*(?:#.*)?$""")
_KEY = re.compile(r"""^\s*((?:[\w.\- ]|"[^"]*"|'[^']*')+?)\s*=""")


def key_marks(text: str, written: dict[str, Any], file: str) -> dict[KeyPath, Mark]:
    """Return the first line of each table and key.

    Parameters
    ----------
    text : str
        A plan that is sound TOML.
    written : dict
        The same, parsed: a line that leads to nothing in it (inside a text of several lines) is left out.
    file : str
        Name for the marks.

    Returns
    -------
    dict
        Mark by path; keys inside inline tables and lists have none of their own.
    """
    marks: dict[KeyPath, Mark] = {}
    counts: dict[KeyPath, int] = {}
    table: KeyPath = ()
    for number, line in enumerate(text.split("\n"), start=1):
        mark = Mark(file=file, unit="line", number=number)
        if header := _HEADER.match(line):
            path = _table_path(_dotted(header[2]), header[1] == "[[", counts)
            if path and existing(path, written) == path:
                table = path
                if isinstance(path[-1], int):
                    counts[path[:-1]] = path[-1]
                for length in range(1, len(path) + 1):
                    marks.setdefault(path[:length], mark)
        elif key := _KEY.match(line):
            path = table + _dotted(key[1])
            if path != table and existing(path, written) == path:
                for length in range(len(table) + 1, len(path) + 1):
                    marks.setdefault(path[:length], mark)
    return marks


def _dotted(text: str) -> KeyPath:
    """Return the keys of ``a.b."c d"``; nothing where it is no key."""
    try:
        nested: Any = tomllib.loads(f"{text} = 0")
    except tomllib.TOMLDecodeError:
        return ()
    keys: list[str] = []
    while isinstance(nested, dict):
        (key,) = nested
        keys.append(key)
        nested = nested[key]
    return tuple(keys)


def _table_path(keys: KeyPath, is_list: bool, counts: dict[KeyPath, int]) -> KeyPath:
    """Return the path of a header, with the position of the latest table where a key is a list of tables."""
    path: KeyPath = ()
    for key in keys[:-1]:
        path = (*path, key)
        if path in counts:
            path = (*path, counts[path])
    path += keys[-1:]
    return (*path, counts.get(path, -1) + 1) if is_list else path
