#!/usr/bin/python3
"""Times NumPy on 100 000 samples of the crane's least damping, vectorised by hand, on one core; beside it stands
BenchmarkStudyFourStates of builtins. Run both in one sitting:

    OPENBLAS_NUM_THREADS=1 python3 testdata/references/study_timing.py
    GOMAXPROCS=1 go test ./builtins -run xxx -bench StudyFourStates
"""
import time

import numpy as np


def damping(big, small, rope, friction, gain, g=9.81):
    a = np.zeros((len(big), 4, 4))
    a[:, 0, 1] = a[:, 2, 3] = 1
    b1, b3 = 1 / big, -1 / (rope * big)
    a[:, 1, 1], a[:, 1, 2] = -friction / big, small * g / big
    a[:, 3, 1], a[:, 3, 2] = friction / (rope * big), -(big + small) * g / (rope * big)
    a[:, 1, :] -= b1[:, None] * gain
    a[:, 3, :] -= b3[:, None] * gain
    poles = np.linalg.eigvals(a)
    return np.min(-poles.real / np.abs(poles), axis=1)


nominal, width = np.array([1200, 350, 6, 95.0]), np.array([0.05, 0.4, 0.3, 0.2])
gain = np.array([104544 / 109, 325981 / 109, -20505717 / 1090, -838656 / 109])
times = []
for seed in range(7):
    start = time.perf_counter()
    draws = nominal * (1 + width * np.random.default_rng(seed).uniform(-1, 1, (100_000, 4)))
    values = damping(*draws.T, gain)
    times.append(time.perf_counter() - start)
print(f"NumPy {np.__version__}: {sorted(times)[3]:.3f} s, smallest {values.min():.4f}")
