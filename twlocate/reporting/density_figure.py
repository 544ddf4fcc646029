"""The density over the route with the band and, below it, a close view of the leading piece."""

from typing import TYPE_CHECKING

import numpy as np

from twlocate.locating import Finding
from twlocate.position import Estimate, Piece
from twlocate.routes import Route
from twlocate.scales import Scale, length_scale

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

LINE_COLOUR = "#1a3a5c"
BAND_COLOUR = "#e0a030"
"""Dark blue on amber: told apart by every common colour vision, and by lightness in grey."""

NARROWEST_PANEL = 0.15
"""A short section gets at least this share of the longest one's width."""


def density_figure(finding: Finding, found: Estimate) -> "Figure":
    """Draw the whole route, one panel a section, above a close view of where the band is."""
    from matplotlib.figure import Figure

    route = finding.case.route
    lengths = np.array([section.length.value for section in route.sections])
    widths = np.maximum(lengths / lengths.max(), NARROWEST_PANEL)
    figure = Figure(figsize=(10, 6.5), layout="constrained")
    figure.suptitle(finding.case.title or finding.case.path.stem)
    upper, lower = figure.subfigures(2, 1, height_ratios=[1, 1.4], squeeze=False)[:, 0]
    panels = upper.subplots(1, len(lengths), sharey=True, width_ratios=widths, squeeze=False)[0]
    for index, axes in enumerate(panels):
        _draw_section(axes, index, found, route)
    panels[0].set_ylabel("probability\na metre")
    _draw_close_view(lower.subplots(), found, route)
    return figure


def _draw_section(axes: "Axes", index: int, found: Estimate, route: Route) -> None:
    section = route.sections[index]
    scale = length_scale(section.length.value, section.length.value)
    _draw_density(axes, index, found, scale)
    axes.set_xlim(0, section.length.value / scale.size)
    axes.set_title(section.name, fontsize="medium")
    axes.set_xlabel(f"distance from {section.from_node}, {scale.unit}")


def _draw_close_view(axes: "Axes", found: Estimate, route: Route) -> None:
    index = found.point.section
    section = route.sections[index]
    pieces = [piece for piece in found.band if piece.section == index]
    leading = min(pieces, key=lambda piece: _distance(piece, found.point.distance_m))
    margin = 0.8 * (leading.to_m - leading.from_m)
    low, high = max(leading.from_m - margin, 0.0), min(leading.to_m + margin, section.length.value)
    scale = length_scale(section.length.value, found.point.u_m)
    _draw_density(axes, index, found, scale)
    axes.axvline(found.point.distance_m / scale.size, color=LINE_COLOUR, linestyle="--", linewidth=1)
    axes.set_xlim(low / scale.size, high / scale.size)
    axes.set_title(
        f"{scale(found.point.distance_m)} from {section.from_node}, {found.coverage:.0%} band "
        f"{scale.number(leading.from_m)} to {scale(leading.to_m)}",
        fontsize="medium",
    )
    axes.set_xlabel(f"distance from {section.from_node} in {section.name}, {scale.unit}")
    axes.set_ylabel("probability a metre")
    axes.ticklabel_format(useOffset=False, axis="x")


def _distance(piece: Piece, x: float) -> float:
    return max(piece.from_m - x, x - piece.to_m, 0.0)


def _draw_density(axes: "Axes", index: int, found: Estimate, scale: Scale) -> None:
    density = found.densities[index]
    axes.plot(density.x / scale.size, density.density, color=LINE_COLOUR, linewidth=1.2)
    for piece in found.band:
        if piece.section == index:
            axes.axvspan(piece.from_m / scale.size, piece.to_m / scale.size, color=BAND_COLOUR, alpha=0.5, linewidth=0)
    axes.set_ylim(bottom=0)
    axes.grid(alpha=0.3)
