"""What the commands say: findings, progress and small tables, for a person at a terminal."""

from __future__ import annotations

import os
import shutil
import sys
import textwrap
import threading
import time
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager

import click

from tidescour.errors import Finding

SILENT_S = 2.0
TICK_S = 0.5
DONE_WITH_ERRORS = 4
NARROWEST_NAME = 14
COLOURS = {"warning": "yellow", "error": "red"}


def line_width() -> int:
    """Return the columns of the terminal, between 40 and 100."""
    return min(max(shutil.get_terminal_size((80, 24)).columns, 40), 100)


def colours_wanted() -> bool | None:
    """Return False where the terminal or its user wants plain text, else None: as the stream can."""
    return False if "NO_COLOR" in os.environ or os.environ.get("TERM") == "dumb" else None


def wrapped(text: str) -> str:
    """Return text in lines that fit the terminal, those after the first indented."""
    return textwrap.fill(text, line_width(), subsequent_indent="  ", break_on_hyphens=False)


@contextmanager
def progress(quiet: bool) -> Iterator[Callable[[str], None]]:
    """Give what takes the name of each step; on a terminal, work of over two seconds shows its step and its time."""
    if quiet or not sys.stderr.isatty():
        yield lambda step: None
        return
    began = time.monotonic()
    steps = [""]
    done = threading.Event()

    def draw() -> None:
        elapsed = time.monotonic() - began
        if elapsed > SILENT_S:
            text = textwrap.shorten(f"{elapsed:.0f} s  {steps[-1]}", line_width() - 1, placeholder="...")
            click.echo(f"\r\x1b[K{text}", nl=False, err=True)

    def tick() -> None:
        while not done.wait(TICK_S):
            draw()

    clock = threading.Thread(target=tick, daemon=True)
    clock.start()
    try:
        yield steps.append
    finally:
        done.set()
        clock.join()
        click.echo("\r\x1b[K", nl=False, err=True)


def say_findings(findings: Sequence[Finding], quiet: bool) -> None:
    """Print findings to standard error, errors last so that they stay in sight."""
    if quiet:
        return
    for severity in ("note", "warning", "error"):
        for finding in findings:
            if finding.severity == severity:
                head = f"{severity}:"
                if severity in COLOURS:
                    head = click.style(head, fg=COLOURS[severity], bold=severity == "error" or None)
                text = textwrap.fill(
                    f"{finding.where}: {finding.message} [{finding.code}]",
                    line_width(),
                    initial_indent=" " * (len(severity) + 2),
                    subsequent_indent="  ",
                    break_on_hyphens=False,
                )
                click.echo(f"{head} {text.lstrip()}", err=True)


def exit_with(findings: Iterable[Finding]) -> int:
    """Return 4 where a finding is an error, else 0."""
    return DONE_WITH_ERRORS if any(finding.severity == "error" for finding in findings) else 0


def text_table(header: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    """Return a table in plain text, its first column to the left and shortened to fit.

    On a terminal too narrow for the numbers each row becomes a block of lines.
    """
    numbers = [max(map(len, column)) for column in zip(*(row[1:] for row in [header, *rows]), strict=True)]
    room = line_width() - sum(width + 2 for width in numbers)
    if room < NARROWEST_NAME:
        return "\n".join(_block(header, row) for row in rows)
    width = min(room, max(len(row[0]) for row in [header, *rows]))
    return "\n".join(
        "  ".join(
            [_shortened(row[0], width).ljust(width)]
            + [cell.rjust(number) for cell, number in zip(row[1:], numbers, strict=True)]
        ).rstrip()
        for row in [header, *rows]
    )


def _block(header: Sequence[str], row: Sequence[str]) -> str:
    names = max(map(len, header[1:]))
    lines = [f"  {name.ljust(names)}  {cell}" for name, cell in zip(header[1:], row[1:], strict=True)]
    return "\n".join([_shortened(row[0], line_width()), *lines])


def _shortened(text: str, width: int) -> str:
    return text if len(text) <= width else text[: width - 1] + "~"
