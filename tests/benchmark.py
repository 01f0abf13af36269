"""How fast, against what: python tests/benchmark.py (about a minute; not a test).

Quote ratios within one run only: machines are shared and noisy.
"""

from __future__ import annotations

import statistics
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from workload_w import DAY, EXACT_DAYS, EXACT_IN_30_DAYS, EXACT_REACHABLE, KAPPA, ROUNDED_KAPPA, STUDY

from pvfeas.compiler import problem_of
from pvfeas.options import Options
from pvfeas.questions.assess import assess
from pvfeas.studyfile import load_study

HERE = Path(__file__).resolve().parent
EXAMPLE = HERE.parent / "data" / "studies" / "beam-line-scan.toml"
PROBABILITIES = (0.05, 0.16, 0.5, 0.84, 0.95)
CHUNK = 1_000_000


def timed(run: Callable[[], object], times: int = 5) -> float:
    """Median seconds of several runs, after one to warm up."""
    run()
    found = []
    for _ in range(times):
        start = time.perf_counter()
        run()
        found.append(time.perf_counter() - start)
    return statistics.median(found)


def plain_chunk(random: np.random.Generator) -> np.ndarray:
    """Required times of workload W as a physicist writes them, in days."""
    splitting = 2.0 * np.exp(np.log(2.0) * random.standard_normal(CHUNK))
    width = random.normal(60e3, 5e3, CHUNK)
    snr = 30.0 * np.exp(np.log(1.2) * random.standard_normal(CHUNK))
    purity = random.uniform(0.9, 1.0, CHUNK)
    floor = 0.05 * np.exp(np.log(1.5) * random.standard_normal(CHUNK))
    sigma = ROUNDED_KAPPA * np.sqrt(width * width / 50.0) / snr
    room = (splitting * purity / 5.0) ** 2 - floor**2
    return np.where(room > 0, 8.0 * sigma**2 / np.where(room > 0, room, 1.0), np.inf) / DAY


def plain(chunks: int) -> tuple[np.ndarray, float, float]:
    """Quantiles, P(in 30 d), P(reachable), averaged over chunks."""
    random = np.random.default_rng(1)
    quantiles, in_time, reachable = [], [], []
    for _ in range(chunks):
        found = plain_chunk(random)
        quantiles.append(np.quantile(found, PROBABILITIES, method="inverted_cdf"))
        in_time.append(np.mean(found <= 30.0))
        reachable.append(np.mean(np.isfinite(found)))
    return np.mean(quantiles, axis=0), float(np.mean(in_time)), float(np.mean(reachable))


def misses(quantiles: np.ndarray, in_time: float, reachable: float) -> str:
    """Worst relative error of a quantile and worst error of a probability."""
    exact = np.array(list(EXACT_DAYS.values()))
    worst = float(np.max(np.abs(quantiles / exact - 1.0)))
    probability = max(abs(in_time - EXACT_IN_30_DAYS), abs(reachable - EXACT_REACHABLE))
    return f"worst quantile off by {100 * worst:.4f} %, worst probability by {probability:.1e}"


def workload() -> None:
    """W to 0.1 % and 1e-4 against plain vectorised NumPy to the same."""
    problem = problem_of(load_study(STUDY))
    options = Options(tolerance=0.1)
    ours = timed(lambda: assess(problem, options))
    times = assess(problem, options).scenarios[0].required_time
    scale = (ROUNDED_KAPPA / KAPPA) ** 2 / DAY
    found = np.array([getattr(times, name) for name in EXACT_DAYS], dtype=float) * scale
    print(f"W, everything, tolerance 0.1: {1e3 * ours:.0f} ms; {misses(found, times.in_time, times.reachable)}")
    print("  (the probability in 30 d differs by 8e-5 for the rounded kappa of the reference)")
    chunks = 100  # 1e8 draws: 95 % half-width of P(in 30 d) 1e-4
    start = time.perf_counter()
    answer = plain(chunks)
    theirs = time.perf_counter() - start
    print(f"W, required time only, plain NumPy, {chunks * CHUNK:.0e} draws: {theirs:.1f} s; {misses(*answer)}")
    print(f"  ratio {theirs / ours:.0f}")
    quick = timed(lambda: assess(problem))
    print(f"W, everything, default tolerance: {1e3 * quick:.0f} ms; NumPy's 1e6 draws: {1e3 * theirs / chunks:.0f} ms")


def thirteen() -> None:
    """The study with 13 uncertain inputs."""
    text = (HERE / "studies" / "thirteen-inputs.toml").read_text(encoding="utf-8")
    problem = problem_of(load_study(text))
    result = assess(problem)
    seconds = timed(lambda: assess(problem))
    print(f"13 inputs, everything, default tolerance: {1e3 * seconds:.0f} ms, {result.points} points")


def processes() -> None:
    """Whole processes against their imports."""
    imports = {
        "--help": "import click",
        "check": "import click, pydantic, pint, numpy, scipy.special, mpmath, rich",
        "assess": "import click, pydantic, pint, numpy, scipy.special, mpmath, rich, uncertainties",
    }
    calls = {"--help": ["--help"], "check": ["check", str(EXAMPLE)], "assess": ["assess", str(EXAMPLE)]}
    for name, arguments in calls.items():
        ours = timed(lambda a=arguments: process(["-m", "pvfeas", *a]))
        base = timed(lambda n=name: process(["-c", imports[n]]))
        print(f"process {name}: {1e3 * ours:.0f} ms; importing its libraries alone: {1e3 * base:.0f} ms")


def process(arguments: list[str]) -> None:
    """Run Python and wait."""
    subprocess.run([sys.executable, *arguments], check=True, capture_output=True)


if __name__ == "__main__":
    workload()
    thirteen()
    processes()
