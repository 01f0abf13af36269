"""The command line: finds commands when they are called, turns errors into messages and exit codes.

0 ok, 1 our bug, 2 wrong input or usage, 3 goal not met under --fail-under, 130 interrupted.
"""

from __future__ import annotations

import contextlib
import io
import sys
from importlib import import_module

import click

COMMANDS = {
    "new": "a commented starter study for a technique",
    "check": "is the file right, and what was understood",
    "resolve": "the complete study, nothing left to inherit",
    "assess": "everything about each scenario",
    "compare": "scenarios side by side, and the odds",
    "convert": "energy equivalents and full-precision differences",
}


class Lazy(click.Group):
    """A group that imports a command only when it is called."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """The commands in their order of use."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """The command, loaded now."""
        if cmd_name not in COMMANDS:
            return None
        return getattr(import_module(f"pvfeas.commands.{cmd_name}"), "command")  # type: ignore[no-any-return]  # noqa: B009

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        """As click does, with a suggestion for a name that is not known."""
        if args and args[0] not in COMMANDS and not args[0].startswith("-"):
            from pvfeas.suggestions import did_you_mean

            hint = did_you_mean(args[0], COMMANDS) or f"commands are {', '.join(COMMANDS)}"
            raise click.UsageError(f"no command {args[0]!r}; {hint}")
        return super().resolve_command(ctx, args)

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """The list of commands without loading any."""
        with formatter.section("Commands"):
            formatter.write_dl(list(COMMANDS.items()))


@click.group(cls=Lazy, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="pvfeas", message="pvfeas %(version)s")
@click.option("--debug", is_flag=True, help="Show the traceback of a bug.")
def cli(debug: bool) -> None:
    """Feasibility of measuring the parity-violating frequency difference between enantiomers.

    Begin with: pvfeas new scan -o study.toml, then pvfeas assess study.toml.
    """


def main(arguments: list[str] | None = None) -> None:
    """Run the command line and exit with its code."""
    sys.exit(run(sys.argv[1:] if arguments is None else arguments))


def run(arguments: list[str]) -> int:
    """Run the command line; the exit code."""
    from pvfeas.errors import PvfeasError

    out, err = sys.stdout, sys.stderr
    try:
        code = cli.main(args=arguments, prog_name="pvfeas", standalone_mode=False)
        if sys.stdout is not None:
            sys.stdout.flush()
        return code if isinstance(code, int) else 0
    except click.exceptions.Exit as stop:
        return stop.exit_code
    except click.ClickException as error:
        shown = io.StringIO()
        error.show(file=shown)
        return say(shown.getvalue().rstrip("\n"), 2)
    except PvfeasError as error:
        return say(str(error), 2)
    except (KeyboardInterrupt, click.Abort):
        return say("interrupted", 130)
    except SystemExit:
        if sys.stdout is out:
            raise
        sys.stdout, sys.stderr = out, err  # click has wrapped them, for the reader of --help has gone
        return _left(0)
    except BrokenPipeError:
        return _left(0)
    except OSError as error:
        return _left(say(f"standard output cannot be written: {(error.strerror or 'unknown reason').lower()}", 2))
    except Exception as bug:
        if "--debug" in arguments:
            raise
        return say(f"pvfeas has a bug: {type(bug).__name__}: {bug}\nplease report it; pvfeas --debug … shows where", 1)


def say(message: str, code: int) -> int:
    """A message on stderr, in what it can show and without control characters; the code. Silent where it is closed."""
    from pvfeas.output.words import cleaned, encodable
    from pvfeas.output.writing import silenced

    if sys.stderr is not None:
        try:
            with contextlib.suppress(BrokenPipeError):
                click.echo(encodable(cleaned(message), sys.stderr.encoding or "ascii"), err=True)
        except OSError:
            silenced(sys.stderr)
    return code


def _left(code: int) -> int:
    """The code, with what standard output still holds thrown away."""
    from pvfeas.output.writing import silenced

    silenced(sys.stdout)
    return code
