"""Write a finding to a folder: all of it or nothing, and never over another."""

import re
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING

from twlocate.folders import new_folder
from twlocate.locating import Finding
from twlocate.reporting.text import plain_text

if TYPE_CHECKING:
    from matplotlib.figure import Figure

DPI = 110


def write_folder(finding: Finding, document: str, folder: Path) -> None:
    """Write ``finding.json``, ``finding.txt`` and the figures.

    Raises
    ------
    CaseError
        The folder exists, or cannot be written.
    """
    with new_folder(folder) as unfinished:
        (unfinished / "finding.json").write_text(document + "\n", encoding="utf-8")
        (unfinished / "finding.txt").write_text(plain_text(finding), encoding="utf-8")
        for name, figure in _figures(finding):
            figure.savefig(unfinished / f"{name}.png", dpi=DPI)


def _figures(finding: Finding) -> Iterator[tuple[str, "Figure"]]:
    from twlocate.reporting.density_figure import density_figure
    from twlocate.reporting.front_figure import front_figure

    if finding.estimate:
        yield "density", density_figure(finding, finding.estimate)
    for observation in finding.observations:
        node = observation.terminal.node
        yield (
            f"arrivals-{_as_file_name(node)}",
            front_figure(observation.picks, title=f"{node}: {observation.wave.name}"),
        )


def _as_file_name(node: str) -> str:
    """Turn a node's name, which may hold anything, into a file name."""
    return re.sub(r"\W+", "-", node.lower()).strip("-") or "terminal"
