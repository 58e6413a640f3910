"""Exact transmission zeros of small rational systems, by Smith-McMillan minors.

Writes zeros_reference.json. Zero polynomial: greatest common divisor of the
minors of order r (the normal rank) once they stand over the pole polynomial
(A. G. J. MacFarlane, N. Karcanias, Int. J. Control 24, 1976). The systems are
invented: small integers, with structure put in on purpose. Zeros at infinity:
for minors of order k with the highest degree d_k (numerator minus denominator)
the orders at infinity are d_{k-1} - d_k.

Run: python3 zeros_reference.py   (needs sympy)
"""
import datetime, itertools, json, random, sympy as sp

s = sp.symbols("s")

def rmat(rng, r, c, lo=-3, hi=3):
    return sp.Matrix(r, c, lambda i, j: rng.randint(lo, hi))

def unimodular(rng, n):
    t = sp.eye(n)
    for _ in range(2 * n):
        i, j = rng.sample(range(n), 2)
        t = t * sp.eye(n).elementary_row_op("n->n+km", row=i, k=rng.choice([-1, 1]), row2=j)
    return t

def degree(num, den):
    return sp.Poly(num, s).degree() - sp.Poly(den, s).degree()

def analyse(A, B, C, D):
    n, m, p = A.rows, B.cols, C.rows
    adj = (s * sp.eye(n) - A).adjugate()
    den = (s * sp.eye(n) - A).det()
    G = (C * adj * B / den + D).applyfunc(sp.cancel)
    minors = []
    for k in range(1, min(m, p) + 1):
        row = []
        for i in itertools.combinations(range(p), k):
            for j in itertools.combinations(range(m), k):
                v = sp.cancel(G.extract(list(i), list(j)).det())
                if v != 0:
                    row.append(sp.fraction(sp.together(v)))
        if not row:
            break
        minors.append(row)
    rank = len(minors)
    if rank == 0:
        return 0, [], []
    pole = sp.Poly(1, s)
    for row in minors:
        for _, d in row:
            pole = sp.lcm(pole, sp.Poly(d, s))
    g = sp.Poly(0, s)
    for num, d in minors[-1]:
        g = sp.gcd(g, sp.Poly(num, s) * sp.div(pole, sp.Poly(d, s))[0])
    best = [0] + [max(degree(a, b) for a, b in row) for row in minors]
    orders = sorted(best[k] - best[k + 1] for k in range(rank))
    zeros = [complex(z) for z in g.nroots(n=30, maxsteps=500)] if g.degree() > 0 else []
    return rank, sorted(([z.real, z.imag] for z in zeros)), [o for o in orders if o > 0]

def block(*ms):
    return sp.diag(*ms)

def systems():
    rng = random.Random(1982)
    for n, m, p in [(4, 1, 1), (4, 2, 2), (5, 2, 2), (6, 2, 2), (5, 3, 3), (4, 2, 3), (5, 3, 2), (4, 1, 2)]:
        yield f"plain {n} {m} {p}", rmat(rng, n, n), rmat(rng, n, m), rmat(rng, p, n), sp.zeros(p, m)
    for n, m, p in [(4, 2, 2), (5, 3, 3), (4, 2, 3)]:
        D = rmat(rng, p, 1) * rmat(rng, 1, m)
        yield f"feedthrough of rank one {n} {m} {p}", rmat(rng, n, n), rmat(rng, n, m), rmat(rng, p, n), D
    yield "feedthrough of full rank", rmat(rng, 5, 5), rmat(rng, 5, 2), rmat(rng, 2, 5), sp.Matrix([[1, 2], [0, 1]])
    # chains: many zeros at infinity
    for orders in ([4], [3, 2], [5, 1], [2, 2, 2], [6]):
        n = sum(orders)
        A, B, C = sp.zeros(n), sp.zeros(n, len(orders)), sp.zeros(len(orders), n)
        at = 0
        for k, o in enumerate(orders):
            for i in range(o - 1):
                A[at + i, at + i + 1] = 1
            B[at + o - 1, k] = 1
            C[k, at] = 1
            for i in range(n):
                A[at + o - 1, i] += rng.randint(-2, 2)
            at += o
        T = unimodular(rng, n)
        yield f"chains {orders}", T * A * T.inv(), T * B, C * T.inv(), sp.zeros(len(orders), len(orders))
    # a chain with a few zeros: numerator of low degree
    for num in ([1, 3, 2], [1, -1, 4], [1, 4, 6, 4]):
        n = 6
        A = sp.zeros(n)
        for i in range(n - 1):
            A[i, i + 1] = 1
        for i in range(n):
            A[n - 1, i] = rng.randint(-3, 3)
        B, C = sp.zeros(n, 1), sp.zeros(1, n)
        B[n - 1, 0] = 1
        for i, v in enumerate(reversed(num)):
            C[0, i] = v
        T = unimodular(rng, n)
        yield f"numerator {num}", T * A * T.inv(), T * B, C * T.inv(), sp.zeros(1, 1)
    # hidden modes
    for m, p in [(1, 1), (2, 2), (2, 1)]:
        A1 = rmat(rng, 3, 3)
        A = block(A1, sp.Matrix([[-5]]), sp.Matrix([[-7]]), sp.Matrix([[-11]]))
        B = rmat(rng, 3, m, 1, 3).col_join(rmat(rng, 1, m, 1, 3)).col_join(sp.zeros(2, m))
        C = rmat(rng, p, 3, 1, 3).row_join(sp.zeros(p, 1)).row_join(rmat(rng, p, 1, 1, 3)).row_join(sp.zeros(p, 1))
        T = unimodular(rng, 6)
        yield f"hidden modes {m} {p}", T * A * T.inv(), T * B, C * T.inv(), sp.zeros(p, m)
    # transfer matrices of deficient rank
    A = rmat(rng, 4, 4); B = rmat(rng, 4, 2); C1 = rmat(rng, 1, 4)
    yield "two equal outputs", A, B, C1.col_join(C1), sp.zeros(2, 2)
    b = rmat(rng, 4, 1)
    yield "two proportional inputs", A, b.row_join(2 * b), rmat(rng, 2, 4), sp.zeros(2, 2)
    yield "rank one of three", A, b * sp.Matrix([[1, 2, 3]]), sp.Matrix([[1], [1], [2]]) * C1, sp.zeros(3, 3)
    yield "no transfer at all", block(rmat(rng, 2, 2), rmat(rng, 2, 2)), sp.Matrix([[1], [1], [0], [0]]), sp.Matrix([[0, 0, 1, 1]]), sp.zeros(1, 1)
    # repeated and fast zeros
    yield "double zero", sp.Matrix([[0, 1, 0], [0, 0, 1], [-6, -11, -6]]), sp.Matrix([0, 0, 1]), sp.Matrix([[1, 2, 1]]), sp.zeros(1, 1)
    yield "far zero", sp.Matrix([[0, 1], [-2, -3]]), sp.Matrix([0, 1]), sp.Matrix([[1, sp.Rational(1, 10**6)]]), sp.zeros(1, 1)
    yield "zeros at the poles' places", sp.diag(-1, -2, -3), sp.Matrix([[1, 0], [0, 1], [1, 1]]), sp.Matrix([[1, 1, 0], [0, 1, 1]]), sp.zeros(2, 2)
    yield "zero at the origin", sp.Matrix([[0, 1], [-2, -3]]), sp.Matrix([0, 1]), sp.Matrix([[0, 1]]), sp.zeros(1, 1)

cases = []
for name, A, B, C, D in systems():
    rank, zeros, infinite = analyse(A, B, C, D)
    f = lambda M: [[float(x) for x in M.row(i)] for i in range(M.rows)]
    cases.append(dict(name=name, a=f(A), b=f(B), c=f(C), d=f(D), rank=rank, zeros=zeros, infinite=infinite))
    print(name, rank, zeros, infinite, flush=True)
json.dump(dict(tool="sympy " + sp.__version__, command="python3 zeros_reference.py", date=str(datetime.date.today()),
    data="invented", cases=cases), open("zeros_reference.json", "w"), indent=1)
