"""What is wrong with a plan: a problem, where it stands, and how both are put into words."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass
from datetime import date, datetime, time
from difflib import get_close_matches
from typing import Any, Literal

Purpose = Literal["records", "run", "soundings", "delay", "calibrate"]
"""Whether a plan is read for its records alone, for a whole run (and what goes with one), or for a calibration."""

WHOLE_JOB: tuple[Purpose, ...] = ("run", "soundings", "delay")
"""The purposes that need all steps, from the records to the length of the protection."""

KeyPath = tuple[str | int, ...]
"""Keys from the top of the plan down; positions in a list count from 0 here, and from 1 in messages."""

_PURPOSES_OF_TABLES: Mapping[str | int, tuple[Purpose, ...]] = {
    "stage": WHOLE_JOB,
    "bed": WHOLE_JOB,
    "scour": WHOLE_JOB,
    "load_case": WHOLE_JOB,
    "filter": WHOLE_JOB,
    "soundings": ("soundings",),
    "sounding": ("soundings",),
    "basin": (*WHOLE_JOB, "calibrate"),
    "calibration": ("calibrate",),
    "discharge": ("calibrate",),
}

_LONGEST_QUOTE = 60
_LONGEST_NAME = 80


@dataclass(frozen=True, slots=True, kw_only=True)
class Problem:
    """One thing that is wrong: the keys that lead to it, what was found and what is allowed.

    `only_for` names the purposes that it stands in the way of; empty where it is wrong for all.
    """

    path: KeyPath
    message: str
    only_for: tuple[Purpose, ...] = ()


def purposes_of(path: KeyPath) -> tuple[Purpose, ...]:
    """Return the purposes that miss what is left out at a path: to read records, the works may be incomplete yet."""
    return _PURPOSES_OF_TABLES.get(path[0], ())


@dataclass(frozen=True, slots=True, kw_only=True)
class Mark:
    """Where a key stands: file, ``line`` or ``row``, its number from 1, and what else helps to find it."""

    file: str
    unit: str
    number: int
    detail: str = ""

    def __str__(self) -> str:
        """Return such as ``plan.toml line 12``."""
        return f"{self.file} {self.unit} {self.number}{self.detail}"


def found(value: Any) -> str:
    """Return a value as the plan has it, short enough for a message."""
    match value:
        case bool():
            text = str(value).lower()
        case str():
            text = f'"{value}"'
        case datetime() | date() | time():
            text = value.isoformat().replace("+00:00", "Z")
        case dict():
            text = "a table with " + ", ".join(value) if value else "an empty table"
        case list() | tuple():
            text = "[" + ", ".join(found(item) for item in value) + "]"
        case _:
            text = str(value)
    return _short(text, _LONGEST_QUOTE)


def _short(text: str, longest: int) -> str:
    text = _printable(text)
    return text if len(text) <= longest else text[: longest - 3] + "..."


def _printable(text: str) -> str:
    r"""Return a text with what does not show, or breaks the line, as Python writes it: ``\n`` or ``\u202e``."""
    return "".join(sign if sign.isprintable() else ascii(sign)[1:-1] for sign in text)


def listed(names: Iterable[str]) -> str:
    """Return names as ``"a", "b" or "c"``."""
    quoted = [f'"{_short(name, _LONGEST_NAME)}"' for name in names]
    return " or ".join(filter(None, (", ".join(quoted[:-1]), quoted[-1]))) if quoted else "nothing"


def suggestion(wrong: object, allowed: Collection[str]) -> str:
    """Return the nearest allowed name as a question, or else all of them."""
    by_lower_case = {name.lower(): name for name in allowed}
    near = get_close_matches(str(wrong).lower(), by_lower_case, n=1, cutoff=0.6)
    if near:
        return f'did you mean "{by_lower_case[near[0]]}"?'
    if not allowed:
        return "there is none to choose from"
    return f"choose {listed(allowed)}" if len(allowed) <= 40 else f"there are {len(allowed)} to choose from"


def key_text(path: KeyPath, written: Mapping[str, Any]) -> str:
    """Return keys such as ``stage[2 "sill to -6"].opening[1 "main gap"].width_m``, positions counted from 1."""
    text = ""
    table: Any = written
    depth = len(existing(path, written))
    for position, key in enumerate(path):
        table = table[key] if position < depth else None
        if isinstance(key, int):
            name = table.get("name") if isinstance(table, dict) else None
            text += f'[{key + 1} "{_short(name, _LONGEST_NAME)}"]' if isinstance(name, str) else f"[{key + 1}]"
        else:
            bare = key.replace("_", "").replace("-", "").isalnum() and key.isascii()
            text += ("." if text else "") + (key if bare else f'"{_short(key, _LONGEST_NAME)}"')
    return text


def existing(path: Iterable[str | int], written: Any) -> KeyPath:
    """Return that part of a path which leads to something written."""
    reached: KeyPath = ()
    for key in path:
        try:
            written = written[key]
        except (KeyError, IndexError, TypeError):
            break
        reached = (*reached, key)
    return reached


def nearest_mark(path: KeyPath, marks: Mapping[KeyPath, Mark]) -> Mark | None:
    """Return the mark of a key, or of the nearest table around it."""
    for length in range(len(path), 0, -1):
        if path[:length] in marks:
            return marks[path[:length]]
    return None


def problem_texts(
    problems: Iterable[Problem], written: Mapping[str, Any], marks: Mapping[KeyPath, Mark], file: str
) -> tuple[str, ...]:
    """Return one line a problem, in the order of the files; what stands nowhere comes last."""

    def place(problem: Problem) -> tuple[bool, bool, int]:
        mark = nearest_mark(problem.path, marks)
        return (mark is None, mark is not None and mark.file != file, mark.number if mark else 0)

    return tuple(
        _printable(f"{nearest_mark(problem.path, marks) or file}: {key_text(problem.path, written)}: {problem.message}")
        for problem in sorted(problems, key=place)
    )
