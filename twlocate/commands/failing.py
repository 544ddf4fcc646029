"""How a command ends: the exit status of each kind of error (README, "What the exit status says")."""

import contextlib
import sys
from collections.abc import Iterator

import click

from twlocate.errors import NoPosition, TwlocateError

EXIT_USAGE = 2
EXIT_NO_POSITION = 3


@contextlib.contextmanager
def failing_in_one_line() -> Iterator[None]:
    """Turn the program's own errors into lines on stderr and the exit status that goes with them."""
    try:
        yield
    except NoPosition as error:
        click.echo(f"no position: {error}", err=True)
        sys.exit(EXIT_NO_POSITION)
    except TwlocateError as error:
        click.echo(f"error: {error}", err=True)
        sys.exit(EXIT_USAGE)
