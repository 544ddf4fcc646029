"""``twlocate locate``: a place with an honest band from recordings."""

import json
import sys
from pathlib import Path

import click

from twlocate.commands.failing import EXIT_NO_POSITION, failing_in_one_line


@click.command()
@click.argument("case", type=click.Path(path_type=Path))
@click.option("--json", "as_json", is_flag=True, help="Print the finding as JSON on stdout, and nothing else there.")
@click.option("--out", type=click.Path(path_type=Path), help="Write the finding and its figures to this new folder.")
@click.option(
    "--coverage",
    type=click.FloatRange(0.5, 0.999),
    default=0.95,
    show_default=True,
    help="Probability that the band is to hold.",
)
def locate(case: Path, as_json: bool, out: Path | None, coverage: float) -> None:
    """Locate the event described by the case file CASE.

    Exit status: 0 a position, 3 no position (the reason is printed), 2 a wrong case, recording or option.
    """
    from twlocate.case import load_case
    from twlocate.locating import locate as find
    from twlocate.reporting.document import finding_document

    with failing_in_one_line():
        finding = find(load_case(case), coverage=coverage)
        document = json.dumps(finding_document(finding), indent=2, ensure_ascii=False, allow_nan=False)
        if out is not None and finding.estimate is not None:
            from twlocate.reporting.folder import write_folder

            write_folder(finding, document, out)
    if as_json:
        click.echo(document)
    else:
        from twlocate.reporting.text import print_finding

        print_finding(finding)
    if finding.estimate is None:
        click.echo(f"no position: {finding.reason}", err=True)
        sys.exit(EXIT_NO_POSITION)
