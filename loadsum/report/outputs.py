"""Output files that appear under their names only when all of them are complete."""

import shutil
import tempfile
from collections.abc import Mapping
from pathlib import Path

from loadsum.errors import MachineError


def write_outputs(folder: Path, files: Mapping[str, bytes]) -> None:
    """Write files into a folder, all or none.

    Every file is first written in full to a hidden folder on the same disk, then renamed into place, so a full
    disk or a broken run leaves earlier results as they were.

    Parameters
    ----------
    folder : Path
        Where the files go; made if missing.
    files : mapping of str to bytes
        Content by name relative to the folder.

    Raises
    ------
    MachineError
        The folder cannot be written.
    """
    try:
        folder.mkdir(parents=True, exist_ok=True)
        waiting = Path(tempfile.mkdtemp(prefix=".unfinished-", dir=folder))
    except OSError as error:
        raise MachineError(f"cannot write into {folder}: {error.strerror}") from error
    try:
        for name, content in files.items():
            target = waiting / name
            target.parent.mkdir(parents=True, exist_ok=True)
            target.write_bytes(content)
        for name in files:
            target = folder / name
            target.parent.mkdir(parents=True, exist_ok=True)
            (waiting / name).replace(target)
    except OSError as error:
        raise MachineError(f"cannot write into {folder}: {error.strerror}") from error
    finally:
        shutil.rmtree(waiting, ignore_errors=True)
