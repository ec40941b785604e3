"""Arguments and options that several commands share."""

from __future__ import annotations

from pathlib import Path

import click

plan_argument = click.argument("plan", type=click.Path(path_type=Path), metavar="PLAN")
quiet_option = click.option("--quiet", "-q", is_flag=True, help="No messages on standard error.")
json_option = click.option("--json", "as_json", is_flag=True, help="Print JSON to standard output instead of text.")
out_option = click.option(
    "--out",
    type=click.Path(path_type=Path),
    metavar="DIR",
    help="Result folder; replaced whole, and only if tidescour wrote all that is in it.",
)
