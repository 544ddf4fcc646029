"""How often the band of a demo event's kind holds the truth, and how far off the place is.

Draws events with fresh noise, clocks, delays, speeds, lengths and places within the uncertainties that the case
file states, and runs the whole chain on the written files. ``python tests/campaigns/demo_coverage.py line-fault 200``
"""

import sys
import tempfile
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2] / "recordings"))

from make_events import seeded

from twlocate.case import load_case
from twlocate.locating import locate


def distance_m(case, found, truth):
    """Distance along a series route between the stated point and the truth."""
    starts = np.concatenate([[0.0], np.cumsum([s.length.value for s in case.route.sections])])
    names = [s.name for s in case.route.sections]
    true = starts[names.index(truth["section"])] + truth["distance_m"]
    return starts[found.point.section] + found.point.distance_m - true


def trial(event, folder):
    """Return (error in metres, standard uncertainty, whether the band holds the truth); None for a refusal."""
    case = load_case(event.write(folder))
    finding = locate(case)
    if finding.estimate is None:
        print("refused:", finding.reason)
        return None
    names = [s.name for s in case.route.sections]
    section, x = names.index(event.truth["section"]), event.truth["distance_m"]
    held = any(p.section == section and p.from_m <= x <= p.to_m for p in finding.estimate.band)
    return distance_m(case, finding.estimate, event.truth), finding.estimate.point.u_m, held


def interval(k, n):
    """95 % Clopper-Pearson interval of k in n."""
    from scipy.stats import binomtest

    low, high = binomtest(k, n).proportion_ci()
    return f"{100 * low:.1f} to {100 * high:.1f} %"


def main(name, count):
    """Run and print the summary."""
    with tempfile.TemporaryDirectory() as folder:
        rows = [trial(event, Path(folder) / "event") for event in seeded(name, count)]
    done = np.array([row for row in rows if row is not None])
    errors, held = np.abs(done[:, 0]), int(done[:, 2].sum())
    print(
        f"{name}: {count} events, {count - len(done)} refused; error median {np.median(errors):.3g} m, 95 % below "
        f"{np.quantile(errors, 0.95):.3g} m; u median {np.median(done[:, 1]):.3g} m; rms error/u "
        f"{np.sqrt(np.mean((done[:, 0] / done[:, 1]) ** 2)):.2f}; band holds the truth in {held} of {len(done)} "
        f"({100 * held / len(done):.1f} %, 95 % interval {interval(held, len(done))})"
    )


if __name__ == "__main__":
    main(sys.argv[1], int(sys.argv[2]))
