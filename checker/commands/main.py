"""The entry of the command line, its commands, and how it ends.

Exit status 0: nothing at or above the level that fails. 1: findings at or above it. 2: something could not be read, or
the call is wrong. The commands stand in one table, so that ``--help`` imports none of them.
"""

from __future__ import annotations

import sys
from collections.abc import Sequence
from importlib import import_module

import click

from ..version import __version__
from .streams import discard_output, tell

# command -> (module and function, one line of help)
COMMANDS = {
    "review": ("review:review", "Review netlists and print findings."),
    "stages": ("stages:stages", "List the recognized stages with their figures."),
    "rules": ("rules:rules", "List the rules, or tell one in full."),
    "parts": ("parts:parts", "List the part data, or tell one part in full."),
}

EPILOG = """\b
Examples:
  ampwarden review board.cir
  ampwarden review boards/ --format sarif --output findings.sarif
"""


class Commands(click.Group):
    """A group whose commands are imported when they are called."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Return the names in the order of the table."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Import and return one command."""
        if cmd_name not in COMMANDS:
            return None
        module, function = COMMANDS[cmd_name][0].split(":")
        command: click.Command = getattr(import_module(f".{module}", __package__), function)
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """List the commands from the table alone."""
        with formatter.section("Commands"):
            formatter.write_dl([(name, words) for name, (_, words) in COMMANDS.items()])


@click.group(cls=Commands, epilog=EPILOG, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="ampwarden", message="%(prog)s %(version)s")
def cli() -> None:
    """Review analog schematics with operational amplifiers from their netlists.

    Exit status: 0 nothing at or above --fail-on, 1 findings at or above it, 2 something could not be read or the call
    is wrong.
    """


def main(arguments: Sequence[str] | None = None) -> None:
    """Run the command line and leave with its exit status."""
    sys.exit(run(arguments))


def run(arguments: Sequence[str] | None = None) -> int:
    """Run the command line and return its exit status; every failure is told in words on standard error."""
    from ..errors import AmpwardenError, render_problem

    try:
        status = cli.main(args=arguments, prog_name="ampwarden", standalone_mode=False)
        sys.stdout.flush()
    except AmpwardenError as trouble:
        for problem in trouble.problems:
            tell(render_problem(problem))
        return 2
    except click.exceptions.Exit as leave:
        return leave.exit_code
    except click.ClickException as trouble:
        tell(_call_trouble(trouble))
        return 2
    except (KeyboardInterrupt, click.Abort):
        tell("stopped by the keyboard")
        return 130
    except BrokenPipeError:
        discard_output()
        return 2
    except Exception as trouble:  # the last line of defence: a bug is one line, never a traceback
        from ..pipeline import bug_problem

        tell(bug_problem(trouble).what.replace("with this file", "with the command and its files"))
        return 2
    return status if isinstance(status, int) else 0


def _call_trouble(trouble: click.ClickException) -> str:
    """Say what is wrong with a call in the house's words."""
    context = getattr(trouble, "ctx", None)
    command = context.command_path if context is not None else "ampwarden"
    what = trouble.format_message().rstrip(".")
    near: Sequence[str] = ()
    if isinstance(trouble, click.NoSuchOption):
        what = f"unknown option {trouble.option_name}"
        near = trouble.possibilities or ()
    elif isinstance(trouble, click.UsageError) and what.startswith("No such command"):
        from ..quantities import nearest_names

        name = what.split("'")[1] if "'" in what else what
        what = f"unknown command {name}"
        near = nearest_names(name, COMMANDS)
    text = what[:1].lower() + what[1:]
    if near:
        text += f"; nearest: {', '.join(near)}"
    return f"{text}\n  see  {command} --help"
