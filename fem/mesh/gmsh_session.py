"""gmsh, opened through pygmsh: quiet, in any thread or process, one at a time, and always closed again."""

import importlib
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from types import ModuleType
from typing import Any

from fem.errors import MeshError, SystemLibraryMissing

_LOCK = threading.Lock()  # gmsh has one global state


@dataclass(frozen=True)
class Gmsh:
    """An open gmsh: pygmsh's geometry to draw in, and gmsh's own module to mesh with and to read from."""

    geometry: Any
    api: ModuleType


def load() -> tuple[ModuleType, ModuleType]:
    """Return the modules pygmsh and gmsh.

    Raises
    ------
    SystemLibraryMissing
        If a library of the operating system that gmsh links to is not there.
    """
    try:
        return importlib.import_module("pygmsh"), importlib.import_module("gmsh")
    except OSError as error:  # what the loader of shared libraries raises
        raise SystemLibraryMissing(str(error).split(":")[0]) from error


@contextmanager
def gmsh_session() -> Iterator[Gmsh]:
    """Open gmsh with an empty model.

    Raises
    ------
    MeshError
        If other code of this process has gmsh open, whose model would be lost, or gmsh gave up.
    SystemLibraryMissing
        See `load`.
    """
    pygmsh, gmsh = load()
    with _LOCK:
        if gmsh.isInitialized():
            raise MeshError("gmsh is open in this process, and its model would be lost: call gmsh.finalize() first")
        geometry = pygmsh.geo.Geometry()
        try:
            _open(geometry, gmsh)
            yield Gmsh(geometry, gmsh)
        except MeshError:
            raise
        except Exception as error:
            if type(error) is Exception:  # gmsh raises bare exceptions with its last message
                raise MeshError(f"gmsh gave up: {error}") from error
            raise
        finally:
            if gmsh.isInitialized():
                geometry.__exit__(None, None, None)


def _open(geometry: Any, gmsh: Any) -> None:
    """Enter pygmsh's geometry without its signal handler (only the main thread may set one) and the user's settings."""
    initialize = gmsh.initialize
    gmsh.initialize = lambda argv: initialize(argv, readConfigFiles=False, interruptible=False)
    try:
        geometry.__enter__()
    finally:
        gmsh.initialize = initialize
    for option, value in (("General.Terminal", 0), ("General.NumThreads", 1)):  # quiet; the same mesh on every machine
        gmsh.option.setNumber(option, value)
