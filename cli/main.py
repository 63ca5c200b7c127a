"""Entry point of `upstroke`: commands are named here and loaded only when they run."""

from __future__ import annotations

import gc
import os
import sys
from collections.abc import Sequence
from dataclasses import dataclass
from importlib import import_module
from typing import Annotated, Any, NoReturn

import typer
from typer.core import TyperGroup

from cli import __version__
from cli.terminal import complain
from isotherm.errors import UpstrokeError

__all__ = ["COMMANDS", "app", "main", "run"]

INTERRUPTED = 130  # what a shell reports for a program ended by Ctrl-C (128 + SIGINT)
# objects made before Python looks for garbage among them; 700 if left alone
COLLECT_AFTER = 50_000


@dataclass(frozen=True)
class Entry:
    """One command: the section of the help it stands in, its module, and its one-line summary."""

    section: str
    module: str
    summary: str


# The summaries are written here so that `upstroke --help` imports no command; a test compares them
# with the first line of each command's own help.
COMMANDS: dict[str, Entry] = {}


def _register(section: str, **summaries: str) -> None:
    for name, summary in summaries.items():
        COMMANDS[name] = Entry(section, f"cli.{name}", summary)


_register(
    "A film on water",
    sheet="Write a commented run sheet to fill in.",
    check="Clean surface, steady probe, true barriers, before a film.",
    isotherm="Areas, phases, transitions, collapse and modulus of a compression.",
    hold="Film stability: loss over time, and by which law.",
    cycles="Work, hysteresis and area shift from cycle to cycle.",
    fluid="Co-area and cohesion of the fluid branch, gaseous limit.",
    oscillation="Storage and loss modulus per frequency, linearity.",
    potential="Effective dipole moment against area, onset of potential.",
)
_register(
    "A film on a substrate",
    target="Dipping pressure, what binds it, and the film budget.",
    transfer="Transfer ratio of every stroke, deposition type, layers.",
    audit="The build against its design: accepted or rejected, and why.",
)
_register(
    "Series of runs",
    batch="One row a run for folders of isotherms.",
    replicates="Mean curve, spread of every feature, outlying runs.",
    mixture="Excess area and Gibbs energy of mixtures, miscibility.",
    temperature="Slope and heat of the transition, critical point, trends.",
)
_register(
    "All of it",
    report="One page for a sample: its checks, isotherms, holds, target and build.",
)


class LazyGroup(TyperGroup):
    """A group of commands that imports a command's module only when that command runs."""

    def list_commands(self, ctx: Any) -> list[str]:
        """Return the names in the order of the help."""
        return list(COMMANDS)

    def get_command(self, ctx: Any, cmd_name: str) -> Any:
        """Import and build one command; None where there is none of that name."""
        entry = COMMANDS.get(cmd_name)
        if entry is None:
            return None
        if cmd_name not in self.commands:
            command: Any = typer.main.get_command(import_module(entry.module).app)
            command.name = cmd_name
            self.commands[cmd_name] = command
        return self.commands[cmd_name]

    def resolve_command(self, ctx: Any, args: list[str]) -> Any:
        """Find the command of `args`; a misspelt one is answered with the nearest names."""
        if not ctx.resilient_parsing and args and args[0] not in COMMANDS and args[0][:1] != "-":
            from difflib import get_close_matches

            near = get_close_matches(args[0], COMMANDS, n=2)
            hint = f"did you mean {' or '.join(near)}?" if near else "see upstroke --help"
            ctx.fail(f"there is no command '{args[0]}'; {hint}")
        return super().resolve_command(ctx, args)

    def invoke(self, ctx: Any) -> Any:
        """Run the command; Ctrl-C ends it with one line."""
        try:
            return super().invoke(ctx)
        except KeyboardInterrupt:
            complain("interrupted")
            raise typer.Exit(INTERRUPTED) from None

    def format_commands(self, ctx: Any, formatter: Any) -> None:
        """List the commands, section by section, from the table above."""
        for section in dict.fromkeys(entry.section for entry in COMMANDS.values()):
            with formatter.section(section):
                formatter.write_dl(
                    [(n, e.summary) for n, e in COMMANDS.items() if e.section == section]
                )


app = typer.Typer(
    cls=LazyGroup,
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    # plain help: it needs no further library, keeps to the terminal's width and has no colours
    rich_markup_mode=None,
    context_settings={"help_option_names": ["--help", "-h"]},
)


def _show_version(wanted: bool) -> None:
    if wanted:
        typer.echo(f"upstroke {__version__}")
        raise typer.Exit


@app.callback()
def root(
    version: Annotated[
        bool,
        typer.Option("--version", callback=_show_version, is_eager=True, help="Print the version."),
    ] = False,
) -> None:
    """From trough exports to defensible numbers for Langmuir and Langmuir-Blodgett films.

    \b
    Example:
      upstroke isotherm run.txt --sheet run.toml --figure run.svg
    """


def _quiet_stdout() -> None:
    """Point standard output at nothing, so that closing it cannot fail a second time."""
    try:
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, sys.stdout.fileno())
        os.close(nowhere)
    except (OSError, ValueError):
        return


def _fault(error: Exception) -> str:
    return (
        f"stopped by an unexpected {type(error).__name__} ({error}); this is a fault in upstroke, "
        "not in your data: set UPSTROKE_DEBUG=1 to see where, and report it with that output"
    )


def _dispatch(argv: Sequence[str] | None) -> int:
    """Run one command and return its exit status; only faults under UPSTROKE_DEBUG get out."""
    try:
        typer.main.get_command(app).main(
            args=None if argv is None else list(argv), prog_name="upstroke"
        )
    except SystemExit as stop:
        return stop.code if isinstance(stop.code, int) else int(stop.code is not None)
    except UpstrokeError as error:
        complain(str(error))
    except BrokenPipeError:
        _quiet_stdout()
    except MemoryError:
        complain("not enough memory for this input; split it, or run it where there is more")
    except RecursionError as error:
        complain(_fault(error))
    except Exception as error:
        if os.environ.get("UPSTROKE_DEBUG"):
            raise
        complain(_fault(error))
    return 1


def run(argv: Sequence[str] | None = None) -> int:
    """Run the command line and return the exit status.

    Parameters
    ----------
    argv : sequence of str, optional
        Arguments after the program's name; those of the process where left out.

    Returns
    -------
    int
        0 done; 1 the input or the analysis failed; 2 wrong usage; 3 the audited build is rejected;
        130 interrupted.
    """
    try:
        status = _dispatch(argv)
    except KeyboardInterrupt:
        complain("interrupted")
        return INTERRUPTED
    try:
        sys.stdout.flush()
    except BrokenPipeError:
        _quiet_stdout()
        return status or 1
    except OSError as error:
        _quiet_stdout()
        complain(f"cannot write to standard output: {error.strerror}")
        return status or 1
    return status


def main() -> NoReturn:
    """Run `upstroke` as a program."""
    for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
        # the matrices are small, and one thread adds numbers up in one order: the same bytes out
        os.environ[name] = "1"
    if not sys.warnoptions and not os.environ.get("UPSTROKE_DEBUG"):
        # what a user must know is a warning in the result; those of the libraries are for developers
        import warnings

        warnings.simplefilter("ignore")
    # most of a short run is imports, which make many objects and no garbage: looking for it among them,
    # at every few hundred objects and again at the end, takes a tenth of the time
    gc.set_threshold(COLLECT_AFTER)
    status = run()
    gc.freeze()
    sys.exit(status)


if __name__ == "__main__":
    main()
