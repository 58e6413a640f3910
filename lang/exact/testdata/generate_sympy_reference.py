"""Writes sympy_reference.json: exact results of a general-purpose computer algebra
system for the Go tests of this folder's package. Run: /usr/bin/python3 generate_sympy_reference.py DATE"""
import json
import random
import sys

import mpmath
import sympy
from sympy import Matrix, Poly, QQ, Rational, symbols

s = symbols("s")
rng = random.Random(20261201)


def number(spread=9, dens=(1, 1, 2, 3, 5, 10)):
    return Rational(rng.randint(-spread, spread), rng.choice(dens))


def matrix(r, c, **how):
    return Matrix(r, c, lambda i, j: number(**how))


def text(m):
    return [[str(x) for x in m.row(i)] for i in range(m.rows)]


def coefficients(p):
    return [str(x) for x in Poly(p, s, domain=QQ).all_coeffs()] if p != 0 else []


def deficient(n, rank):
    return matrix(n, rank) * matrix(rank, n)


def matrices():
    for n in (1, 2, 3, 4, 5, 6, 8):
        for m in (matrix(n, n), deficient(n, max(n - 2, 0)) if n > 2 else matrix(n, n), matrix(n, n, spread=1, dens=(1,))):
            rref, pivots = m.rref()
            case = {"matrix": text(m), "rank": m.rank(), "echelon": text(rref), "pivots": list(pivots),
                    "determinant": str(m.det()), "characteristic": coefficients(m.charpoly(s).as_expr())}
            if m.rank() == n:
                case["inverse"] = text(m.inv())
            yield case
    for r, c in ((3, 5), (5, 3), (6, 9), (9, 4)):
        m = matrix(r, 2) * matrix(2, c)
        rref, pivots = m.rref()
        yield {"matrix": text(m), "rank": m.rank(), "echelon": text(rref), "pivots": list(pivots)}


def polynomial(degree):
    return sum(number() * s**k for k in range(degree)) + number(dens=(1,)) * s**degree + s**degree * 20


def polynomials():
    for _ in range(25):
        common = polynomial(rng.randint(0, 3))
        p = sympy.expand(polynomial(rng.randint(1, 4)) * common * (polynomial(1) ** rng.randint(0, 3)))
        q = sympy.expand(polynomial(rng.randint(1, 4)) * common)
        quotient, remainder = sympy.div(Poly(p, s, domain=QQ), Poly(q, s, domain=QQ))
        lead, squarefree = Poly(p, s, domain=QQ).monic().sqf_list()
        _, factors = Poly(p, s, domain=QQ).monic().factor_list()
        yield {"p": coefficients(p), "q": coefficients(q),
               "product": coefficients(sympy.expand(p * q)),
               "gcd": coefficients(sympy.gcd(Poly(p, s, domain=QQ), Poly(q, s, domain=QQ)).monic().as_expr()),
               "quotient": coefficients(quotient.as_expr()), "remainder": coefficients(remainder.as_expr()),
               "squarefree": [{"factor": coefficients(f.monic().as_expr()), "multiplicity": k} for f, k in squarefree],
               "factors": [{"factor": coefficients(f.monic().as_expr()), "multiplicity": k} for f, k in factors],
               "real_roots": Poly(p, s, domain=QQ).count_roots()}


def zeros():
    """The product of the invariant factors: the gcd of all minors of the normal rank."""
    from itertools import combinations
    for n, m, p, kind in ((2, 1, 1, ""), (3, 1, 1, ""), (3, 2, 2, ""), (2, 2, 1, ""), (2, 1, 2, ""), (3, 2, 3, ""), (3, 2, 2, "D0"),
                          (3, 2, 2, "row"), (2, 2, 2, "row"), (3, 1, 2, "hidden"), (3, 2, 2, "hidden"), (4, 2, 2, "D0"), (4, 1, 1, "D0")):
        a, b, c, d = (matrix(n, n, spread=3, dens=(1,)), matrix(n, m, spread=2, dens=(1,)),
                      matrix(p, n, spread=2, dens=(1,)), matrix(p, m, spread=2, dens=(1, 2)))
        if kind in ("D0", "hidden"):
            d = sympy.zeros(p, m)
        if kind == "row" and p > 1:
            c[1, :], d[1, :] = 2 * c[0, :], 2 * d[0, :]
        if kind == "hidden":
            a[0, 1:] = sympy.zeros(1, n - 1)
            b[0, :] = sympy.zeros(1, m)
        pencil = Matrix([[a - s * sympy.eye(n), b], [c, d]])
        rank = min(pencil.shape)
        while True:
            common = Poly(0, s, domain=QQ)
            for rows in combinations(range(pencil.rows), rank):
                for cols in combinations(range(pencil.cols), rank):
                    common = sympy.gcd(common, Poly(pencil.extract(rows, cols).det(method="berkowitz"), s, domain=QQ))
            if not common.is_zero:
                break
            rank -= 1
        yield {"A": text(a), "B": text(b), "C": text(c), "D": text(d), "normal_rank": rank - n,
               "zeros": coefficients(common.monic().as_expr())}


def jordan():
    for sizes, eigen in (((3, 1), Rational(1, 2)), ((2, 2, 1), Rational(0)), ((4,), Rational(-1)), ((1, 1, 1), Rational(3))):
        n = sum(sizes) + 1
        j = sympy.zeros(n, n)
        at = 0
        for size in sizes:
            for k in range(size):
                j[at + k, at + k] = eigen
                if k + 1 < size:
                    j[at + k, at + k + 1] = 1
            at += size
        j[n - 1, n - 1] = 7
        while True:
            t = matrix(n, n, spread=2, dens=(1,))
            if t.det() != 0:
                break
        a = t * j * t.inv()
        shift = a - eigen * sympy.eye(n)
        ranks = [n] + [(shift**k).rank() for k in range(1, n + 1)]
        yield {"matrix": text(a), "factor": coefficients(s - eigen), "ranks": ranks}


def roots():
    mpmath.mp.dps = 60
    lists = [[1, -10, 35, -50, 24.5], [1, 0, 0, 0, 0, -2], [1, 3, 5, 7, 11, 13], [4, 0, 12, 0, 9, 0, 1],
             [1] + [0] * 9 + [-200, 20, -0.5], [1, -1, 1e-8, 3e-30]]
    for list_ in lists:
        exact = [Rational(str(x)) if isinstance(x, float) else Rational(x) for x in list_]
        found = mpmath.polyroots([mpmath.mpf(x.p) / x.q for x in exact], maxsteps=2000, extraprec=2000)
        yield {"p": [str(x) for x in exact], "roots": [[mpmath.nstr(r.real, 40), mpmath.nstr(r.imag, 40)] for r in map(mpmath.mpmathify, found)]}


def main():
    reference = {"header": {"tool": "sympy, mpmath", "version": f"{sympy.__version__}, {mpmath.__version__}",
                            "command": "python3 generate_sympy_reference.py", "date": sys.argv[1]},
                 "matrices": list(matrices()), "polynomials": list(polynomials()), "zeros": list(zeros()),
                 "jordan": list(jordan()), "roots": list(roots())}
    with open("sympy_reference.json", "w") as out:
        json.dump(reference, out, separators=(",", ":"), default=int)
        out.write("\n")


main()
