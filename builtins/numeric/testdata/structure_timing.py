"""Times SciPy on the same kinds of problem as the Go benchmarks, one core.

Run both in one sitting, from the folder of the package:

    OMP_NUM_THREADS=1 OPENBLAS_NUM_THREADS=1 /usr/bin/python3 testdata/structure_timing.py
    GOMAXPROCS=1 go test -run '^$' -bench 'Placement|Zeros|Reachability' -benchtime 3x .

Placement: scipy.signal.place_poles with its defaults. Zeros: the generalized
eigenvalues of the system matrix by scipy.linalg.eigvals (which leaves zeros at
infinity in). Sizes, numbers of inputs and kinds of poles as in the benchmarks; random data.
"""
import os
os.environ.setdefault("OMP_NUM_THREADS", "1"); os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
import sys, time, warnings, numpy as np, scipy
from scipy.linalg import eigvals
from scipy.signal import place_poles

warnings.simplefilter("ignore")

def best(f, limit=3):
    times = []
    for _ in range(limit):
        t = time.perf_counter(); f(); times.append(time.perf_counter() - t)
        if sum(times) > 20: break
    return min(times) * 1e3

def plant(n, m):
    rng = np.random.default_rng(n)
    poles = []
    while len(poles) < n // 2:
        p = complex(-1 - rng.random(), 0.5 + rng.random()); poles += [p, p.conjugate()]
    while len(poles) < n: poles.append(complex(-0.5 - 2 * rng.random()))
    return rng.standard_normal((n, n)), rng.standard_normal((n, m)), rng.standard_normal((m, n)), np.array(poles[:n])

print(f"SciPy {scipy.__version__}, NumPy {np.__version__}; best of up to 3, milliseconds")
for n in [int(x) for x in sys.argv[1:]] or [4, 10, 20, 50, 100, 200, 400]:
    A, B, _, p = plant(n, max(2, n // 5))
    several = best(lambda: place_poles(A, B, p)) if n <= 100 else float("nan")  # many minutes
    A1, B1, _, p1 = plant(n, 1)
    one = best(lambda: place_poles(A1, B1, p1))
    A2, B2, C2, _ = plant(n, 2)
    M = np.block([[A2, B2], [C2, np.zeros((2, 2))]]); E = np.zeros_like(M); E[:n, :n] = np.eye(n)
    zeros = best(lambda: eigvals(M, E))
    print(f"n={n}: placement, several inputs {several:.2f}; one input {one:.2f}; zeros {zeros:.2f}", flush=True)
