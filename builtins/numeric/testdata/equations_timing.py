#!/usr/bin/python3
"""Times SciPy on Riccati and Lyapunov equations and eigenvalues, one core, best of several runs.

Run it beside the Go benchmarks, on an otherwise idle machine, and compare row by row:
    OPENBLAS_NUM_THREADS=1 /usr/bin/python3 testdata/equations_timing.py
    go test -run '^$' -bench 'Riccati|Lyapunov|Eigenvalues' -cpu 1 .
Matrices as in the benchmarks: dense, normally distributed, 1-norm 10, shifted by -2; two inputs, unit weights.
"""
import time
import numpy as np, scipy, scipy.linalg as sl

def best(call, budget=1.0):
    shortest, spent = float("inf"), 0.0
    while spent < budget:
        start = time.perf_counter(); call(); took = time.perf_counter() - start
        shortest, spent = min(shortest, took), spent + took
    return shortest * 1e3

print("SciPy", scipy.__version__, "NumPy", np.__version__)
rng = np.random.default_rng(7)
for n in (4, 10, 20, 50, 100, 200, 400):
    M = rng.standard_normal((n, n)); M *= 10/np.linalg.norm(M, 1)
    A = M - 2*np.eye(n); B = np.zeros((n, 2)); B[np.arange(n), np.arange(n) % 2] = 1
    Q, R = np.eye(n), np.eye(2)
    print(f"n={n:<4} care {best(lambda: sl.solve_continuous_are(A, B, Q, R)):10.3f} ms  dare {best(lambda: sl.solve_discrete_are(A/10, B, Q, R)):10.3f} ms"
          f"  lyapunov {best(lambda: sl.solve_continuous_lyapunov(A, -Q)):9.3f} ms  eigenvalues {best(lambda: np.linalg.eigvals(M)):9.3f} ms")
