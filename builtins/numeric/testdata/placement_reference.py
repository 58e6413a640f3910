"""Pole assignment by SciPy's place_poles on seeded random plants, for comparison.

Writes placement_reference.json: for each case the matrices, the wanted poles,
the condition number of SciPy's unit eigenvectors (kappa, recomputed from
A - BK), its worst pole error and ||K||. Data invented.

Run: /usr/bin/python3 placement_reference.py
"""
import datetime, json, warnings, numpy as np, scipy
from scipy.signal import place_poles

warnings.simplefilter("ignore")
rng = np.random.default_rng(1985)
cases = []

def add(name, A, B, poles):
    poles = np.asarray(poles)
    best = None
    try:
        r = place_poles(A, B, poles, method="YT", maxiter=100, rtol=1e-6)
        K = r.gain_matrix
        w, v = np.linalg.eig(A - B @ K)
        left = list(w); worst = 0
        for p in poles:
            i = int(np.argmin([abs(p - q) for q in left])); worst = max(worst, abs(p - left[i])); left.pop(i)
        best = dict(kappa=float(np.linalg.cond(v)), error=float(worst), norm=float(np.linalg.norm(K, 2)))
    except Exception as e:
        best = dict(kappa=None, error=None, norm=None, refused=str(e))
    cases.append(dict(name=name, a=A.tolist(), b=B.tolist(), poles=[[float(p.real), float(p.imag)] for p in poles.astype(complex)], scipy=best))
    print(name, best)

def wanted(n, pairs):
    p = []
    for _ in range(pairs):
        z = complex(-rng.uniform(0.5, 3), rng.uniform(0.3, 3)); p += [z, z.conjugate()]
    return np.array(p + [complex(-rng.uniform(0.3, 4)) for _ in range(n - 2 * pairs)])

for n, m, pairs in [(3, 2, 0), (3, 2, 1), (4, 2, 0), (4, 2, 1), (4, 2, 2), (5, 2, 1), (5, 3, 2), (6, 2, 2), (6, 3, 0), (6, 3, 3), (8, 2, 2), (8, 3, 4), (10, 2, 3), (10, 4, 5), (15, 3, 5), (20, 4, 6), (30, 5, 10)]:
    for k in range(2):
        add(f"random {n} {m} {pairs} no. {k+1}", rng.standard_normal((n, n)), rng.standard_normal((n, m)), wanted(n, pairs))
A, B = rng.standard_normal((5, 5)), rng.standard_normal((5, 2))
add("double real poles", A, B, [-1, -1, -2, -2, -3])
add("double pair", rng.standard_normal((6, 6)), rng.standard_normal((6, 2)), [-1+1j, -1-1j, -1+1j, -1-1j, -2, -3])
A = np.diag(np.ones(5), 1); A[2, 3] = 0; B = np.zeros((6, 2)); B[2, 0] = B[5, 1] = 1
add("two triple integrators", A, B, [-1, -2, -3, -1.5, -2.5, -3.5])
json.dump(dict(tool=f"SciPy {scipy.__version__}, NumPy {np.__version__}", command="/usr/bin/python3 placement_reference.py",
    date=str(datetime.date.today()), data="invented", cases=cases), open("placement_reference.json", "w"))
