"""``twlocate inspect``: what is in a recording."""

from pathlib import Path

import click


@click.command()
@click.argument("files", nargs=-1, required=True, type=click.Path(path_type=Path))
def inspect(files: tuple[Path, ...]) -> None:
    """Show what the recordings FILES hold."""
    raise NotImplementedError(files)
