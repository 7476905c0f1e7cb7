"""What starting costs, as ratios in one run: `python tests/benchmarks/bench_startup.py`.

Each command is a whole process, taken in turn with the others; medians are compared.
"""

from __future__ import annotations

import statistics
import subprocess
import sys
import time
from pathlib import Path

RUNS = 9
CASE = Path(__file__).parents[2] / "loadcases" / "forwarder-seat" / "case.toml"
COMMANDS = {
    "bare Python": ["-c", "pass"],
    "import numpy": ["-c", "import numpy"],
    "import springlife": ["-c", "import springlife"],
    "import numpy, springlife": ["-c", "import numpy, springlife"],
    "springlife --help": ["-m", "springlife.cli", "--help"],
    "springlife assess (demo)": ["-m", "springlife.cli", "assess", str(CASE)],
}


def seconds(arguments: list[str]) -> float:
    start = time.perf_counter()
    subprocess.run([sys.executable, *arguments], stdout=subprocess.DEVNULL, check=False)
    return time.perf_counter() - start


def main() -> None:
    for arguments in COMMANDS.values():
        seconds(arguments)  # compiled files and disk caches
    times: dict[str, list[float]] = {name: [] for name in COMMANDS}
    for _ in range(RUNS):
        for name, arguments in COMMANDS.items():
            times[name].append(seconds(arguments))
    middle = {name: statistics.median(values) for name, values in times.items()}
    bare = middle["bare Python"]
    print(f"{'command':28}{'median s':>10}{'over bare Python':>18}")
    for name, value in middle.items():
        print(f"{name:28}{value:10.3f}{value / bare:18.2f}")
    more = middle["import numpy, springlife"] - middle["import numpy"]
    print(f"springlife adds {1000 * more:.0f} ms to NumPy's own import (at most 100 ms is asked)")
    print(f"--help takes {middle['springlife --help'] / bare:.2f} times a bare Python (under 3 is asked)")


if __name__ == "__main__":
    main()
