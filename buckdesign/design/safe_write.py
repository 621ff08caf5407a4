"""Write a file whole or not at all."""

from __future__ import annotations

import contextlib
import os
import secrets
import stat
from pathlib import Path

from buckdesign.errors import FileAccessError


def write_text_new(path: Path, text: str) -> None:
    """Write a text file that must not exist yet.

    Parameters
    ----------
    path : pathlib.Path
        The file to make.
    text : str
        Its content, written as UTF-8.

    Raises
    ------
    FileAccessError
        The file exists, or it can't be written.
    """
    _write(Path(path), text.encode("utf-8"), replace=False)


def write_text_over(path: Path, text: str) -> None:
    """Write a text file, in place of one that may exist.

    Parameters
    ----------
    path : pathlib.Path
        The file to make or replace.
    text : str
        Its content, written as UTF-8.

    Raises
    ------
    FileAccessError
        The file can't be written; an existing one is as it was.
    """
    _write(Path(path), text.encode("utf-8"), replace=True)


def write_bytes_new(path: Path, data: bytes) -> None:
    """Like `write_text_new`, for bytes.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    data : bytes
        Its content.
    """
    _write(Path(path), data, replace=False)


def write_bytes_over(path: Path, data: bytes) -> None:
    """Like `write_text_over`, for bytes.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    data : bytes
        Its content.
    """
    _write(Path(path), data, replace=True)


def check_writable_name(path: Path, *, force: bool) -> None:
    """Refuse a name that could not be written, before hours of work go into its content.

    Parameters
    ----------
    path : pathlib.Path
        The file that will be written.
    force : bool
        Whether an existing file may be replaced.

    Raises
    ------
    FileAccessError
        It is a folder, its folder is missing or not writable, or it exists and `force` is not set.
    """
    path = Path(path)
    if path.is_dir():
        raise FileAccessError(path, "is a folder")
    if path.exists() and not force and path.is_file():
        raise FileAccessError(path, _EXISTS)
    folder = path.resolve().parent
    if not folder.is_dir():
        raise FileAccessError(path, f"there is no folder {folder}")
    if not os.access(folder, os.W_OK):
        raise FileAccessError(path, f"the folder {folder} can't be written to")


_EXISTS = "exists already; --force replaces it"


def _write(path: Path, data: bytes, *, replace: bool) -> None:
    try:
        target = path.resolve()
        mode = _mode(target)
        if mode is not None and not stat.S_ISREG(mode):
            _write_through(path, mode, data)
            return
        if mode is not None and not replace:
            raise FileAccessError(path, _EXISTS)
        _write_beside(path, target, mode, data, replace=replace)
    except OSError as error:
        raise FileAccessError(path, f"can't be written: {error.strerror or error}") from None
    except ValueError as error:
        raise FileAccessError(path, f"can't be written: {error}") from None


def _mode(target: Path) -> int | None:
    try:
        return target.stat().st_mode
    except FileNotFoundError:
        return None


def _write_through(path: Path, mode: int, data: bytes) -> None:
    """Into a pipe or device, which can't be replaced by a file."""
    if stat.S_ISDIR(mode):
        raise FileAccessError(path, "is a folder")
    with path.open("wb") as file:
        file.write(data)


def _write_beside(path: Path, target: Path, mode: int | None, data: bytes, *, replace: bool) -> None:
    """Into a temporary file in the same folder, which then takes the name of the target."""
    temporary = target.with_name(f".{target.name[:100]}.{secrets.token_hex(6)}.part")
    descriptor = os.open(temporary, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o666)
    try:
        with os.fdopen(descriptor, "wb") as file:
            file.write(data)
            file.flush()
            os.fsync(file.fileno())
        if mode is not None:
            temporary.chmod(stat.S_IMODE(mode))
        if replace:
            temporary.replace(target)
        else:
            _take_free_name(path, temporary, target)
    finally:
        with contextlib.suppress(FileNotFoundError):
            temporary.unlink()


def _take_free_name(path: Path, temporary: Path, target: Path) -> None:
    """A hard link fails where the name has been taken meanwhile; a rename would not."""
    try:
        target.hardlink_to(temporary)
    except FileExistsError:
        raise FileAccessError(path, _EXISTS) from None
    except OSError:
        temporary.replace(target)
