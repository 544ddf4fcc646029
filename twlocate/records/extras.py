"""Packages that only some formats need, and the one sentence for whoever misses them."""

import importlib
from types import ModuleType

from twlocate.errors import RecordError


def needed(module: str) -> ModuleType:
    """Import `module`.

    Raises
    ------
    RecordError
        It is not installed; says which command brings it.
    """
    try:
        return importlib.import_module(module)
    except ImportError:
        package = module.partition(".")[0]
        raise RecordError(f"this format needs the package {package}: pip install twlocate[formats]") from None
