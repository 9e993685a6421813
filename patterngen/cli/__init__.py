"""The command line: arguments, printing, exit codes; no physics."""

from __future__ import annotations

import contextlib
import os
import signal
import sys
from dataclasses import asdict
from types import FrameType
from typing import Any, NoReturn

import click

from patterngen import __version__
from patterngen.errors import Fault, InputError, MachineError, PatterngenError
from patterngen.registry import load, names


class _Commands(click.Group):
    """Commands are the modules of this folder, imported when called or when their help is shown."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(names("patterngen.cli"))

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in names("patterngen.cli"):
            return None
        command: click.Command = load("patterngen.cli", cmd_name).command
        return command

    def resolve_command(self, ctx: click.Context, args: list[str]) -> Any:
        from difflib import get_close_matches

        if args and args[0] not in names("patterngen.cli") and not args[0].startswith("-"):
            near = get_close_matches(args[0], names("patterngen.cli"), n=1, cutoff=0.3)
            hint = f" Nearest: {near[0]}." if near else ""
            ctx.fail(f"there is no command {args[0]!r}; there are {', '.join(names('patterngen.cli'))}.{hint}")
        return super().resolve_command(ctx, args)


@click.group(
    cls=_Commands,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    epilog="Exit codes: 0 every rule passed or only warned; 1 a rule failed; 2 the input or the call is "
    "wrong, nothing is written; 3 the machine failed (disk full, no permission).",
)
@click.version_option(__version__, prog_name="patterngen")
def commands() -> None:
    """Prove a set of print screens before plates are made, and draw it.

    A preset (a TOML file) says which inks print which screens on what sheet. `patterngen verify`
    computes every beat that the screens make together and how visible it is; `patterngen build`
    does the same and writes exact vector separations. Start with `patterngen presets`, then
    `patterngen new carton > mine.toml`.
    """


def run() -> NoReturn:
    """Run the command line and exit with the contract's codes; a traceback is never what a user sees."""
    signal.signal(signal.SIGTERM, _leave)
    try:
        code = commands.main(prog_name="patterngen", standalone_mode=False)
        if sys.stdout is not None:
            sys.stdout.flush()
    except click.ClickException as error:
        _say(f"patterngen: {error.format_message()}")
        _tell_json({"faults": [asdict(Fault("call", "", error.format_message()))]})
        code = 2
    except click.exceptions.Exit as stop:
        code = stop.exit_code
    except (click.Abort, KeyboardInterrupt):
        _say("patterngen: stopped; nothing half-written is left")
        code = 3
    except PatterngenError as error:
        for line in str(error).splitlines():
            _say(line)
        if isinstance(error, InputError):
            _tell_json({"faults": [asdict(fault) for fault in error.faults]})
        else:
            _tell_json({"machine": str(error)})
        code = error.exit_code
    except (BrokenPipeError, SystemExit):
        # The reader of our output has gone (click turns that into an exit of its own); what is
        # left to print has no address, and that is no verdict.
        _mute_standard_output()
        code = 0
    except MemoryError:
        _say("patterngen: out of memory; nothing was written under a final name")
        code = 3
    except OSError as error:
        _say(f"patterngen: {error.filename or 'output'}: {error.strerror or error}")
        _mute_standard_output()
        code = 3
    except Exception as error:
        if os.environ.get("PATTERNGEN_TRACEBACK"):
            raise
        _say(
            f"patterngen: this is a fault of the program, not of your input: {type(error).__name__}: {error}. "
            "Nothing half-written is left. Set PATTERNGEN_TRACEBACK=1 to see where, and report it with the preset."
        )
        code = 3
    sys.exit(code if isinstance(code, int) else 0)


def _say(line: str) -> None:
    # where standard error itself is closed, the exit code is all that can still be told
    with contextlib.suppress(OSError, ValueError):
        if sys.stderr is not None:
            encoding = sys.stderr.encoding or "ascii"
            print(line.encode(encoding, "backslashreplace").decode(encoding), file=sys.stderr)


def _tell_json(data: object) -> None:
    """What went wrong, for a script that asked for JSON."""
    if "--json" in sys.argv:
        from patterngen.cli._options import print_json

        with contextlib.suppress(OSError, ValueError, MachineError):
            print_json(data)


def _mute_standard_output() -> None:
    with contextlib.suppress(OSError, ValueError, AttributeError):
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def _leave(signum: int, frame: FrameType | None) -> None:
    raise MachineError(f"patterngen: stopped by signal {signum}; nothing half-written is left")
