"""The errors a user can cause; each message is one line that names the bad value, the limit and the way out."""


class TwlocateError(ValueError):
    """Root of every error the program raises on purpose."""


class RecordError(TwlocateError):
    """A recording cannot be read, or does not hold what was asked of it."""


class CaseError(TwlocateError):
    """A case file is wrong; the message lists every fault, one a line."""


class NoPosition(TwlocateError):
    """The evidence does not support a place; the message says why and what would help."""
