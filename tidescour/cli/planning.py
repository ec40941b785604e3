"""`tidescour new` and `tidescour schema`: what a plan looks like."""

from __future__ import annotations

import json
from pathlib import Path

import click


@click.command(short_help="Write a commented plan.")
@click.argument("folder", type=click.Path(path_type=Path), metavar="DIR")
def new(folder: Path) -> None:
    """Write a commented plan to DIR/plan.toml, to be filled in.

    \b
    Example:
      tidescour new mysite
    """
    from tidescour.plan.template import write_new_plan

    path = write_new_plan(folder)
    click.echo(f"wrote {path}: fill it in, then `tidescour check {path}` and `tidescour run {path}`")


@click.command(short_help="Print a JSON Schema.")
@click.argument("of", type=click.Choice(["plan", "handoff"]), default="plan")
def schema(of: str) -> None:
    """Print the JSON Schema of the plan file, or of handoff.json.

    \b
    Examples:
      tidescour schema
      tidescour schema handoff
    """
    if of == "plan":
        from tidescour.pipeline import plan_choices
        from tidescour.plan.schema import plan_schema

        document = plan_schema(plan_choices())
    else:
        from tidescour.handoff.schema import handoff_schema

        document = handoff_schema()
    click.echo(json.dumps(document, indent=2))
