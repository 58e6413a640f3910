#!/usr/bin/python3
"""Times SciPy on the problems of the Go benchmarks, one core, best of several runs.

Run it beside the benchmarks, on an otherwise idle machine, and compare row by row:
    OPENBLAS_NUM_THREADS=1 OMP_NUM_THREADS=1 /usr/bin/python3 speed_reference.py
    GOMAXPROCS=1 go test -run xxx -bench 'Exponential|Sweep500' ./builtins/numeric/
Matrices are dense, normally distributed, with 1-norm 10; the sweep is 500 points of a
plant with two inputs and two outputs, by solving at each point.
"""
import sys, time
import numpy as np, scipy, scipy.linalg as sl

def best(call, budget=1.0):
    shortest, spent = float("inf"), 0.0
    while spent < budget:
        start = time.perf_counter(); call(); took = time.perf_counter() - start
        shortest, spent = min(shortest, took), spent + took
    return shortest

print("SciPy", scipy.__version__, "NumPy", np.__version__, "Python", sys.version.split()[0])
rng = np.random.default_rng(7)
for n in (4, 5, 10, 20, 50, 100, 200, 400):
    A = rng.standard_normal((n, n)); A *= 10/np.linalg.norm(A, 1)
    B, C, I = rng.standard_normal((n, 2)), rng.standard_normal((2, n)), np.eye(n)
    points = 10.0**(np.arange(500)/100 - 2)
    few = points if n <= 100 else points[::50]
    sweep = best(lambda: [C @ sl.solve(1j*w*I - A, B, check_finite=False) for w in few])*len(points)/len(few)
    print(f"n={n:<4} exponential {best(lambda: sl.expm(A))*1e6:12.1f} us   sweep of 500 points {sweep*1e3:10.2f} ms")
