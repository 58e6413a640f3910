#!/usr/bin/python3
"""Writes sampling_reference.json: sampled forms of one plant by SciPy."""
import datetime, json, os
import numpy as np, scipy, scipy.signal as ss
A, B, C, D, T = [[0, 1], [-4, -0.4]], [[0], [1]], [[1, 0.5]], [[0.25]], 0.2
out = {"header": {"tool": "SciPy scipy.signal.cont2discrete", "version": scipy.__version__,
                  "command": "/usr/bin/python3 sampling_reference.py", "date": datetime.date.today().isoformat()},
       "plant": {"A": A, "B": B, "C": C, "D": D, "T": T}}
for method in ("zoh", "foh", "bilinear"):
    out[method] = [np.asarray(M).tolist() for M in ss.cont2discrete(tuple(map(np.array, (A, B, C, D))), T, method=method)[:4]]
json.dump(out, open(os.path.join(os.path.dirname(os.path.abspath(__file__)), "sampling_reference.json"), "w"), indent=1)
