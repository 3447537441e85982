"""How long ``scission status`` takes for a campaign of 10^5 points in 10^4 jobs, on files made up for it.

``python tests/benchmarks/status.py`` prints seconds of the first look and of a second one, as --watch takes.
"""

from __future__ import annotations

import resource
import tempfile
import time
from pathlib import Path

POINTS, JOBS, REFERENCES = 100_000, 10_000, 25_000


def key(number: int, kind: str) -> str:
    """A key as long as real ones, spread over 256 folders as digests are."""
    return f"{number * 37 % 256:02x}{kind}{number:017d}"


def make(folder: Path) -> None:
    """A campaign that is nearly done, its records as empty files."""
    (folder / "plan").mkdir()
    (folder / "plan" / "plan.json").write_text("{}")
    rows = ["scan,level,point,coordinate_angstrom,key,reference_key"]
    for n in range(POINTS):
        place = f"s{n // 400},l{n // 50 % 8},{n % 50 + 1},1.0"
        rows.append(f"{place},{key(n, 'p')},{key(n % REFERENCES, 'r')}")
    (folder / "plan" / "points.csv").write_text("\n".join(rows))
    for name, kind, count in (("records", "p", POINTS * 9 // 10), ("references", "r", REFERENCES)):
        for n in range(256):
            (folder / name / f"{n:02x}").mkdir(parents=True)
        for n in range(count):
            (folder / name / key(n, kind)[:2] / f"{key(n, kind)}.npz").touch()
    (folder / "jobs").mkdir()
    for n in range(JOBS):
        bad = f'{{\n  "{key(n, "p")}": "unconverged"\n }}' if n % 20 == 0 else "{}"
        slow = ",".join(f'["{key(10 * n + i, "p")}", {i}.5]' for i in range(5))
        text = (
            f'{{\n "job": "j{n}",\n "total": 10,\n "done": 10,\n "not_good": {bad},\n "slowest": [{slow}]\n}}'
        )
        (folder / "jobs" / f"j{n}.json").write_text(text)


def main() -> None:
    """Make the files, look twice."""
    from scission.cli.snapshot import Watcher
    from scission.execution.layout import Layout

    with tempfile.TemporaryDirectory() as name:
        make(Path(name))
        watcher = Watcher(Layout(Path(name)))
        for what in ("first look", "second look"):
            started, used = time.perf_counter(), time.process_time()
            total = watcher.look().total
            wall, cpu = time.perf_counter() - started, time.process_time() - used
            print(f"{what}: {wall:.2f} s ({cpu:.2f} s of processor), {total}")
        print(f"peak {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e3:.0f} MB")


if __name__ == "__main__":
    main()
