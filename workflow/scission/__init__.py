"""Bond scans by quantum chemistry: one campaign file to curves, diagnostics, flags and tables."""

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from scission.handover import compare as compare
    from scission.handover import concat as concat
    from scission.handover import open_campaign as open_campaign

__version__ = "0.1.0"

_HANDED_ON = ("compare", "concat", "open_campaign")


def __getattr__(name: str) -> Any:
    # Jobs and commands import this package all the time; pandas and xarray come only when asked for.
    if name not in _HANDED_ON:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    from scission import handover

    return getattr(handover, name)
