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
from scipy import integrate, optimize, stats

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
    if kind == "motion":  # x' = A x + B u(t), y = C x by an adaptive integrator
        a, b, c = (npm(p[k]) for k in "ABC")
        drive = DRIVES[p["drive"]]
        run = integrate.solve_ivp(lambda t, x: a @ x + b[:, 0] * drive(t), (0, p["times"][-1]), np.array(p["start"], float),
                                  method="DOP853", rtol=2e-13, atol=1e-15, t_eval=p["times"])
        return {"scipy": (c @ run.y).tolist()}
    if kind == "held law":  # a sampled observer and gain with a limit on a continuous plant, moved by matrix exponentials
        return {"scipy": held_law(p)}
    if kind == "own equations":
        run = integrate.solve_ivp(EQUATIONS[p["equations"]], (0, p["times"][-1]), np.array(p["start"], float),
                                  method="DOP853", rtol=2e-13, atol=1e-15, t_eval=p["times"], max_step=0.01)
        return {"scipy": run.y.tolist()}
    if kind == "margins":  # crossings of a loop num/den, by mpmath on its frequency response
        return {"scipy": margins(p)}
    if kind == "axis study":
        return {"scipy": [[axis_damping(*draw, np.array(p["gain"])) for draw in p["draws"]]]}
    raise ValueError("unknown kind " + kind)


def axis_damping(mass, modulus, volume, supply, flow, leak, friction, gain):
    """The least damping of the hydraulic axis of scripts/hydraulic_axis.gain under a gain, linearised by hand, its rest by brentq.
    Parameters in kg, bar, L, bar, L/min, L/(min*bar), N*s/m; the states are in mm, mm/s, bar and 1."""
    area, load, lag, litre = 20e-4, 4000, 8e-3, 1e-3
    volume, flow, leak = volume * litre, flow * litre / 60, leak * litre / 60
    pressure = load / area / 1e5
    drop = np.sqrt(1 - pressure / supply)
    opening = optimize.brentq(lambda y: flow * 0.75 * y * drop - leak * pressure, -0.2, 0.2, xtol=1e-15)
    k = 4 * modulus / volume
    a = np.array([
        [0, 1, 0, 0],
        [0, -friction / mass, area * 1e5 / mass * 1e3, 0],
        [0, -k * area * 1e-3, -k * (leak + flow * 0.75 * opening / (2 * supply * drop)), k * flow * 0.75 * drop],
        [0, 0, 0, -1 / lag],
    ])
    poles = np.linalg.eigvals(a - np.outer([0, 0, 0, 1 / lag], gain))
    return float(np.min(-poles.real / np.abs(poles)))


DRIVES = {"step": lambda t: 1.0, "ramp": lambda t: t, "sine": lambda t: np.sin(3 * t) * np.exp(-t / 4), "none": lambda t: 0.0}


def pendulum(t, x, torque=0.0):
    return [x[1], torque - 9.81 * np.sin(x[0]) - 0.3 * x[1]]


EQUATIONS = {
    "pendulum": pendulum,
    "pushed pendulum": lambda t, x: pendulum(t, x, 4.0),
    # u = -K x within 6 on both sides
    "limited pendulum": lambda t, x: pendulum(t, x, max(-6.0, min(6.0, -12 * x[0] - 5 * x[1]))),
    # two vessels that run into each other, by the square root of their levels' difference
    "vessels": lambda t, x: [0.02 * (1 - np.sqrt(max(x[0], 0.0))), 0.02 * np.sqrt(max(x[0], 0.0)) - 0.03 * x[1]],
}


def held_law(p):
    a, b, c, k, l = (npm(p[x]) for x in "ABCKL")
    every, limit, times = p["every"], p["limit"], p["times"]
    n = a.shape[0]
    whole = sl.expm(np.block([[a, b], [np.zeros((1, n + 1))]]) * every)
    ad, bd = whole[:n, :n], whole[:n, n:]
    x, guess = np.array(p["start"], float).reshape(-1, 1), np.zeros((n, 1))
    samples, out = int(round(times[-1] / every)), []
    at = 0
    for sample in range(samples + 1):
        u = float(np.clip((-k @ guess)[0, 0], -limit, limit))
        while at < len(times) and times[at] < (sample + 1) * every - 1e-9:
            part = sl.expm(np.block([[a, b], [np.zeros((1, n + 1))]]) * (times[at] - sample * every))
            out.append((c @ (part[:n, :n] @ x + part[:n, n:] * u))[0, 0])
            at += 1
        guess = ad @ guess + bd * u + l @ (c @ x - c @ guess)
        x = ad @ x + bd * u
    return [out]


def margins(p):
    """The frequencies at which |L| = 1 and at which L is real and negative, from a fine scan refined by mpmath."""
    num, den = ([mp.mpf(exact(x).numerator) / exact(x).denominator for x in p[k]] for k in ("num", "den"))
    delay = mp.mpf(exact(p.get("delay", 0)).numerator) / exact(p.get("delay", 0)).denominator
    every = p.get("every")

    def loop(w):
        z = mp.mpc(0, w) if every is None else mp.exp(mp.mpc(0, w) * mp.mpf(every))
        return mp.polyval(num, z) / mp.polyval(den, z) * mp.exp(mp.mpc(0, -w) * delay)

    top = p["to"]
    grid = [mp.mpf(p["from"]) * (mp.mpf(top) / p["from"]) ** (mp.mpf(i) / 4000) for i in range(4001)]
    values = [loop(w) for w in grid]
    found = [[], []]
    for i in range(1, len(grid)):
        u, v = values[i - 1], values[i]
        if (abs(u) - 1) * (abs(v) - 1) < 0:
            w = mp.findroot(lambda w: abs(loop(w)) - 1, (grid[i - 1], grid[i]), solver="anderson", tol=1e-50, maxsteps=200)
            found[0] += [float(w), float(mp.arg(-loop(w)) * 180 / mp.pi)]
        if mp.im(u) * mp.im(v) < 0 and (mp.re(u) < 0 or mp.re(v) < 0):
            w = mp.findroot(lambda w: mp.im(loop(w)), (grid[i - 1], grid[i]), solver="anderson", tol=1e-50, maxsteps=200)
            if mp.re(loop(w)) >= 0:
                continue
            found[1] += [float(w), float(1 / abs(loop(w)))]
    return found


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
