"""How the loop kernel is compiled, and where the compiled code is kept between runs.

The cache folder carries a digest of the kernel's sources and of the versions that the code depends on, so
that a change of any of them never runs code compiled from another.
"""

from __future__ import annotations

import hashlib
import os
import sys
import tempfile
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any, TypeVar

import numba
import numpy as np
from numba import njit
from numba.core import cgutils
from numba.extending import intrinsic

Function = TypeVar("Function", bound=Callable[..., object])


def _root() -> Path:
    """The user's cache folder for this program, or a temporary one where there is none."""
    if "BUCKDESIGN_CACHE" in os.environ:
        return Path(os.environ["BUCKDESIGN_CACHE"])
    if sys.platform == "win32":
        home = Path(os.environ.get("LOCALAPPDATA", Path.home()))
    elif sys.platform == "darwin":
        home = Path.home() / "Library" / "Caches"
    else:
        home = Path(os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache")
    return home / "buckdesign"


@cache
def cache_folder() -> Path:
    """Folder of the compiled kernel for the present sources, versions and processor."""
    digest = hashlib.sha256()
    here = Path(__file__).parent
    for source in sorted(here.glob("*.py")):
        digest.update(source.read_bytes())
    digest.update(f"{here} {numba.__version__} {np.__version__} {sys.version}".encode())
    folder = _root() / digest.hexdigest()[:16]
    try:
        folder.mkdir(parents=True, exist_ok=True)
        if not os.access(folder, os.W_OK):
            raise OSError
    except OSError:
        user = os.getuid() if hasattr(os, "getuid") else 0
        folder = Path(tempfile.gettempdir()) / f"buckdesign-{user}" / folder.name
        folder.mkdir(parents=True, exist_ok=True)
    return folder


def is_cached() -> bool:
    """Whether the kernel has been compiled before, so that the next call starts at once."""
    return any(cache_folder().rglob("steady.solve_rows*.nbc"))


def compiled(function: Function) -> Function:
    """Compile a function of the kernel on its first call and keep the result in `cache_folder`."""
    settings: Any = numba.config
    kept = settings.CACHE_DIR
    settings.CACHE_DIR = str(cache_folder())
    compiler: Any = njit(cache=True, nogil=True, error_model="numpy", fastmath={"contract", "reassoc", "nsz", "arcp"})
    try:
        made: Function = compiler(function)
    finally:
        settings.CACHE_DIR = kept
    return made


def _lend(typing_context: Any, array: Any) -> Any:
    """The same array without a share in its ownership, for use while its owner is held elsewhere.

    Calls between compiled functions count the references to the arrays that they pass, with an atomic
    operation each; in the innermost loop that would cost a third of the time.
    """

    def generate(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        made = context.make_array(signature.return_type)(context, builder, arguments[0])
        made.meminfo = cgutils.get_null_value(made.meminfo.type)
        return made._getvalue()

    return array(array), generate


lent: Any = intrinsic(_lend)
