"""``twlocate validate``: does the band mean what it says, for events like those of a scenario."""

from pathlib import Path
from typing import TYPE_CHECKING

import click

from twlocate.commands.failing import failing_in_one_line

if TYPE_CHECKING:
    from twlocate.validating import Trial


@click.command()
@click.argument("scenario", type=click.Path(path_type=Path))
@click.option("--events", type=click.IntRange(1), default=200, show_default=True, help="How many events to draw.")
@click.option("--seed", type=click.IntRange(0), default=0, show_default=True, help="Of all random draws.")
@click.option("--jobs", type=click.IntRange(1), default=1, show_default=True, help="Processes to run them on.")
@click.option("--coverage", type=click.FloatRange(0.5, 0.999), default=0.95, show_default=True)
@click.option("--record", type=click.Path(path_type=Path), help="Write each event here, and go on from what is there.")
@click.option("--figure", type=click.Path(path_type=Path), help="Draw the outcome into this PNG, PDF or SVG file.")
@click.option("--json", "as_json", is_flag=True, help="Print the summary as JSON.")
def validate(
    scenario: Path,
    events: int,
    seed: int,
    jobs: int,
    coverage: float,
    record: Path | None,
    figure: Path | None,
    as_json: bool,
) -> None:
    """Draw events like that of SCENARIO, locate each from its simulated recordings, and hold it against the truth."""
    import json
    from dataclasses import asdict

    from twlocate.reporting.validation import summary_rows, validation_figure
    from twlocate.validating import summarise

    with failing_in_one_line():
        done = _run(scenario, events, seed, jobs, coverage, record)
        summary = summarise(done, coverage)
        if figure is not None:
            validation_figure(done, scenario.stem).savefig(figure, dpi=110)
    if as_json:
        click.echo(json.dumps(asdict(summary), indent=2))
        return
    width = max(len(name) for name, _ in summary_rows(summary))
    for name, value in summary_rows(summary):
        click.echo(f"{name:<{width}}  {value}")


def _run(scenario: Path, events: int, seed: int, jobs: int, coverage: float, record: Path | None) -> "list[Trial]":
    """Run what the record does not hold yet, with a progress bar on stderr."""
    import hashlib
    import sys
    import tomllib

    from twlocate import __version__
    from twlocate.simulation.scenario import load_scenario
    from twlocate.validating import Ledger, trials

    checked = load_scenario(scenario)
    text = scenario.read_text(encoding="utf-8")
    digest = hashlib.sha256(text.encode()).hexdigest()
    ledger = Ledger(record, {"scenario": digest, "seed": seed, "coverage": coverage, "version": __version__})
    left = [number for number in range(events) if number not in ledger.done]
    stream = trials(checked, tomllib.loads(text), left, seed=seed, coverage=coverage, jobs=jobs)
    with click.progressbar(stream, length=len(left), label="events", file=sys.stderr) as running:
        for trial in running:
            ledger.add(trial)
    return [ledger.done[number] for number in range(events)]
