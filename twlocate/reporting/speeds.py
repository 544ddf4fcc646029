"""A section's computed speed as text: the lines to paste into a case file and what their uncertainty stems from."""

from twlocate.calibrating import Calibrated
from twlocate.media import Propagated
from twlocate.media.speeds import SectionSpeed

ODD = 3.0
"""A speed moved by more than this many standard uncertainties of the move is pointed out (common practice)."""

SMALL = 0.005
"""Inputs below this share of the variance are not listed."""


def format_speed(found: SectionSpeed, impedance_unit: str) -> str:
    """Return the text of one wave; `impedance_unit` is ``ohm`` or ``Pa*s/m**3``."""
    head = [f"# {found.wave} mode"] if found.wave else []
    speed, impedance = found.speed.quantity, found.impedance.quantity
    lines = [
        *head,
        f'speed = "{speed.value:.6g} m/s ± {speed.u:.2g} m/s"',
        f'impedance = "{impedance.value:.5g} {impedance_unit}"  # ± {impedance.u:.2g}',
    ]
    return "\n".join([*lines, *_inputs_that_matter(found.speed)])


def format_calibrated(found: Calibrated) -> str:
    """Return the line to paste into the section, below what was stated."""
    prior, speed = found.prior, found.speed
    lines = [
        f"# {found.section}: stated {prior.value:.6g} m/s ± {prior.u:.2g} m/s",
        f'speed = "{speed.value:.7g} m/s ± {speed.u:.2g} m/s"',
    ]
    if not found.moved:
        lines.append("# the event says nothing new about this section")
    elif abs(found.pull) > ODD:
        lines.append(
            f"# the move is {abs(found.pull):.1f} of its standard uncertainties: "
            "check the place, the clocks, the lengths and the speed that was stated"
        )
    return "\n".join(lines)


def _inputs_that_matter(speed: Propagated) -> list[str]:
    rows = [row for row in speed.contributions if row.share >= SMALL]
    if not rows:
        return ["# no input was given with an uncertainty (write it behind ±)"]
    width = max(len(row.name) for row in rows)
    return [
        "# inputs that matter most to the speed (standard uncertainties):",
        *(
            f"#   {row.name.replace('_', ' '):<{width}}  ± {row.u:.3g} (SI)  →  ± {row.size:.3g} m/s  ({row.share:.0%})"
            for row in rows
        ),
    ]
