"""Exit codes, and what is said on stderr before one of them."""

from __future__ import annotations

import os
from collections.abc import Callable

import click

from tcplan.cli.talk import complain
from tcplan.errors import InputError, NoAnswer, Stopped

DONE, NOT_MET, WRONG_INPUT, CANNOT_BE_MET, STOPPED, OWN_FAULT = range(6)
TRACEBACK = "TCPLAN_TRACEBACK"


def exit_code(run: Callable[[], object]) -> int:
    """Run a command and return its exit code, with every error told on stderr.

    Parameters
    ----------
    run : callable
        Returns an exit code, or None for 0.
    """
    try:
        code = run()
        return code if isinstance(code, int) else DONE
    except click.ClickException as error:
        return _wrong_use(error)
    except InputError as error:
        return _wrong_input(error)
    except NoAnswer as error:
        complain(f"no answer: {error}")
        return CANNOT_BE_MET
    except (Stopped, KeyboardInterrupt, click.Abort) as error:
        complain(f"stopped early{f': {error}' if str(error) else ''}")
        return STOPPED
    except Exception as error:
        if os.environ.get(TRACEBACK):
            raise
        return _own_fault(error)


def _wrong_use(error: click.ClickException) -> int:
    if isinstance(error, click.exceptions.NoArgsIsHelpError):
        click.echo(error.format_message(), err=True)
        return WRONG_INPUT
    context = getattr(error, "ctx", None)
    command = context.command_path if context is not None else "tcplan"
    complain(f"error: command line: {error.format_message()} See: {command} --help")
    return WRONG_INPUT


def _wrong_input(error: InputError) -> int:
    for problem in error.problems:
        complain(f"error: {problem}")
    if len(error.problems) > 1:
        complain(f"{len(error.problems)} mistakes.")
    return WRONG_INPUT


def _own_fault(error: Exception) -> int:
    complain(
        f"error: a fault of tcplan itself ({type(error).__name__}: {error}). Please report it, with the "
        f"input and the output of tcplan --version; {TRACEBACK}=1 shows where it happened."
    )
    return OWN_FAULT
