"""The command `thalweg`: which words it knows, and what becomes of errors. Heavy libraries are loaded by the command that needs them."""

from __future__ import annotations

import importlib
import os
import sys
from pathlib import Path

import click

from thalweg import __version__
from thalweg.errors import StudyError
from thalweg_app.compiled import keep_compiled
from thalweg_app.threads import cap_threads

BAD_INPUT, DEFECT, INTERRUPTED = 2, 3, 130

#: Command -> its module, its function, and its line in the list of commands (so that the list loads none of them).
COMMANDS = {
    "solve": ("thalweg_app.terminal.solve", "solve", "Find the lowest energy of a trial state and judge it against the exact one."),
    "scan": ("thalweg_app.terminal.scan", "scan", "Run a study along a bond, an angle or a setting, and state what the curve yields."),
    "inspect": ("thalweg_app.terminal.inspection", "inspect", "State qubits, terms, sector and memory of a study without running it."),
    "check": ("thalweg_app.terminal.check", "check", "Repeat every run and scan of a session and state the deviation."),
    "diagnose": ("thalweg_app.terminal.diagnose", "diagnose", "Say why a search fails: vanishing gradients, the landscape, the found point."),
    "methods": ("thalweg_app.terminal.methods", "methods", "List every key that a study can be made of, with one line each."),
    "samples": ("thalweg_app.terminal.samples", "samples", "List the samples that ship with the program."),
    "open": ("thalweg_app.terminal.window", "open_file", "Open a session or a system in the window."),
}


class Words(click.Group):
    """Loads a command's module when the command is asked for, and not before."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in COMMANDS:
            return None
        module, function, _ = COMMANDS[cmd_name]
        command: click.Command = getattr(importlib.import_module(module), function)
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl([(name, line) for name, (_, _, line) in COMMANDS.items()])


@click.group(cls=Words, invoke_without_command=True, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 120})
@click.version_option(__version__, prog_name="Thalweg", message="%(prog)s %(version)s")
@click.pass_context
def thalweg(ctx: click.Context) -> int:
    """Ground-state energy studies of small molecules and spin models with variational quantum circuits.

    Without a command the window opens. Exit status: 0 done, 1 past tolerance (check), 2 bad input, 3 a defect of the program,
    130 stopped by Ctrl-C. Loops take at most four threads and dense algebra one; OMP_NUM_THREADS, OPENBLAS_NUM_THREADS and
    the like are obeyed.
    """
    if ctx.invoked_subcommand is not None:
        return 0
    from thalweg_app.terminal.window import show_window

    return show_window([])


def main(arguments: list[str] | None = None) -> int:
    """Runs the command line and returns the exit status."""
    cap_threads()
    keep_compiled()
    try:
        status = thalweg.main(args=arguments, prog_name="thalweg", standalone_mode=False)
        sys.stdout.flush()
        return int(status or 0)
    except StudyError as error:
        return _say(str(error), BAD_INPUT)
    except click.ClickException as error:
        return _say(f"{error.format_message()} See `{_help_line(error)}`.", BAD_INPUT)
    except (click.Abort, KeyboardInterrupt):
        return _say("Stopped before anything was computed.", INTERRUPTED)
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), 1)  # whoever read the output has gone; the last flush must not fail again
        return INTERRUPTED
    except MemoryError:
        fix = "Choose a smaller basis or active space, or lower memory_gib to be told beforehand"
        return _say(str(StudyError("Not enough memory", "the system refused the memory that this study needs", fix)), BAD_INPUT)
    except Exception as error:
        return _say(f"Thalweg failed by a defect of its own ({type(error).__name__}); the details are in {_logged(error)}.", DEFECT)


def _say(text: str, status: int) -> int:
    print(" ".join(text.split()), file=sys.stderr)
    return status


def _help_line(error: click.ClickException) -> str:
    context = getattr(error, "ctx", None)
    return f"{context.command_path if context else 'thalweg'} --help"


def _logged(error: Exception) -> Path:
    from thalweg_app.user_folders import log_defect

    return log_defect(error)
