"""The `designer` command as a process: `designer`, and `python -m designer`."""

from __future__ import annotations

import contextlib
import os
import signal
import sys

INTERRUPTED = 3
"""The exit code of an undecided question."""


def main() -> None:
    """Run the command line and end the process with its exit code, whatever happens.

    Ctrl-C may come while modules are still being loaded, or when the work is done already.
    The process ends without Python's own closing: that may take long where an engine was left
    behind, and a Ctrl-C in it would replace the exit code by a signal.
    """
    code: object = INTERRUPTED
    # numpy's linear algebra, unused here, would start a thread for each core: 50 ms
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    try:
        from designer.cli import main as run

        run()
    except SystemExit as stop:
        code = stop.code
    except KeyboardInterrupt as error:
        signal.signal(signal.SIGINT, signal.SIG_IGN)
        code = _interrupted(error)
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    for stream in (sys.stdout, sys.stderr):
        with contextlib.suppress(OSError, ValueError, AttributeError):
            stream.flush()
    os._exit(code if isinstance(code, int) else 0)


def _interrupted(error: KeyboardInterrupt) -> int:
    from designer.cli.output import stop_for

    return stop_for(error, "--json" in sys.argv)


if __name__ == "__main__":
    main()
