"""Reading a profile of five million rows: seconds and the greatest memory, beside the file's own size.

Run it: python tests/benchmarks/reading.py [ROWS]. The reference is a plain float read of the same file by pandas.
"""

from __future__ import annotations

import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

READ = "from tideleg.mission import read_profile; print(len(read_profile({0!r}).power_w))"
PLAIN = "import pandas as pd; print(len(pd.read_csv({0!r}, dtype=float)))"
EMPTY = "import numpy, pandas, tideleg.mission"


def measured(code: str) -> tuple[float, float]:
    """Return (seconds, greatest resident memory [MB]) of a fresh interpreter that runs the code."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss
    start = time.perf_counter()
    told = subprocess.run(
        [sys.executable, "-c", f"{code}\nimport resource; print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)"],
        check=True,
        capture_output=True,
        text=True,
    )
    del before
    return time.perf_counter() - start, float(told.stdout.split()[-1]) / 1024.0


def main() -> None:
    """Write the file, read it three ways, print."""
    rows = int(sys.argv[1]) if len(sys.argv) > 1 else 5_000_000
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "long.csv"
        with path.open("w") as handle:
            handle.write("time_s,power_w\n")
            for k in range(rows):
                handle.write(f"{k},{(k * 7919) % 100003 - 50000}\n")
        size = path.stat().st_size / 1e6
        print(f"{rows} rows, {size:.0f} MB of text")
        (base_s, base), (plain_s, plain), (ours_s, ours) = (
            measured(code.format(str(path))) for code in (EMPTY, PLAIN, READ)
        )
        print(f"imports alone        {base_s:6.1f} s  {base:7.0f} MB")
        print(f"plain float read     {plain_s:6.1f} s  {plain:7.0f} MB")
        print(f"read_profile         {ours_s:6.1f} s  {ours:7.0f} MB   ({ours_s / plain_s:.1f} times the plain read)")
        print(f"beyond imports: {ours - base:.0f} MB, {1e6 * (ours - base) / rows:.0f} bytes a row")


if __name__ == "__main__":
    main()
