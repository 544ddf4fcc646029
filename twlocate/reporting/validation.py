"""The outcome of a validation as a table and as a figure."""

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from twlocate.scales import length_text
from twlocate.validating import Summary, Trial

if TYPE_CHECKING:
    from matplotlib.figure import Figure

ERROR_COLOUR = "#1a3a5c"
NORMAL_COLOUR = "#c05000"


def summary_rows(summary: Summary) -> list[tuple[str, str]]:
    """Return the summary as (what, how much) for people."""
    placed = summary.events - summary.refused
    low, high = summary.held_interval
    kinds = f"{summary.located} located, {summary.ambiguous} ambiguous, {summary.refused} refused"
    distances = f"median {length_text(summary.error_median_m)}, 95 % below {length_text(summary.error_95_m)}"
    held = f"{summary.held} of {placed}, {summary.held / placed:.1%} (95 % interval {low:.1%} to {high:.1%})"
    return [
        ("events", f"{summary.events}: {kinds}"),
        ("distance from the truth", distances),
        ("stated standard uncertainty", f"median {length_text(summary.u_median_m)}"),
        ("distance over stated uncertainty", f"{summary.rms_error_over_u:.2f} root mean square; 1 would be as stated"),
        (f"{summary.coverage:.0%} bands that hold the truth", held),
        (
            "truth in no band of any alternative",
            f"{summary.wrong_place} of {placed}, {summary.wrong_place / placed:.1%}",
        ),
    ]


def validation_figure(done: Sequence[Trial], title: str) -> "Figure":
    """Draw how the distances are distributed, and whether they are as large as was stated."""
    from matplotlib.figure import Figure

    placed = [trial for trial in done if trial.error_m is not None and trial.u_m]
    errors = np.array([trial.error_m or 0.0 for trial in placed])
    over_u = errors / np.array([trial.u_m for trial in placed])
    figure = Figure(figsize=(10, 4.2), layout="constrained")
    figure.suptitle(title)
    left, right = figure.subplots(1, 2)
    shares = np.arange(1, errors.size + 1) / len([trial for trial in done if trial.u_m])
    left.step(np.sort(np.abs(errors)), shares, color=ERROR_COLOUR, where="post")
    left.axhline(0.95, color="0.6", linestyle=":", linewidth=1)
    left.set_xlabel("distance from the truth, m")
    left.set_ylabel("share of the positions")
    left.set_xscale("log")
    left.set_ylim(0, 1.02)
    edges = np.linspace(-5, 5, 41)
    right.hist(np.clip(over_u, -5, 5), edges, density=True, color=ERROR_COLOUR, alpha=0.7, label="found")
    z = np.linspace(-5, 5, 201)
    right.plot(z, np.exp(-(z**2) / 2) / np.sqrt(2 * np.pi), color=NORMAL_COLOUR, label="as stated")
    right.set_xlabel("distance over its stated standard uncertainty")
    right.set_ylabel("density")
    right.legend(frameon=False)
    for axes in (left, right):
        axes.grid(alpha=0.3)
    return figure
