"""``python -m tcplan`` and the ``tcplan`` command: run the command line and return its exit code."""

from __future__ import annotations

import signal
import sys
from types import FrameType

from tcplan.cli.main import cli
from tcplan.errors import Stopped


def main() -> int:
    """Run the command line and return its exit code.

    Returns
    -------
    int
        0 the limit is met (or none was given), 1 answered but not met or not judged, 2 the input
        is wrong, 3 proved that no network of these materials can, 4 stopped early, 5 a fault of
        tcplan's own.
    """
    signal.signal(signal.SIGTERM, _stop)
    return int(cli.main(prog_name="tcplan", standalone_mode=False))


def _stop(number: int, frame: FrameType | None) -> None:
    raise Stopped(f"signal {number}")


if __name__ == "__main__":
    sys.exit(main())
