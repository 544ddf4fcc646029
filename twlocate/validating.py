"""How often the band holds the truth: events drawn from a scenario, recorded, located, and held against it.

Every event goes through the whole chain, from samples in a file to the band. What the scenario states with a ±
is drawn from it: lengths, speeds, delays and clocks by the simulator, the figures of the event here; the place is
drawn evenly over the route, the phase of sampling at random.
"""

import json
import tempfile
from collections.abc import Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import numpy as np

from twlocate.case import Case, load_case
from twlocate.errors import CaseError, TwlocateError
from twlocate.locating import Finding, locate
from twlocate.position import Piece
from twlocate.quantity import Quantity
from twlocate.simulation.running import simulate
from twlocate.simulation.scenario import Scenario
from twlocate.simulation.writing import write_simulated

SMALLEST_SHARE = 0.1
"""A drawn figure that must be above zero is at least this share of the stated one."""

POSITIVE = ("resistance", "opening", "outflow", "voltage")

LEAST_FROM_END = 0.01
"""Events closer to a section's end than this share of its length are not drawn."""


@dataclass(frozen=True)
class Trial:
    """One event: what was found against what was true."""

    number: int
    status: str
    reason: str
    section: str
    distance_m: float
    """Where the event truly was."""
    error_m: float | None
    """Along the section of the truth; None for a refusal, or where another section was named."""
    u_m: float | None
    held: bool
    """Whether the band holds the truth."""
    named: bool
    """Whether the band or that of any alternative does."""
    alternatives: int


@dataclass(frozen=True)
class Summary:
    """What the trials say together."""

    events: int
    located: int
    ambiguous: int
    refused: int
    coverage: float
    """What the bands were to hold."""
    held: int
    held_interval: tuple[float, float]
    """95 % interval of the share of bands that hold the truth (Clopper and Pearson 1934)."""
    wrong_place: int
    """Events of which no band named the truth."""
    error_median_m: float
    error_95_m: float
    u_median_m: float
    rms_error_over_u: float


def trials(
    scenario: Scenario,
    tables: dict[str, Any],
    numbers: Sequence[int],
    *,
    seed: int,
    coverage: float,
    jobs: int = 1,
) -> Iterator[Trial]:
    """Run the events `numbers`; each is drawn from its own number and the seed, whatever the order and the jobs."""
    work = [(scenario, tables, number, seed, coverage) for number in numbers]
    if jobs == 1:
        yield from map(_trial, work)
        return
    with ProcessPoolExecutor(jobs) as pool:
        yield from pool.map(_trial, work, chunksize=4)


def summarise(done: Sequence[Trial], coverage: float) -> Summary:
    """Return counts, quantiles and the binomial interval over trials, of which at least one gave a position.

    Raises
    ------
    TwlocateError
        None of them did.
    """
    placed = [trial for trial in done if trial.u_m is not None]
    if not placed:
        reasons = sorted({trial.reason for trial in done})
        raise TwlocateError(f"none of {len(done)} events gave a position: {reasons[0] if reasons else 'none was run'}")
    errors = np.array([np.inf if trial.error_m is None else abs(trial.error_m) for trial in placed])
    us = np.array([trial.u_m for trial in placed])
    near = np.isfinite(errors)
    held = sum(trial.held for trial in placed)
    return Summary(
        events=len(done),
        located=sum(trial.status == "located" for trial in done),
        ambiguous=sum(trial.status == "ambiguous" for trial in done),
        refused=len(done) - len(placed),
        coverage=coverage,
        held=held,
        held_interval=_binomial_interval(held, len(placed)),
        wrong_place=sum(not trial.named for trial in placed),
        error_median_m=float(np.median(errors)),
        error_95_m=float(np.quantile(errors, 0.95, method="higher")),
        u_median_m=float(np.median(us)),
        rms_error_over_u=float(np.sqrt(np.mean((errors[near] / us[near]) ** 2))),
    )


class Ledger:
    """Trials by number; those of a file are taken over from it and new ones are written down as they come.

    Parameters
    ----------
    path : Path or None
        The file; None keeps the trials in memory alone.
    head : dict
        What the trials depend on; a file with another head is of another validation.

    Raises
    ------
    CaseError
        The file belongs to another validation, is no such file, or cannot be written.
    """

    def __init__(self, path: Path | None, head: dict[str, Any]) -> None:
        self.done: dict[int, Trial] = {}
        self._path = path
        if path is None:
            return
        try:
            if path.exists():
                self._take_over(path, head)
            else:
                path.write_text(json.dumps(head) + "\n", encoding="utf-8")
        except (OSError, ValueError, TypeError, KeyError) as error:
            raise CaseError(f"{path}: no record of this validation to go on from ({error}); name another") from error

    def _take_over(self, path: Path, head: dict[str, Any]) -> None:
        first, *rows = path.read_text(encoding="utf-8").splitlines()
        if json.loads(first) != head:
            raise ValueError("it is of another scenario, seed, coverage or version")
        self.done = {trial.number: trial for trial in (Trial(**json.loads(row)) for row in rows)}

    def add(self, trial: Trial) -> None:
        """Keep a trial, and write it down where there is a file."""
        self.done[trial.number] = trial
        if self._path is not None:
            with self._path.open("a", encoding="utf-8") as file:
                file.write(json.dumps(asdict(trial)) + "\n")


def _binomial_interval(k: int, n: int) -> tuple[float, float]:
    from scipy.special import betaincinv

    low = 0.0 if k == 0 else float(betaincinv(k, n - k + 1, 0.025))
    high = 1.0 if k == n else float(betaincinv(k + 1, n - k, 0.975))
    return low, high


def _trial(work: tuple[Scenario, dict[str, Any], int, int, float]) -> Trial:
    """Draw, simulate, write, read and locate one event."""
    scenario, tables, number, seed, coverage = work
    rng = np.random.default_rng([seed, number])
    drawn = draw_event(scenario, rng=rng)
    section = drawn.section[drawn.event_section].name
    with tempfile.TemporaryDirectory() as folder:
        try:
            simulated = simulate(drawn, rng=rng)
            case = load_case(write_simulated(drawn, tables, simulated, Path(folder)))
            finding = locate(case, coverage=coverage)
        except TwlocateError as error:
            return Trial(number, "error", str(error), section, drawn.event.distance.value, None, None, False, False, 0)
    return _judged(number, case, finding, section, drawn.event.distance.value)


def draw_event(scenario: Scenario, *, rng: np.random.Generator) -> Scenario:
    """Return the scenario with another event: a place even over the route, and figures drawn from their ±."""
    lengths = np.array([section.length.value for section in scenario.section])
    index = int(rng.choice(lengths.size, p=lengths / lengths.sum()))
    share = rng.uniform(LEAST_FROM_END, 1 - LEAST_FROM_END)
    event = scenario.event
    figures = {name: getattr(event, name) for name in type(event).model_fields}
    changes: dict[str, object] = {
        name: _drawn(name, value, rng) for name, value in figures.items() if isinstance(value, Quantity) and value.u > 0
    }
    changes |= {
        "section": scenario.section[index].name,
        "distance": Quantity(float(share * lengths[index])),
        "onset": Quantity(event.onset.value + rng.uniform() / scenario.recorder.rate.value),
    }
    return scenario.model_copy(update={"event": event.model_copy(update=changes)})


def _drawn(name: str, stated: Quantity, rng: np.random.Generator) -> Quantity:
    value = float(rng.normal(stated.value, stated.u))
    return Quantity(max(value, SMALLEST_SHARE * stated.value) if name in POSITIVE else value)


def _judged(number: int, case: Case, finding: Finding, section: str, distance_m: float) -> Trial:
    names = [row.name for row in case.route.sections]
    index, found = names.index(section), finding.estimate
    if found is None:
        return Trial(number, finding.status, finding.reason, section, distance_m, None, None, False, False, 0)

    def holds(pieces: Sequence[Piece]) -> bool:
        return any(p.section == index and p.from_m <= distance_m <= p.to_m for p in pieces)

    same = found.point.section == index
    return Trial(
        number=number,
        status=finding.status,
        reason="",
        section=section,
        distance_m=distance_m,
        error_m=found.point.distance_m - distance_m if same else None,
        u_m=found.point.u_m,
        held=holds(found.band),
        named=holds(found.band) or any(holds(row.band) for row in found.alternatives),
        alternatives=len(found.alternatives),
    )
