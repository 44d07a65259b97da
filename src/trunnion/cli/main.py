"""`trunnion`: one group of commands, each in a module of its own that is loaded when it is asked for."""

from __future__ import annotations

import importlib
import sys
from dataclasses import dataclass

import click

from trunnion import __version__
from trunnion.cli.exits import ExitCode
from trunnion.errors import FaultsError, TrunnionError


@dataclass(frozen=True)
class Entry:
    """A command's line in the help: its name, what it does, and the group of people's doings it belongs to.

    The command itself is `command` in `trunnion.cli.<module>`.
    """

    name: str
    summary: str
    group: str
    module: str = ""


WORK, DATA, CHANGE, HAND_OVER, RECORD = "Work", "Data", "Change", "Hand over", "Record"
COMMANDS = (
    Entry("start", "Write a new workbook that computes as it stands.", WORK),
    Entry("readback", "Say the spec back in plain sentences; nothing is run.", WORK),
    Entry("compute", "Run what is out of date, judge it, bind the package.", WORK),
    Entry("templates", "List the templates: what each takes and records.", WORK),
    Entry("inspect", "Say what attitude data a file holds.", DATA),
    Entry("identify", "Find which convention a file's numbers are in.", DATA),
    Entry("convert", "State a log in another convention, margins along the way.", DATA),
    Entry("schema", "Print the JSON Schema of workbook.yaml.", WORK),
    Entry("impact", "Say what a change touches and why; nothing is run.", CHANGE),
    Entry("compare", "Compare two revisions or folders, verdict flips first.", CHANGE),
    Entry("revise", "Open the next revision.", CHANGE),
    Entry("bench", "Print a mount's bench check sheet, or judge the readings filled in.", HAND_OVER),
    Entry("handover", "Hand a convention over with reference attitudes and source code.", HAND_OVER),
    Entry("bind", "Bind the package again from stored results.", HAND_OVER),
    Entry("finding", "Add, answer, close and list findings.", RECORD),
    Entry("sign", "Sign as prepared, checked or approved.", RECORD),
    Entry("status", "Who has signed what, what has fallen, what is missing.", RECORD),
    Entry("issue", "Freeze the revision, once it is signed.", RECORD),
    Entry("archive", "Write the archive of an issued revision.", RECORD),
    Entry("audit", "Check an archive: whole, signed, by the rules.", RECORD),
    Entry("recompute", "Run recorded calculations again and compare.", RECORD),
    Entry("find", "Search many archives.", RECORD),
    Entry("withdraw", "Sign a notice that a revision must not be used.", RECORD),
)


class _Commands(click.Group):
    """A group that knows its commands' summaries without loading them."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Names in the order of the help."""
        return [entry.name for entry in COMMANDS]

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Load a command's module."""
        entry = next((entry for entry in COMMANDS if entry.name == cmd_name), None)
        if entry is None:
            return None
        module = importlib.import_module(f"trunnion.cli.{entry.module or entry.name}")
        return module.command

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        """Name the nearest command for a misspelt one."""
        try:
            return super().resolve_command(ctx, args)
        except click.UsageError as err:
            import difflib

            near = difflib.get_close_matches(args[0], [entry.name for entry in COMMANDS], n=1)
            hint = f"Did you mean '{near[0]}'?" if near else "`trunnion --help` lists them."
            raise click.UsageError(f"There is no command '{args[0]}'. {hint}", ctx) from err

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """One section for each thing people do."""
        for group in (WORK, DATA, CHANGE, HAND_OVER, RECORD):
            rows = [(entry.name, entry.summary) for entry in COMMANDS if entry.group == group]
            if rows:
                with formatter.section(group):
                    formatter.write_dl(rows)


@click.group(cls=_Commands, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="trunnion", message="%(prog)s %(version)s")
def group() -> None:
    """Calculation notebooks and packages for vehicle and instrument attitude.

    A workbook is a folder with one workbook.yaml. `trunnion COMMAND --help` says more about each command.
    Exit codes: 0 met, 1 not met or not shown, 2 could not be done.
    """


def run(arguments: list[str] | None = None) -> None:
    """The program: runs one command and exits with its code."""
    sys.exit(int(outcome(arguments)))


def outcome(arguments: list[str] | None = None) -> ExitCode:
    """Run one command; every error meant for people becomes text on stderr and a code."""
    try:
        code = group.main(arguments, prog_name="trunnion", standalone_mode=False)
    except TrunnionError as err:
        click.echo(error_text(err), err=True)
        return ExitCode.FAILED
    except click.ClickException as err:
        err.show()
        return ExitCode.FAILED
    except (KeyboardInterrupt, click.Abort):
        click.echo("Stopped. Finished calculations are kept; nothing half-written was left.", err=True)
        return ExitCode.INTERRUPTED
    except SystemExit:  # click ends so when the reader of a pipe has gone; never a verdict
        return ExitCode.FAILED
    except BrokenPipeError:
        sys.stderr.close()
        return ExitCode.FAILED
    except Exception:
        import traceback

        traceback.print_exc()
        click.echo(
            "This is a defect of Trunnion, not of your workbook; please report it with the lines above.", err=True
        )
        return ExitCode.FAILED
    return ExitCode(code) if isinstance(code, int) else ExitCode.OK


_SHOWN_FAULTS = 12


def error_text(err: TrunnionError) -> str:
    """An error for the screen: each fault with its place, cause and remedy, at most a screenful."""
    if not isinstance(err, FaultsError):
        return str(err)
    lines = [str(fault) for fault in err.faults[:_SHOWN_FAULTS]]
    left = len(err.faults) - _SHOWN_FAULTS
    if left > 0:
        lines.append(f"… and {left} more")
    return "\n".join(lines)
