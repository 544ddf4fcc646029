"""Folders that are written whole or not at all, and never over another."""

import contextlib
import shutil
import tempfile
from collections.abc import Iterator
from pathlib import Path

from twlocate.errors import CaseError


@contextlib.contextmanager
def new_folder(folder: Path) -> Iterator[Path]:
    """Give a folder to write into that becomes `folder` when all went well, and leaves nothing when not.

    Raises
    ------
    CaseError
        `folder` is there already, or cannot be written.
    """
    if folder.exists():
        raise CaseError(f"{folder}: exists already; name a new folder, so that nothing earlier is overwritten")
    try:
        folder.parent.mkdir(parents=True, exist_ok=True)
        unfinished = Path(tempfile.mkdtemp(prefix=f".{folder.name}-", dir=folder.parent))
        try:
            yield unfinished
            unfinished.chmod(0o755)
            unfinished.rename(folder)
        finally:
            shutil.rmtree(unfinished, ignore_errors=True)
    except OSError as error:
        raise CaseError(f"{folder}: cannot be written: {error.strerror or error}; name another folder") from error
