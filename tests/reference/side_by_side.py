"""Times python-flint on the matrices of the benchmarks, for a comparison side by side.

    venv/bin/python side_by_side.py            prints medians as JSON
    venv/bin/python side_by_side.py --write    writes bench_matrices.json anew (fixed seed) and stops

bench_matrices.json is what the benchmarks of this project read, so that both sides work on the same numbers. Timed, each as the median
of several runs in one thread:
    charpoly_N   characteristic polynomial of a dense N x N matrix of 16-bit integers
    roots_N      all complex roots of that polynomial, isolated in balls at 53 bits (radii of some 1e-16 of the root)
    exp_20       exp(A) in balls at 53 bits for a 20 x 20 matrix of rationals (conversion of the rationals to balls included)
"""

import json
import platform
import random
import statistics
import sys
import time
from importlib.metadata import version
from pathlib import Path

sys.dont_write_bytecode = True

from flint import arb_mat, ctx, fmpq, fmpq_mat, fmpz_mat

MATRICES = Path(__file__).resolve().parent / "bench_matrices.json"
SEED = 30816
REPEATS = {"charpoly_8": 200, "roots_8": 50, "charpoly_30": 50, "roots_30": 9, "exp_20": 50}


def generated():
    rng = random.Random(SEED)
    dense = {f"dense_{n}": [[str(rng.randint(-(2**15), 2**15 - 1)) for _ in range(n)] for _ in range(n)] for n in (8, 30)}
    rational = [[f"{rng.randint(-99, 99)}/{rng.randint(1, 99)}" for _ in range(20)] for _ in range(20)]
    return {"seed": str(SEED), **dense, "rational_20": rational}


def written(matrices):
    groups = [f' "seed": {json.dumps(matrices["seed"])}']
    for name, rows in matrices.items():
        if name != "seed":
            groups.append(f' "{name}": [\n' + ",\n".join("  " + json.dumps(row) for row in rows) + "\n ]")
    return "{\n" + ",\n".join(groups) + "\n}\n"


def median(job, repeats):
    """Seconds; the first run warms up and is not counted."""
    job()
    samples = []
    for _ in range(repeats):
        start = time.perf_counter()
        job()
        samples.append(time.perf_counter() - start)
    return statistics.median(samples)


def main():
    if "--write" in sys.argv[1:]:
        MATRICES.write_text(written(generated()))
        return
    matrices = json.loads(MATRICES.read_text())
    ctx.prec, ctx.threads = 53, 1
    jobs = {}
    for n in (8, 30):
        a = fmpz_mat([[int(v) for v in row] for row in matrices[f"dense_{n}"]])
        p = a.charpoly()
        jobs[f"charpoly_{n}"] = a.charpoly
        jobs[f"roots_{n}"] = p.complex_roots
    q = fmpq_mat([[fmpq(*(int(part) for part in v.split("/"))) for v in row] for row in matrices["rational_20"]])
    jobs["exp_20"] = lambda: arb_mat(q).exp()
    report = {
        "python_flint": version("python-flint"), "python": platform.python_version(), "machine": platform.machine(),
        "median_seconds": {name: median(job, REPEATS[name]) for name, job in jobs.items()}, "repeats": REPEATS,
    }
    print(json.dumps(report, indent=1))


if __name__ == "__main__":
    main()
