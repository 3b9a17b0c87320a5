"""The command line.  Commands import what they need when they run, so that starting stays quick."""

import sys

import click

from overlapse.lint.commands import Commands
from overlapse.lint.common import BROKEN, CLEAN, MISUSED, STOPPED
from overlapse.lint.stopping import Stopped, catching


@click.command(cls=Commands, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="overlapse", prog_name="overlapse")
def cli() -> None:
    """Judge Gaussian basis-set files before cluster time is spent on them.

    \b
    Examples:
      overlapse demo                       the whole job on built-in files
      overlapse audit sets/                judge a folder
      overlapse rules contraction.norm     what a rule looks for, and why

    `overlapse COMMAND --help` tells more, with examples; `overlapse completion --help` how to have
    command lines completed. Colours are left out where NO_COLOR is set.
    """


def main() -> None:
    """Entry point: errors that are nobody's finding get their own exit status."""
    from overlapse.lint.settings import SettingsError

    before = catching()
    try:
        cli(prog_name="overlapse")
    except Stopped:
        click.echo("\nstopped; what was not finished was not written", err=True)
        sys.exit(STOPPED)
    except SettingsError as problem:
        for line in str(problem).split("\n"):
            click.echo(f"error: {line}", err=True)
        sys.exit(MISUSED)
    except BrokenPipeError:
        # The reader of our output has gone, which is its right.
        sys.stderr.close()
        sys.exit(CLEAN)
    except Exception as failure:
        click.echo(
            f"internal failure: {type(failure).__name__}: {failure}\n"
            "This is a fault of the program, not of your file; please report it with the file.",
            err=True,
        )
        sys.exit(BROKEN)
    finally:
        if before is not None:
            catching(before)
