#!/usr/bin/python3
"""Reference answers for the tests, by general-purpose libraries: reads a list of problems as JSON from
standard input and writes, for each, the true answer (mpmath, 60 digits, or sympy, exact) and the answer of
SciPy in binary64. Problems: {"kind": ..., matrices as lists of rows}. Decimals are taken as the binary64
numbers they are, texts as exact fractions."""
import json
import sys
from fractions import Fraction

import mpmath as mp
import numpy as np
import scipy.linalg as sl
import sympy as sp
from scipy import stats

mp.mp.dps = 60


def exact(x):
    return Fraction(x)


def mpm(rows):
    return mp.matrix([[mp.mpf(exact(x).numerator) / exact(x).denominator for x in r] for r in rows])


def npm(rows):
    return np.array([[float(exact(x)) for x in r] for r in rows])


def spm(rows):
    return sp.Matrix([[sp.Rational(exact(x).numerator, exact(x).denominator) for x in r] for r in rows])


def text(m):
    return [[mp.nstr(m[i, j], 40) for j in range(m.cols)] for i in range(m.rows)]


def sign(h):
    """Matrix sign function by Newton's iteration with determinant scaling (Byers 1987)."""
    n = h.rows
    for k in range(400):
        inverse = h ** -1
        c = abs(mp.det(h)) ** (-mp.mpf(1) / n) if k < 40 else mp.mpf(1)
        new = (c * h + inverse / c) / 2
        if mp.norm(new - h, 1) <= mp.mpf(10) ** -50 * mp.norm(new, 1):
            return new
        h = new
    raise ValueError("the sign iteration did not settle")


def care(p):
    a, b, q, r = (mpm(p[k]) for k in "ABQR")
    n = a.rows
    g = b * r ** -1 * b.T
    h = mp.matrix(2 * n, 2 * n)
    h[:n, :n], h[:n, n:], h[n:, :n], h[n:, n:] = a, -g, -q, -a.T
    mp.mp.dps = 100
    s = sign(h)
    left = mp.matrix(2 * n, n)
    right = mp.matrix(2 * n, n)
    left[:n, :], left[n:, :] = s[:n, n:], s[n:, n:] + mp.eye(n)
    right[:n, :], right[n:, :] = s[:n, :n] + mp.eye(n), s[n:, :n]
    x = -((left.T * left) ** -1) * (left.T * right)
    mp.mp.dps = 60
    return (x + x.T) / 2


def dare(p):
    """Doubling in 100 digits (Chu, Fan & Lin 2005)."""
    mp.mp.dps = 100
    a, b, h, r = (mpm(p[k]) for k in "ABQR")
    n = a.rows
    g = b * r ** -1 * b.T
    for _ in range(80):
        w = (mp.eye(n) + g * h) ** -1
        a, g, new = a * w * a, g + a * w * g * a.T, h + a.T * h * w * a
        if mp.norm(new - h, 1) <= mp.mpf(10) ** -60 * mp.norm(new, 1):
            break
        h = new
    mp.mp.dps = 60
    return (new + new.T) / 2


def safely(f):
    try:
        m = f()
        return [[float(x) for x in row] for row in m] if np.all(np.isfinite(m)) else None
    except Exception:
        return None


def solve(p):
    kind = p["kind"]
    if kind == "care":
        return {"true": text(care(p)), "scipy": safely(lambda: sl.solve_continuous_are(*[npm(p[k]) for k in "ABQR"]))}
    if kind == "dare":
        return {"true": text(dare(p)), "scipy": safely(lambda: sl.solve_discrete_are(*[npm(p[k]) for k in "ABQR"]))}
    if kind == "exponential":
        mp.mp.dps = 80
        e = mp.expm(mpm(p["A"]), method="taylor")
        mp.mp.dps = 60
        return {"true": text(e), "scipy": safely(lambda: sl.expm(npm(p["A"])))}
    if kind == "lyapunov":
        a, q = mpm(p["A"]), mpm(p["Q"])
        n = a.rows
        k = mp.matrix(n * n, n * n)
        for i in range(n):
            for j in range(n):
                for l in range(n):
                    k[i * n + j, l * n + j] += a[i, l]
                    k[i * n + j, i * n + l] += a[j, l]
        v = mp.lu_solve(k, mp.matrix([-q[i, j] for i in range(n) for j in range(n)]))
        return {"true": [[mp.nstr(v[i * n + j], 40) for j in range(n)] for i in range(n)],
                "scipy": safely(lambda: sl.solve_continuous_lyapunov(npm(p["A"]), -npm(p["Q"])))}
    if kind == "eigenvalues":
        mp.mp.dps = 80
        w = mp.eig(mpm(p["A"]), left=False, right=False)
        mp.mp.dps = 60
        s = np.linalg.eigvals(npm(p["A"]))
        return {"true": [[mp.nstr(mp.re(x), 40), mp.nstr(mp.im(x), 40)] for x in w], "scipy": [[float(x.real), float(x.imag)] for x in s]}
    if kind == "zeros":  # SciPy has no zeros: the finite generalised eigenvalues of the system pencil
        a, b, c, d = (npm(p[k]) for k in "ABCD")
        n, m = b.shape
        w = sl.eigvals(np.block([[a, b], [c, d]]), np.block([[np.eye(n), np.zeros((n, m))], [np.zeros((m, n + m))]]))
        w = w[np.isfinite(w)]
        a, b, c, d = (spm(p[k]) for k in "ABCD")
        s = sp.Symbol("s")
        det = sp.Poly(sp.Matrix([[a - s * sp.eye(n), b], [c, d]]).det(method="berkowitz"), s)
        roots = [mp.mpc(x) for x in sp.nroots(det, n=50, maxsteps=500)] if det.degree() > 0 else []
        return {"true": [[mp.nstr(mp.re(x), 40), mp.nstr(mp.im(x), 40)] for x in roots], "scipy": [[float(x.real), float(x.imag)] for x in w]}
    if kind == "gain":  # exact: Ackermann's formula by sympy
        a, b = spm(p["A"]), spm(p["B"])
        n = a.rows
        reach = sp.Matrix.hstack(*[a ** k * b for k in range(n)])
        if reach.rank() < n:
            return {"true": None, "rank": reach.rank()}
        value = sp.eye(n)
        for root in p["poles"]:
            value = value * (a - sp.Rational(exact(root).numerator, exact(root).denominator) * sp.eye(n))
        k = reach.inv()[n - 1, :] * value
        s = sp.Symbol("s")
        return {"true": [[str(x) for x in k]], "rank": n, "polynomial": [str(c) for c in a.charpoly(s).all_coeffs()]}
    if kind == "transfer":
        a, b, c = spm(p["A"]), spm(p["B"]), spm(p["C"])
        s = sp.Symbol("s")
        m = s * sp.eye(a.rows) - a
        num, den = sp.fraction(sp.cancel((c * m.adjugate() * b)[0, 0] / m.det(method="berkowitz")))
        num, den = sp.Poly(num, s), sp.Poly(den, s)
        return {"numerator": [str(x / den.LC()) for x in num.all_coeffs()], "denominator": [str(x / den.LC()) for x in den.all_coeffs()]}
    if kind == "crane study":
        draws = np.array(p["draws"])
        values = crane_damping(*draws.T, np.array(p["gain"]))
        samples = slice(1, p["samples"])
        drawn = values[: p["samples"]]
        return {"scipy": [
            values.tolist(),
            [float(stats.spearmanr(draws[samples, j], values[samples]).correlation) for j in range(4)],
            np.quantile(drawn, [0.05, 0.5, 0.95]).tolist(),
        ]}
    raise ValueError("unknown kind " + kind)


def crane_damping(big, small, rope, friction, gain, g=9.81):
    """The least damping of the trolley crane under a gain, for arrays of parameters: its equations linearised by hand."""
    a = np.zeros((len(big), 4, 4))
    a[:, 0, 1] = a[:, 2, 3] = 1
    a[:, 1, 1], a[:, 1, 2] = -friction / big, small * g / big
    a[:, 3, 1], a[:, 3, 2] = friction / (rope * big), -(big + small) * g / (rope * big)
    b = np.zeros((len(big), 4))
    b[:, 1], b[:, 3] = 1 / big, -1 / (rope * big)
    poles = np.linalg.eigvals(a - b[:, :, None] * gain)
    return np.min(-poles.real / np.abs(poles), axis=1)


print(json.dumps([solve(p) for p in json.load(sys.stdin)]))
