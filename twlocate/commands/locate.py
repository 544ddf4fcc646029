"""``twlocate locate``: a place with an honest band from recordings."""

from pathlib import Path

import click


@click.command()
@click.argument("case", type=click.Path(path_type=Path))
def locate(case: Path) -> None:
    """Locate the event described by the case file CASE."""
    raise NotImplementedError(case)
