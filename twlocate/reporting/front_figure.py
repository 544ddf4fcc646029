"""One terminal's trace with its arrivals, and each of the first fronts seen close, as fitted, with ± u."""

from typing import TYPE_CHECKING

import numpy as np

from twlocate.arrivals import Arrival, Front, Picks
from twlocate.records import Stretch
from twlocate.reporting.inspection_figure import envelope
from twlocate.scales import TIME_UNITS, time_text

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

MOST_CLOSE = 4
BINS = 1500
TRACE_COLOUR = "#9a9a9a"
DENOISED_COLOUR = "#1a3a5c"
FIT_COLOUR = "#c05000"
"""Grey, dark blue and a burnt orange: told apart by lightness as well as by colour."""

LEAST_GAP = 0.015
"""Numbers of arrivals closer than this share of the trace would cover each other."""

LEAST_SHOWN = 6.0
"""Samples shown either side of an onset at least."""


def front_figure(picks: Picks, title: str) -> "Figure":
    """Draw the whole trace above a close view of each of its first fronts."""
    from matplotlib.figure import Figure

    n_close = min(len(picks.arrivals), MOST_CLOSE)
    figure = Figure(figsize=(10, 6.5 if n_close else 3.2), layout="constrained")
    figure.suptitle(title)
    rows = figure.subfigures(2 if n_close else 1, 1, squeeze=False)[:, 0]
    _draw_trace(rows[0].subplots(), picks)
    if n_close:
        panels = rows[1].subplots(1, n_close, squeeze=False)[0]
        for number, (panel, arrival, front) in enumerate(zip(panels, picks.arrivals, picks.fronts, strict=False), 1):
            _draw_front(panel, picks, arrival, front)
            panel.set_title(f"{number}: ± {time_text(arrival.u_s)}, {arrival.snr_db:.0f} dB", fontsize="small")
        panels[0].set_ylabel(f"{picks.trace.name}, {picks.trace.unit}")
    return figure


def _draw_trace(axes: "Axes", picks: Picks) -> None:
    trace = picks.trace
    stretch = Stretch(0, trace.samples.size, trace.start_s, trace.rate_hz)
    size, unit = _time_unit(stretch.span_s)
    for samples, colour, label in (
        (picks.level, TRACE_COLOUR, "as recorded, power frequency off"),
        (picks.denoised, DENOISED_COLOUR, "denoised"),
    ):
        times, values = envelope(stretch, samples, BINS)
        axes.plot(times / size, values, color=colour, linewidth=0.8, label=label)
    labelled_s = -np.inf
    for number, arrival in enumerate(picks.arrivals, 1):
        axes.axvline(arrival.time_s / size, color=FIT_COLOUR, linewidth=0.8, linestyle="--")
        if arrival.time_s - labelled_s > LEAST_GAP * stretch.span_s:
            axes.annotate(str(number), (arrival.time_s / size, 1.01), xycoords=("data", "axes fraction"), fontsize=8)
            labelled_s = arrival.time_s
    axes.set_xlabel(f"time from the record's start, {unit}")
    axes.set_ylabel(f"{trace.name}, {trace.unit}")
    axes.legend(loc="best", fontsize=8, frameon=False)
    axes.grid(alpha=0.3)


def _draw_front(axes: "Axes", picks: Picks, arrival: Arrival, front: Front) -> None:
    trace = picks.trace
    reach = max(2 * front.rise, 4 * front.u, LEAST_SHOWN)
    first, stop = max(round(front.onset - reach), front.window[0]), min(round(front.onset + 2 * reach), front.window[1])
    size, unit = _time_unit(3 * reach / trace.rate_hz)
    after_onset = (np.arange(first, stop) - front.onset) / trace.rate_hz / size
    axes.plot(after_onset, picks.level[first:stop], ".", color=TRACE_COLOUR, markersize=4, label="recorded")
    fitted = front.fitted[first - front.window[0] : stop - front.window[0]]
    axes.plot(after_onset[: fitted.size], fitted, color=FIT_COLOUR, linewidth=1.2, label=f"fitted, {front.shape}")
    u = arrival.u_s / size
    axes.axvspan(-u, u, color=DENOISED_COLOUR, alpha=0.25, linewidth=0)
    axes.axvline(0, color=DENOISED_COLOUR, linewidth=0.8)
    axes.set_xlabel(f"after the onset, {unit}")
    axes.legend(fontsize=7, frameon=False)
    axes.tick_params(labelsize=7)
    axes.grid(alpha=0.3)


def _time_unit(span_s: float) -> tuple[float, str]:
    return next((size, unit) for least, size, unit in TIME_UNITS if span_s >= least)
