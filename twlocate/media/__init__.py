"""Where wave speed, impedance and loss come from: overhead lines, cables, liquid and gas in pipes."""

from twlocate.media.propagation import Contribution, Propagated, propagate

__all__ = ["Contribution", "Propagated", "propagate"]
