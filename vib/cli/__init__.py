"""The command line: parse, call, print. It holds no engineering.

Rooms: ``app`` (the commands and their options), ``jobs`` (what each command does), ``delivery`` (streams,
files, exit status), ``starts`` (the impact options of ``ring``). Nothing heavy is imported until a command
runs, so that help and completion answer at once.

Exit status: 0 done; 1 done, and a mode lies inside a band or the system is unstable; 2 the input is wrong or
the work could not be done; 130 interrupted.
"""

from __future__ import annotations

import gc
import sys
from collections.abc import Sequence

from vib.cli.delivery import DONE, INTERRUPTED, explain, go_quiet_on_broken_pipe

__all__ = ["run"]


def run(arguments: Sequence[str] | None = None) -> int:
    """Run one command; the exit status. ``arguments`` default to those of the process."""
    # a command makes many objects and hardly a cycle: collecting less often saves a tenth of its time
    gc.set_threshold(100_000, 50, 50)
    try:
        from typer.main import get_command

        from vib.cli.app import app

        given = list(sys.argv[1:] if arguments is None else arguments) or ["--help"]
        status = get_command(app).main(given, prog_name="vib", standalone_mode=False)
        if status == INTERRUPTED:  # the parser caught it and said nothing
            return explain("interrupted", INTERRUPTED)
        return status if isinstance(status, int) else DONE
    except KeyboardInterrupt:
        return explain("interrupted", INTERRUPTED)
    except BrokenPipeError:
        go_quiet_on_broken_pipe()
        return DONE
    except Exception as error:
        if type(error).__name__ == "Abort":  # the parser's word for an interrupt, wherever its class lives
            return explain("interrupted", INTERRUPTED)
        return explain(error)
