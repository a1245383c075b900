"""Mutual inductance, coupling and polarity of windings, with bounds, from any readings of one device."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from mutual.errors import MutualError, RefusedInput, WrongUsage

if TYPE_CHECKING:
    from mutual.evaluate import estimate
    from mutual.recording import Recording, read
    from mutual.result import Estimate

__all__ = ["Estimate", "MutualError", "Recording", "RefusedInput", "WrongUsage", "estimate", "read"]

_HOMES = {
    "estimate": "mutual.evaluate",
    "read": "mutual.recording",
    "Recording": "mutual.recording",
    "Estimate": "mutual.result",
}


def __getattr__(name: str) -> Any:
    """Load what needs numpy and scipy only when it is used, so that `mutual --help` is quick."""
    if name not in _HOMES:
        raise AttributeError(f"module 'mutual' has no attribute {name!r}")
    from importlib import import_module

    return getattr(import_module(_HOMES[name]), name)
