#!/usr/bin/python3
"""Writes derivatives.json: seeded random models with their Jacobians by sympy.

Run:  /usr/bin/python3 derivatives.py > derivatives.json
Each case is a model in the language and A, B, C, D at its operating point: fractions where
the equations are rational, else 40 digits from sympy's symbolic derivatives (evalf).
"""
import json
import random
from datetime import date

import sympy as sp

SEED = 20240611
rng = random.Random(SEED)


class Writer:
    """A random expression as text of the language and as a sympy expression."""

    def __init__(self, symbols, rational):
        self.symbols, self.rational = symbols, rational

    def number(self):
        q = sp.Rational(rng.randint(1, 40), rng.choice([1, 2, 4, 5, 8, 10]))
        return ("%s" % q if q.q == 1 else "(%d/%d)" % (q.p, q.q)), q

    def leaf(self):
        if rng.random() < 0.3:
            return self.number()
        name = rng.choice(list(self.symbols))
        return name, self.symbols[name]

    def make(self, depth):
        if depth == 0:
            return self.leaf()
        kinds = ["+", "-", "*", "/", "^", "neg"]
        if not self.rational:
            kinds += ["sqrt", "exp", "log", "log10", "sin", "cos", "tan", "asin", "acos", "atan",
                      "atan2", "abs", "min", "max", "if", "limit", "^f", "sin", "cos", "exp"]
        k = rng.choice(kinds)
        a, x = self.make(depth - 1)
        if k == "neg":
            return "(-%s)" % a, -x
        if k == "^":
            n = rng.choice([2, 3, -1, -2])
            return "%s^%d" % ("(%s)" % a, n), x ** n
        positive, xp = "(1 + (%s)^2)" % a, 1 + x ** 2
        inside, xi = "((%s)/(2 + (%s)^2))" % (a, a), x / (2 + x ** 2)
        one = {"sqrt": ("sqrt(%s)" % positive, sp.sqrt(xp)), "log": ("log(%s)" % positive, sp.log(xp)),
               "log10": ("log10(%s)" % positive, sp.log(xp) / sp.log(10)),
               "exp": ("exp(%s)" % inside, sp.exp(xi)), "sin": ("sin(%s)" % a, sp.sin(x)),
               "cos": ("cos(%s)" % a, sp.cos(x)), "tan": ("tan(%s)" % inside, sp.tan(xi)),
               "asin": ("asin(%s)" % inside, sp.asin(xi)), "acos": ("acos(%s)" % inside, sp.acos(xi)),
               "atan": ("atan(%s)" % a, sp.atan(x)), "abs": ("abs(%s)" % a, sp.sqrt(x ** 2))}
        if k in one:
            return one[k]
        b, y = self.make(depth - 1)
        if k == "/":
            return "(%s)/(1 + (%s)^2)" % (a, b), x / (1 + y ** 2)
        if k == "atan2":
            return "atan2(%s, 2 + (%s)^2)" % (a, b), sp.atan2(x, 2 + y ** 2)
        if k == "^f":
            return "%s^(%s)" % (positive, "sin(%s)" % b), xp ** sp.sin(y)
        if k in ("min", "max"):
            less = (x < y) if k == "min" else (x > y)
            return "%s(%s, %s)" % (k, a, b), sp.Piecewise((x, less), (y, True))
        if k in ("if", "limit"):
            c, z = self.make(depth - 1)
            if k == "if":
                return "(if %s > %s { %s } else { %s })" % (a, b, b, c), sp.Piecewise((y, x > y), (z, True))
            return "limit(%s, %s - 1, %s + 2)" % (a, b, b), \
                sp.Piecewise((y - 1, x < y - 1), (y + 2, x > y + 2), (x, True))
        return "(%s %s %s)" % (a, k, b), {"+": x + y, "-": x - y, "*": x * y}[k]


def written(value, rational):
    if rational:
        return str(sp.Rational(value))
    return str(sp.N(value, 40))


def case(number, rational):
    n, m, q = rng.randint(1, 3), rng.randint(1, 2), rng.randint(1, 2)
    names = ["x%d" % (i + 1) for i in range(n)] + ["u%d" % (i + 1) for i in range(m)]
    symbols = {name: sp.Symbol(name, real=True) for name in names}
    point = {name: sp.Rational(rng.randint(-20, 20), rng.choice([1, 2, 4, 5, 10])) for name in names}
    w = Writer(symbols, rational)
    lines, exprs = ["model m%d {" % number, "  state " + ", ".join(names[:n]), "  input " + ", ".join(names[n:])], []
    for i in range(n):
        text, e = w.make(rng.randint(2, 4))
        lines.append("  rate x%d = %s" % (i + 1, text))
        exprs.append(e)
    for i in range(q):
        text, e = w.make(rng.randint(1, 3))
        lines.append("  output y%d = %s" % (i + 1, text))
        exprs.append(e)
    lines.append("  around " + ", ".join("%s = %s" % (k, v) for k, v in point.items()))
    lines.append("}")
    at = {symbols[k]: v for k, v in point.items()}
    rows = []
    for e in exprs:
        value = sp.N(e.subs(at), 40) if not rational else e.subs(at)
        if not value.is_finite or abs(value) > 1e6:
            return None
        row = []
        for name in names:
            d = sp.diff(e, symbols[name]).subs(at)
            d = sp.Rational(d) if rational and d.is_finite else d
            if not sp.N(d, 40).is_finite or not sp.N(d, 40).is_real or abs(sp.N(d)) > 1e6:
                return None
            row.append(written(d, rational))
        rows.append(row)
    return {"name": "m%d" % number, "rational": rational, "model": "\n".join(lines),
            "A": [r[:n] for r in rows[:n]], "B": [r[n:] for r in rows[:n]],
            "C": [r[:n] for r in rows[n:]], "D": [r[n:] for r in rows[n:]]}


cases, number = [], 0
while len(cases) < 48:
    number += 1
    try:
        found = case(number, len(cases) < 16)
    except (TypeError, ValueError, ZeroDivisionError, RecursionError):
        continue
    if found and len(found["model"]) < 1500:
        cases.append(found)

print(json.dumps({"header": {"tool": "sympy", "version": sp.__version__, "command": "/usr/bin/python3 derivatives.py",
                             "seed": SEED, "date": date.today().isoformat(),
                             "content": "Jacobians of seeded random models, invented data"},
                  "cases": cases}, indent=1))
