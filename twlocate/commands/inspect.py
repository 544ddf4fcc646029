"""``twlocate inspect``: what is in a recording."""

import sys
from pathlib import Path

import click

from twlocate.commands.failing import EXIT_USAGE, failing_in_one_line


@click.command()
@click.argument("files", nargs=-1, required=True, type=click.Path(path_type=Path))
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object instead of tables.")
@click.option("--figure", type=click.Path(path_type=Path), help="Draw all channels into this PNG, PDF or SVG file.")
def inspect(files: tuple[Path, ...], as_json: bool, figure: Path | None) -> None:
    """Show what the recordings FILES hold.

    For each: channels, rates, time axis, how far its clock may be trusted, and every repair made in reading it; for
    several, how they lie in time. A file that cannot be read is named on stderr, the others are shown all the same,
    and the exit status is 2.
    """
    from twlocate.errors import RecordError
    from twlocate.records import Record, read
    from twlocate.reporting.inspection import inspection_facts, inspection_json
    from twlocate.reporting.inspection_tables import print_inspection

    records: list[Record] = []
    faults: list[str] = []
    for path in files:
        try:
            records.append(read(path))
        except RecordError as error:
            faults.append(str(error))
    facts = inspection_facts(records, faults)
    if as_json:
        click.echo(inspection_json(facts))
    else:
        print_inspection(facts)
    if figure is not None and records:
        from twlocate.reporting.inspection_figure import write_inspection_figure

        with failing_in_one_line():
            write_inspection_figure(records, figure)
    for fault in faults:
        click.echo(f"error: {fault}", err=True)
    if faults:
        sys.exit(EXIT_USAGE)
