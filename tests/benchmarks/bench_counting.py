"""How fast counting is, as ratios in one run: `python tests/benchmarks/bench_counting.py [--long]`.

Everything is taken in turn, round by round, and the best of each is compared: processor time of one thread, and
time on the wall for two workers, which needs an otherwise idle machine. The other package is fed a plain list,
its fastest form, and its cycles are kept in a list; our side makes a Count. `--long` streams a milliard samples,
generated on the way, and looks at the memory that takes.
"""

from __future__ import annotations

import argparse
import ctypes
import os
import resource
import shutil
import subprocess
import sys
import tempfile
import threading
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import rainflow

from springlife.duty import counting, grid, kernels, stack
from springlife.duty.counting import Tally, count

ROUNDS = 4
SAMPLES = 20_000_000
FEWER = 500_000  # for the other package
STANDARD = [-2, 1, -3, 5, -1, 3, -4, 4, -2]

# The compiled loop again, by the same steps: compact, take out, stack.
C = r"""
#include <stdint.h>
#include <stdlib.h>
#include <math.h>
#define BLOCK 4096
typedef double f; typedef uint64_t u;
static u compact(const f *b, u size, uint8_t *rising, uint8_t *up, f *out) {
  u n = 0; up[0] = *rising;
  for (u k = 0; k < size; k++) up[k + 1] = b[k + 1] > b[k];
  *rising = up[size];
  for (u k = 0; k < size; k++) up[k] ^= up[k + 1];
  for (u k = 0; k < size; k++) { out[n] = b[k]; n += up[k]; }
  return n;
}
static u turns(const f *b, u size, uint8_t *rising, int *finite, uint8_t *up, f *out) {
  int64_t level = 0, odd = 0; u m = 1;
  for (u k = 0; k < size; k++) { f v = b[k + 1]; level += v == b[k]; odd += !(v - v == 0.0); }
  *finite = !odd;
  if (!level) return compact(b, size, rising, up, out);
  for (u k = 0; k < size; k++) up[k] = b[k + 1] != b[k];
  out[0] = b[0];
  for (u k = 0; k < size; k++) { out[m] = b[k + 1]; m += up[k]; }
  return compact(out, m - 1, rising, up, out);
}
static u peel(f *p, u n, int peak, f *low, f *high, u *cycles) {
  if (n < 5) return n;
  u i = 1, kept = 1, m = *cycles; int was = 0; f a = p[0], b = p[1], c = p[2];
  if (peak) {
    was = (c < a) & (p[3] < b); low[m] = b; high[m] = c; m += was; kept += !was; i = 2; a = b; b = c; c = p[3];
  }
  int lifted = c >= a;
  for (; i + 3 < n; i += 2) {
    f d = p[i + 2], e = p[i + 3]; int higher = d >= b, fall = higher & lifted;
    low[m] = c; high[m] = b; m += fall; p[kept] = b; kept += !(fall | was);
    lifted = e >= c; was = !(higher | lifted);
    low[m] = c; high[m] = d; m += was; p[kept] = c; kept += !(was | fall);
    b = d; c = e;
  }
  p[kept] = b; kept += !was;
  for (i++; i < n; i++) p[kept++] = p[i];
  *cycles = m; return kept;
}
static u put(const f *p, u n, int peak, f *s, u t, f *low, f *high, u *cycles) {
  u m = *cycles;
  for (u i = 0; i < n; i++, peak = !peak) {
    f v = p[i];
    if (peak) while (t > 2 && s[t-1] >= s[t-3] && v >= s[t-2]) { low[m] = s[t-1]; high[m] = s[t-2]; m++; t -= 2; }
    else      while (t > 2 && s[t-1] <= s[t-3] && v <= s[t-2]) { low[m] = s[t-2]; high[m] = s[t-1]; m++; t -= 2; }
    s[t++] = v;
  }
  *cycles = m; return t;
}
int64_t reduce(const f *x, u size, f *low, f *high, f *s) {
  f out[BLOCK + 1]; uint8_t up[BLOCK + 1]; u m = 0, t = 1, i = 1;
  while (i < size && x[i] == x[0]) i++;
  s[0] = x[0];
  if (i == size) return 0;
  uint8_t rising = x[i] > x[0]; int finite = 1;
  while (i < size - 1 && finite) {
    u end = i + BLOCK < size - 1 ? i + BLOCK : size - 1; int peak = rising;
    u n = turns(x + i, end - i, &rising, &finite, up, out), before = 2 * n;
    while (4 * (before - n) > before) { before = n; n = peel(out, n, peak, low, high, &m); }
    t = put(out, n, peak, s, t, low, high, &m); i = end;
  }
  t = put(x + i, 1, rising, s, t, low, high, &m);
  return finite ? (int64_t)m : -1;
}
"""


def signals(n: int) -> dict[str, np.ndarray]:
    rng = np.random.default_rng(1049)
    noise, time_ = rng.normal(size=n), np.arange(n)
    wave = np.sin(2 * np.pi * time_ / 20) * (1 + 0.3 * np.sin(time_ / 700)) + 0.02 * noise
    return {
        "white noise": noise,
        "20 samples a cycle": wave,
        "the same, 12 bits": np.round(1500 * wave),
        "random walk": np.cumsum(noise),
        "converging sweep": np.sin(2 * np.pi * time_ / 20) * np.linspace(2, 1, n),
    }


def compile_c(folder: str) -> Callable[..., int] | None:
    compiler = shutil.which("gcc")
    if not compiler:
        return None
    source, library = Path(folder) / "loop.c", Path(folder) / "loop.so"
    source.write_text(C)
    subprocess.run([compiler, "-O3", "-march=native", "-shared", "-fPIC", str(source), "-o", str(library)], check=True)
    function = ctypes.CDLL(str(library)).reduce
    function.restype = ctypes.c_int64
    function.argtypes = [ctypes.c_void_p, ctypes.c_uint64, *[ctypes.c_void_p] * 3]
    return function  # type: ignore[no-any-return]


def by_numpy(x: np.ndarray) -> None:
    """Count without the compiler."""
    chosen = counting.expect, grid.loops
    counting.expect, grid.loops = lambda samples: stack, lambda: stack
    try:
        count(x)
    finally:
        counting.expect, grid.loops = chosen


def loop_alone(x: np.ndarray, loop: Callable[[np.ndarray], object]) -> None:
    for start in range(0, x.size, counting.SEGMENT):
        loop(x[start : start + counting.SEGMENT])


def in_threads(number: int, x: np.ndarray) -> None:
    """Run the compiled loop in several threads at once, each on everything: what the machine gives to two."""

    def work() -> None:
        scratch = stack.Scratch()
        loop_alone(x, lambda part: kernels.reduce(part, scratch))

    threads = [threading.Thread(target=work) for _ in range(number)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()


def best(jobs: dict[str, tuple[Callable[[], object], int]], clock: Callable[[], float]) -> dict[str, float]:
    """Samples a second of each job, the best of all rounds."""
    rates = dict.fromkeys(jobs, 0.0)
    for _ in range(ROUNDS):
        for name, (job, samples) in jobs.items():
            start = clock()
            job()
            rates[name] = max(rates[name], samples / (clock() - start))
    return rates


def speeds(samples: int) -> None:
    kernels.reduce(np.arange(9.0), stack.Scratch())
    scratch = stack.Scratch()
    room = scratch.fit(counting.SEGMENT)
    print(f"{samples:,} samples; M samples/s of one thread, then ratios")
    heads = ("count", "package", "NumPy", "loop", "count", "count", "NumPy", "2 : 1", "2 : 1", "count", "loop", "count")
    below = ("", "", "only", "alone", "+table", "/pack.", "/pack.", "workers", "loops", "/loop", "/C", "/sum")
    print(f"{'':20}" + "".join(f"{head:>9}" for head in heads) + f"\n{'':20}" + "".join(f"{x:>9}" for x in below))
    with tempfile.TemporaryDirectory() as folder:
        in_c = compile_c(folder)
        for name, x in signals(samples).items():
            plain = x[:FEWER].tolist()
            pointers = [array.ctypes.data for array in room]
            jobs: dict[str, tuple[Callable[[], object], int]] = {
                "count": (lambda x=x: count(x), samples),
                "numpy": (lambda x=x: by_numpy(x), samples),
                "table": (lambda x=x: count(x).table(), samples),
                "loop": (lambda x=x: loop_alone(x, lambda part: kernels.reduce(part, scratch)), samples),
                "sum": (lambda x=x: loop_alone(x, np.sum), samples),
                "package": (lambda plain=plain: list(rainflow.extract_cycles(plain)), FEWER),
            }
            if in_c:
                jobs["c"] = (
                    lambda x=x, to=pointers: loop_alone(x, lambda part: in_c(part.ctypes.data, part.size, *to)),
                    samples,
                )
            r = best(jobs, time.process_time)
            wall = best(
                {
                    "1": (lambda x=x: count(x), samples),
                    "2": (lambda x=x: count(x, workers=2), samples),
                    "1 loop": (lambda x=x: in_threads(1, x), samples),
                    "2 loops": (lambda x=x: in_threads(2, x), 2 * samples),
                },
                time.perf_counter,
            )
            speed = [r[key] / 1e6 for key in ("count", "package", "numpy", "loop", "table")]
            ratio = [
                r["count"] / r["package"], r["numpy"] / r["package"], wall["2"] / wall["1"],
                wall["2 loops"] / wall["1 loop"], r["count"] / r["loop"],
                r["loop"] / r["c"] if in_c else float("nan"), r["count"] / r["sum"],
            ]  # fmt: skip
            print(f"{name:20}" + "".join(f"{v:9.1f}" for v in speed) + "".join(f"{v:9.2f}" for v in ratio))


def repeats() -> None:
    once = count(STANDARD)
    r = best({"repeat": (lambda: 1_000_000_000 * once, 1)}, time.perf_counter)
    print(f"\n1,000,000,000 repeats of the standard's example: {1e3 / r['repeat']:.3f} ms (under 50 is asked)")


def loading() -> None:
    """Loading the compiled loops in a new process, against what NumPy does in that time."""
    code = (
        "import time, numpy; start = time.perf_counter(); from springlife.duty import kernels;"
        "print(time.perf_counter() - start)"
    )
    took = min(float(subprocess.run([sys.executable, "-c", code], capture_output=True).stdout) for _ in range(3))
    print(f"loading the compiled loops: {took:.2f} s; a process loads them after {stack.WORTH_LOADING:,} samples")


def cells() -> None:
    """Damage sums from cells against exact ones, per cent, the worst of three seeds."""
    print(f"\ndamage from cells less exact damage, % (n r^slope; and r / (1 - |mean| / {4} greatest) for r)")
    print(f"{'':20}{'rows':>8}" + "".join(f"{f'slope {m}':>10}" for m in (3, 5, 10, 25)) * 2)
    for name in list(signals(1))[:4]:
        errors, rows = [], 0
        for seed in range(3):
            x = np.roll(signals(1_000_000)[name], seed * 333_333) * (1 + 0.1 * seed)
            exact, rough = count(x, most_pairs=10**9).table(), count(x, most_pairs=1).table()
            rows = rough.low.size
            errors.append([
                100 * (_damage(rough, slope, mean) / _damage(exact, slope, mean) - 1)
                for mean in (False, True) for slope in (3, 5, 10, 25)
            ])  # fmt: skip
        worst = [min(column, key=lambda e: -abs(e)) for column in zip(*errors, strict=True)]
        print(f"{name:20}{rows:8}" + "".join(f"{e:10.4f}" for e in worst))


def _damage(table: counting.CycleTable, slope: int, mean: bool) -> float:
    span = table.high - table.low
    if mean:
        span = span / (1 - np.abs(table.high + table.low) / 8 / max(-table.low.min(), table.high.max()))
    return float((table.count * (span / span.max()) ** slope).sum())


def long(samples: int) -> None:
    print(f"\n{samples:,} samples, generated in chunks:")
    for name, workers in (("white noise", 1), ("white noise", 2), ("20 samples a cycle, 12 bits", 1)):
        read, write = os.pipe()
        child = os.fork()
        if child == 0:
            os.write(write, _stream(name, workers, samples).encode())
            os._exit(0)
        os.waitpid(child, 0)
        print(f"  {name}, {workers} {'worker' if workers == 1 else 'workers'}: {os.read(read, 999).decode()}")


def _stream(name: str, workers: int, samples: int) -> str:
    rng, tally, spent, size = np.random.default_rng(3), Tally(workers=workers), 0.0, 4_000_000
    wave = np.sin(2 * np.pi * np.arange(size) / 20)
    for _ in range(samples // size):
        x = rng.standard_normal(size)
        if name != "white noise":
            x = np.round(1500 * (wave * rng.uniform(0.5, 1.5) + 0.02 * x))
        start = time.perf_counter()
        tally.feed(x)
        spent += time.perf_counter() - start
    start = time.perf_counter()
    found = tally.result()
    spent += time.perf_counter() - start
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    kept = "exact" if found.exact else f"cells of {found.cell:g}"
    return (
        f"{found.samples / spent / 1e6:.0f} M samples/s counted, peak {peak:.0f} MB, "
        f"{found.number.sum():,} cycles closed, {found.low.size:,} rows, {kept}"
    )


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--samples", type=int, default=SAMPLES)
    parser.add_argument("--long", action="store_true", help="stream a milliard samples, three times")
    arguments = parser.parse_args()
    if arguments.long:
        long(1_000_000_000)
        return
    speeds(arguments.samples)
    repeats()
    loading()
    cells()


if __name__ == "__main__":
    main()
