"""How it is searched, judged and shown. Knows nothing of heat, only `Problem`."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

# Bound here and now, because importing the module of the same name later would take its place;
# that module imports nothing heavy.
from optim.search import search

if TYPE_CHECKING:
    from optim.front import Front

__all__ = ["Front", "search"]


def __getattr__(name: str) -> Any:
    """Import the front when it is asked for, so that help texts need no numerics."""
    if name == "Front":
        from optim.front import Front

        return Front
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
