"""``twlocate simulate``: recordings of an event whose truth is known."""

from pathlib import Path

import click

from twlocate.commands.failing import failing_in_one_line


@click.command()
@click.argument("scenario", type=click.Path(path_type=Path))
@click.option("--out", required=True, type=click.Path(path_type=Path), help="New folder for what is written.")
@click.option("--seed", type=click.IntRange(0), default=0, show_default=True, help="Of all random draws.")
def simulate(scenario: Path, out: Path, seed: int) -> None:
    """Simulate SCENARIO and write recordings, truth.json and a ready case.toml to a new folder.

    SCENARIO is a case file with an [event] and a [recorder] table, and an [[end]] table for what hangs on a node.
    Lengths, speeds, delays and clock offsets are drawn from their stated uncertainties. What a pipe carries is taken at
    rest, so flow_speed is refused.
    """
    import tomllib

    import numpy as np

    from twlocate.case import load_case
    from twlocate.folders import new_folder
    from twlocate.simulation.running import simulate as run
    from twlocate.simulation.scenario import load_scenario
    from twlocate.simulation.writing import write_simulated

    with failing_in_one_line():
        checked = load_scenario(scenario)
        simulated = run(checked, rng=np.random.default_rng(seed))
        tables = tomllib.loads(scenario.read_text(encoding="utf-8"))
        with new_folder(out) as folder:
            load_case(write_simulated(checked, tables, simulated, folder))
    click.echo(out / "case.toml")
