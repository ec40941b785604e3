"""The command `tidescour`: its subcommands, and what every one of them shares on the way out."""

from __future__ import annotations

import sys
import traceback

import click

from tidescour.cli.calibrating import calibrate
from tidescour.cli.checking import check, tides
from tidescour.cli.delaying import delay
from tidescour.cli.listing import formulas, layouts, relations
from tidescour.cli.planning import new, schema
from tidescour.cli.running import run
from tidescour.cli.soundings import soundings
from tidescour.cli.speaking import colours_wanted
from tidescour.errors import TidescourError

FAULT, REFUSED, INTERRUPTED = 1, 3, 130


@click.group(context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(package_name="tidescour", message="%(prog)s %(version)s")
def commands() -> None:
    """From two tide gauges and a closure programme to effective scour durations, depths and lengths of protection.

    \b
    Start with:
      tidescour new mysite               a commented plan to fill in
      tidescour check mysite/plan.toml   what the gauges really read
      tidescour run mysite/plan.toml     the whole job

    Exit codes: 0 done, 2 wrong usage, 3 input refused (nothing written), 4 done with findings of severity error,
    1 a fault of the program, 130 interrupted.
    """


for command in (new, check, tides, calibrate, run, soundings, delay, schema, layouts, relations, formulas):
    commands.add_command(command)


def main() -> None:
    """Run the command line and leave with the exit code of the contract."""
    sys.exit(exit_code())


def exit_code(arguments: list[str] | None = None) -> int:
    """Run the command line and return its exit code; messages go to standard error."""
    try:
        code = commands.main(arguments, prog_name="tidescour", standalone_mode=False, color=colours_wanted())
    except click.ClickException as error:
        error.show()
        return error.exit_code
    except TidescourError as error:
        click.echo(f"refused: {error}", err=True)
        return REFUSED
    except (click.Abort, KeyboardInterrupt):
        click.echo("interrupted; result folders are whole, as before or new", err=True)
        return INTERRUPTED
    except SystemExit:
        # The reader of standard output has gone, as in `| head`; the library has quieted the stream, and files stand.
        return 0
    except Exception:
        click.echo(f"a fault of the program, please report it:\n{traceback.format_exc()}", err=True)
        return FAULT
    return code if isinstance(code, int) else 0


if __name__ == "__main__":
    main()
