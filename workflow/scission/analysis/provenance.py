"""Where the numbers of a campaign come from: versions, hosts, times, the campaign file as given."""

from __future__ import annotations

import platform
from collections import defaultdict
from collections.abc import Mapping
from datetime import UTC, datetime
from importlib.metadata import version
from typing import Any

from scission import __version__
from scission.campaign import Campaign
from scission.records import Record

_LIBRARIES = ("numpy", "scipy", "h5py", "lmfit", "pandas", "pyarrow", "matplotlib")
_EVERY = ("scission", "physics_version", "source_digest", "python", "numpy", "pyscf", "h5py", "host")


class Sources:
    """Collects what the records say of their making, each distinct value once."""

    def __init__(self) -> None:
        self._seen: dict[str, set[str]] = defaultdict(set)
        self._times: list[str] = []

    def add(self, record: Record) -> None:
        """Take note of one record."""
        for name in _EVERY:
            if record.provenance.get(name) not in (None, ""):
                self._seen[name].add(str(record.provenance[name]))
        times = [
            str(record.provenance[name]) for name in ("started", "finished") if record.provenance.get(name)
        ]
        if times:
            self._times = [min([*self._times, *times]), max([*self._times, *times])]

    def summary(self) -> dict[str, str]:
        """``records_<what>``: the values, comma separated; first and last time, UTC."""
        words = {f"records_{name}": ", ".join(sorted(values)) for name, values in self._seen.items()}
        if self._times:
            words |= {"records_first_started": self._times[0], "records_last_finished": self._times[-1]}
        return words

    def mixed(self) -> list[str]:
        """Names of what decides numbers and is not the same in all records."""
        return [name for name in ("physics_version", "source_digest", "pyscf") if len(self._seen[name]) > 1]


def provenance(campaign: Campaign, facts: Mapping[str, Any], sources: Sources) -> dict[str, Any]:
    """Attributes for the root of campaign.h5 and the end of the report.

    Args:
        campaign: for its file as given.
        facts: of the plan: ``physics_version``, ``digest``.
        sources: what the records say.
    """
    made = {
        "campaign": campaign.name,
        "campaign_file": campaign.source_text,
        **facts,
        "scission": __version__,
        "python": platform.python_version(),
        "gathered": datetime.now(UTC).isoformat(timespec="seconds"),
        "gathered_on": platform.node(),
    }
    return made | {name: version(name) for name in _LIBRARIES} | sources.summary()
