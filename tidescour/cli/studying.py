"""The way of every command that prints what it found and writes a folder only on request."""

from __future__ import annotations

import json
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Generic, Protocol, TypeVar

import click

from tidescour.cli.speaking import exit_with, progress, say_findings

if TYPE_CHECKING:
    from tidescour.errors import Finding
    from tidescour.gauge.records import InputFile
    from tidescour.pipeline.inputs import Progress
    from tidescour.plan.models import Plan
    from tidescour.plan.problems import Purpose
    from tidescour.report.pictures import Picture


class Found(Protocol):
    """What a study found out: at least its findings, and every input beside the plan."""

    @property
    def findings(self) -> tuple[Finding, ...]:
        """What qualifies the numbers."""

    @property
    def files(self) -> tuple[InputFile, ...]:
        """Every input beside the plan."""


F = TypeVar("F", bound=Found)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Study(Generic[F]):
    """What makes one command: its name, what it needs of a plan, and functions of what it found.

    `files` are those of the result folder without pictures, `document` what `--json` prints, `text` what is printed
    otherwise.
    """

    command: str
    purpose: Purpose
    compute: Callable[[Plan, Progress], F]
    files: Callable[[F], dict[str, bytes]]
    pictures: Callable[[F], tuple[Picture, ...]]
    document: Callable[[F], dict[str, object]]
    text: Callable[[F], str]


def run_study(study: Study[F], plan: Path, out: Path | None, *, no_figures: bool, as_json: bool, quiet: bool) -> int:
    """Read a plan, compute, write where a folder was named, print, and return the exit code."""
    from tidescour.handoff.provenance import circumstances, provenance_block
    from tidescour.handoff.write import check_replaceable, write_results
    from tidescour.pipeline import plan_choices
    from tidescour.plan.loader import read_plan
    from tidescour.plan.resolved import resolved_plan

    begun = circumstances(sys.argv)
    checked = read_plan(plan, plan_choices(), purpose=study.purpose)
    if out is not None:
        check_replaceable(out, study.command)
    with progress(quiet) as show:
        found = study.compute(checked, show)
        if out is not None:
            files = study.files(found)
            if not no_figures:
                from tidescour.report.pictures import picture_files

                show("drawing the figures")
                files |= picture_files(study.pictures(found))
            block = provenance_block(checked.file, found.files, resolved_plan(checked))
            write_results(out, files, study.command, {**block, **begun})
    say_findings(found.findings, quiet or as_json)
    if out is not None and not quiet:
        click.echo(f"results in {out}", err=True)
    click.echo(json.dumps(study.document(found), indent=2, ensure_ascii=False) if as_json else study.text(found))
    return exit_with(found.findings)
