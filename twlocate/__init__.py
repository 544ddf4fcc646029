"""Places a fault or a leak on a line, cable or pipe from recorded transients, with an honest band.

The rooms of the house and the way data goes through them are described in ``DEVELOPERS.md``.
"""

__version__ = "0.1.0"
