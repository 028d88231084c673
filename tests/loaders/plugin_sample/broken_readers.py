"""Plug-ins with every fault that a plug-in may have."""

from types import SimpleNamespace


def _never(path, progress):
    raise AssertionError("must not be asked")


def _ends(path, progress):
    raise SystemExit(3)


def _other(path, progress):
    return {"points": []}


ENDS = SimpleNamespace(SUFFIXES=(".ends",), read_mesh=_ends, read_modes=_other)
SECOND = SimpleNamespace(SUFFIXES=(".acme", ".vtu"), read_mesh=_never, read_modes=_never)
STUBBORN = SimpleNamespace(SUFFIXES=("no suffix",), read_mesh=_never, read_modes=_never)


def __getattr__(name):
    if name == "Reader":
        raise SystemExit("a package that ends the process when it is looked at")
    raise AttributeError(name)
