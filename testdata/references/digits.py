#!/usr/bin/python3
"""True answers (mpmath, 60 digits and more) for the test of the digits that results claim: reads a list of problems
as JSON from standard input and writes for each the true answer as rows of decimals, one row [real, imaginary] for
each number of a list. All numbers are taken as the binary64 numbers they are."""
import json
import sys

import mpmath as mp
import numpy as np

DIGITS = 60


def matrix(rows):
    return mp.matrix([[mp.mpf(float(x)) for x in r] for r in rows])


def rows(m):
    return [[mp.nstr(m[i, j], 40) for j in range(m.cols)] for i in range(m.rows)]


def numbers(list_):
    return [[mp.nstr(mp.re(x), 40), mp.nstr(mp.im(x), 40)] for x in list_]


def eigenvalues(m):
    return [m[0, 0]] if m.rows == 1 else mp.eig(m, left=False, right=False)


def linear(n, m, image):
    """The n×m matrix X with image(X) = 0 for an affine map, by the system of all its entries."""
    constant = image(mp.zeros(n, m))
    size = n * m
    system, x = mp.zeros(size, size), mp.zeros(n, m)
    for k in range(size):
        x[k // m, k % m] = 1
        column = image(x) - constant
        x[k // m, k % m] = 0
        for l in range(size):
            system[l, k] = column[l // m, l % m]
    v = mp.lu_solve(system, mp.matrix([-constant[l // m, l % m] for l in range(size)]))
    return mp.matrix([[v[i * m + j] for j in range(m)] for i in range(n)])


def lyapunov(a, q, sampled):
    if sampled:
        return linear(a.rows, a.rows, lambda x: a * x * a.T - x + q)
    return linear(a.rows, a.rows, lambda x: a * x + x * a.T + q)


def sign(h):
    for k in range(400):
        inverse = h ** -1
        c = abs(mp.det(h)) ** (-mp.mpf(1) / h.rows) if k < 40 else mp.mpf(1)
        new = (c * h + inverse / c) / 2
        if mp.norm(new - h, 1) <= mp.mpf(10) ** -50 * mp.norm(new, 1):
            return new
        h = new
    raise ValueError("the sign iteration did not settle")


SOLVED = {}


def riccati(p):
    key = json.dumps([p[k] for k in "ABQRN"] + [p["sampled"]])
    if key not in SOLVED:
        SOLVED[key] = riccati_anew(p)
    return SOLVED[key]


def riccati_anew(p):
    """The gain and the stabilising solution: the sign function of the Hamiltonian, or the recursion and then Newton's steps."""
    a, b, q, r, c = (matrix(p[k]) for k in "ABQRN")
    n = a.rows
    if not p["sampled"]:
        f, w, g = a - b * r ** -1 * c.T, q - c * r ** -1 * c.T, b * r ** -1 * b.T
        h = mp.zeros(2 * n, 2 * n)
        h[:n, :n], h[:n, n:], h[n:, :n], h[n:, n:] = f, -g, -w, -f.T
        s = sign(h)
        left, right = mp.zeros(2 * n, n), mp.zeros(2 * n, n)
        left[:n, :], left[n:, :] = s[:n, n:], s[n:, n:] + mp.eye(n)
        right[:n, :], right[n:, :] = s[:n, :n] + mp.eye(n), s[n:, :n]
        x = -((left.T * left) ** -1) * (left.T * right)
        return r ** -1 * (b.T * x + c.T), x
    gain = lambda x: (r + b.T * x * b) ** -1 * (b.T * x * a + c.T)
    x = q + mp.eye(n)
    for k in range(300):
        g = gain(x)
        x = q + a.T * x * a - (a.T * x * b + c) * g
        x = (x + x.T) / 2
        if k % 20 == 19 and max(abs(np.linalg.eigvals(np.array((a - b * gain(x)).tolist(), float)))) < 0.9999:
            break
    for _ in range(60):
        k = gain(x)
        new = lyapunov((a - b * k).T, q + k.T * r * k - c * k - k.T * c.T, True)
        if mp.norm(new - x, 1) <= mp.mpf(10) ** -50 * mp.norm(new, 1):
            return gain(new), new
        x = new
    raise ValueError("Newton's steps did not settle")


def response(p, s):
    a, b, c = (matrix(p[k]) for k in "ABC")
    return c * mp.lu_solve(s * mp.eye(a.rows) - a, b)


def largest_gain(p):
    """From a scan of one channel in binary64, refined by golden sections."""
    a, b, c = (np.array(p[k], float) for k in "ABC")
    point = (lambda w: mp.expj(w)) if p["sampled"] else (lambda w: mp.mpc(0, w))
    rough = (lambda w: np.exp(1j * w)) if p["sampled"] else (lambda w: 1j * w)
    poles = np.linalg.eigvals(a)
    own = np.abs(np.angle(poles)) if p["sampled"] else np.abs(poles.imag)
    grid = np.concatenate([np.linspace(0, np.pi, 500), np.logspace(-6, np.log10(np.pi), 800)]) if p["sampled"] else np.logspace(-5, 4, 1500)
    scan = np.unique(np.concatenate([[0.0], own, grid]))
    gains = [abs((c @ np.linalg.solve(rough(w) * np.eye(len(a)) - a, b.astype(complex)))[0, 0]) for w in scan]
    gain = lambda w: abs(response(p, point(w))[0, 0])
    best = int(np.argmax(gains))
    low, high = (mp.mpf(float(scan[k])) for k in (max(best - 1, 0), min(best + 1, len(scan) - 1)))
    top = gain(mp.mpf(float(scan[best])))
    for _ in range(45):
        x, y = low + (high - low) * mp.mpf("0.382"), low + (high - low) * mp.mpf("0.618")
        if gain(x) < gain(y):
            low = x
        else:
            high = y
    return max(top, gain(low), gain(mp.mpf(0)), gain(mp.pi) if p["sampled"] else 0)


def zeros(p):
    """The determinant of the system pencil at points of a circle, interpolated."""
    mp.mp.dps = 150
    a, b, c, d = (matrix(p[k]) for k in "ABCD")
    n, m = b.rows, b.cols
    points = [mp.expjpi(mp.mpf(2 * k) / (n + 1)) for k in range(n + 1)]
    values = []
    for z in points:
        s = mp.zeros(n + m, n + m)
        s[:n, :n], s[:n, n:], s[n:, :n], s[n:, n:] = a - z * mp.eye(n), b, c, d
        values.append(mp.det(s))
    found = [mp.re(sum(v / z ** k for v, z in zip(values, points))) for k in range(n + 1)]
    while abs(found[-1]) < mp.mpf(10) ** -100 * max(abs(x) for x in found):
        found.pop()
    return mp.polyroots(found[::-1], maxsteps=500, extraprec=500) if len(found) > 1 else []


def rest(p):
    a, b, c = (matrix(p[k]) for k in "ABC")
    return (c * mp.lu_solve(mp.eye(a.rows) - a if p["sampled"] else -a, b))[0, 0]


def settling(p):
    """The time near the given one at which the step response crosses 2 % of its final value, by its modes."""
    a, b, c = (matrix(p[k]) for k in "ABC")
    poles, vectors = ([a[0, 0]], mp.eye(1)) if a.rows == 1 else mp.eig(a)
    driven, seen = mp.lu_solve(vectors, b), c * vectors
    parts = [seen[0, k] * driven[k, 0] / poles[k] for k in range(a.rows)]
    off = lambda t: abs(mp.re(sum(g * mp.exp(pole * t) for g, pole in zip(parts, poles)))) - abs(rest(p)) / 50
    return mp.findroot(off, (p["near"] * mp.mpf("0.999999"), p["near"] * mp.mpf("1.000001")), tol=1e-40)


def solve(p):
    kind = p["kind"]
    mp.mp.dps = {"solve": DIGITS, "sylvester": DIGITS, "response": DIGITS, "noise gain": DIGITS, "largest gain": 40}.get(kind, 100)
    a = matrix(p["A"])
    n, sampled = a.rows, p.get("sampled", False)
    if kind == "eigenvalues":
        return numbers(eigenvalues(a))
    if kind in ("damping", "decay"):
        poles = eigenvalues(a)
        if sampled:
            poles = [mp.log(x) for x in poles]
        figure = (lambda x: -mp.re(x) / abs(x)) if kind == "damping" else (lambda x: -mp.re(x))
        return numbers([min(figure(x) for x in poles)])
    if kind == "loop poles":
        return numbers(eigenvalues(a - matrix(p["B"]) * matrix(p["K"])))
    if kind == "singular values":
        return numbers([mp.sqrt(abs(x)) for x in eigenvalues(a.T * a)])
    if kind == "exponential":
        return rows(mp.expm(a, method="taylor"))
    if kind in ("hold A", "hold B"):
        m = len(p["B"][0])
        t = mp.mpf(p["T"])
        whole = mp.zeros(n + m, n + m)
        whole[:n, :n], whole[:n, n:] = a * t, matrix(p["B"]) * t
        held = mp.expm(whole, method="taylor")
        return rows(held[:n, :n] if kind == "hold A" else held[:n, n:])
    if kind == "solve":
        return rows(a ** -1 * matrix(p["B"]))
    if kind == "sylvester":
        b, c = matrix(p["B"]), matrix(p["C"])
        return rows(linear(n, b.rows, lambda x: a * x + x * b - c))
    if kind == "lyapunov":
        return rows(lyapunov(a, matrix(p["Q"]), sampled))
    if kind == "riccati gain":
        return rows(riccati(p)[0])
    if kind == "riccati solution":
        return rows(riccati(p)[1])
    if kind == "riccati poles":
        return numbers(eigenvalues(a - matrix(p["B"]) * riccati(p)[0]))
    if kind == "assign":
        b, power, reach, value = matrix(p["B"]), mp.eye(n), mp.zeros(n, n), mp.eye(n)
        for k in range(n):
            reach[:, k], power = power * b, power * a
            value = value * (a - mp.mpf(p["poles"][k]) * mp.eye(n))
        last = mp.zeros(n, 1)
        last[n - 1] = 1
        return rows(mp.lu_solve(reach.T, last).T * value)
    if kind == "zeros":
        return numbers(zeros(p))
    if kind == "noise gain":
        b, c = matrix(p["B"]), matrix(p["C"])
        w = c * lyapunov(a, b * b.T, sampled) * c.T
        return numbers([mp.sqrt(sum(w[i, i] for i in range(w.rows)))])
    if kind == "gramian":
        b = matrix(p["B"])
        return rows(lyapunov(a, b * b.T, sampled))
    if kind == "final value":
        return numbers([rest(p)])
    if kind == "settling":
        return numbers([settling(p)])
    if kind == "hankel":
        b, c = matrix(p["B"]), matrix(p["C"])
        return numbers([mp.sqrt(abs(x)) for x in eigenvalues(lyapunov(a, b * b.T, sampled) * lyapunov(a.T, c.T * c, sampled))])
    if kind == "largest gain":
        return numbers([largest_gain(p)])
    if kind == "response":
        return numbers([response(p, mp.mpc(0, mp.mpf(w)))[0, 0] for w in p["frequencies"]])
    raise ValueError("unknown kind " + kind)


def safely(p):
    try:
        return {"true": solve(p)}
    except (ValueError, ZeroDivisionError, mp.libmp.libhyper.NoConvergence):
        return {"true": None}


print(json.dumps([safely(p) for p in json.load(sys.stdin)]))
