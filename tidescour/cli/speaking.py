"""What the commands say: findings, progress and small tables, for a person at a terminal."""

from __future__ import annotations

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
COLOURS = {"note": None, "warning": "yellow", "error": "red"}


def line_width() -> int:
    """Return the columns of the terminal, between 40 and 100."""
    return min(max(shutil.get_terminal_size((80, 24)).columns, 40), 100)


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
                head = click.style(f"{severity}:", fg=COLOURS[severity], bold=severity == "error")
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


def text_table(header: Sequence[str], rows: Sequence[Sequence[str]], names: int = 1) -> str:
    """Return a table in plain text that fits the terminal: the first `names` columns to the left and shortened."""
    numbers = [
        max(len(cell) for cell in column) for column in zip(*(row[names:] for row in [header, *rows]), strict=True)
    ]
    left = max(line_width() - sum(width + 2 for width in numbers), 12 * names)
    wanted = [max(len(row[k]) for row in [header, *rows]) for k in range(names)]
    share = [min(width, max(left // names - 1, 10)) for width in wanted]
    lines = []
    for row in [header, *rows]:
        cells = [_shortened(row[k], share[k]).ljust(share[k]) for k in range(names)]
        cells += [cell.rjust(width) for cell, width in zip(row[names:], numbers, strict=True)]
        lines.append("  ".join(cells).rstrip())
    return "\n".join(lines)


def _shortened(text: str, width: int) -> str:
    return text if len(text) <= width else text[: width - 1] + "~"
