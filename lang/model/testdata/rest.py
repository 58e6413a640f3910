#!/usr/bin/python3
"""Writes rest.json: points of rest of nonlinear models by SciPy's root finder.

Run:  /usr/bin/python3 rest.py > rest.json
The equations stand twice, in the language and in Python; the solution is that of
scipy.optimize.root (hybr, xtol 1e-14) from zero, polished with mpmath.findroot at 30
digits. All data are invented.
"""
import json
from datetime import date

import mpmath as mp
import scipy
from scipy.optimize import root

mp.mp.dps = 30
CASES = []


def case(name, text, f, start, unknowns):
    """f(v) gives the residuals for the unknowns in declared units; works with floats and mpf."""
    found = root(lambda v: [float(x) for x in f(*v)], start, method="hybr", options={"xtol": 1e-14})
    assert found.success or max(abs(found.fun)) < 1e-9, (name, found.message)
    fine = mp.findroot(lambda *v: f(*v), [mp.mpf(float(x)) for x in found.x], tol=1e-25)
    values = [mp.nstr(fine[i], 25) for i in range(len(unknowns))]
    CASES.append({"name": name, "model": text, "solution": dict(zip(unknowns, values))})


case("vessels", """model vessels {
  given q = 3 m^3/h
  given k1 = 0.6 m^2/h
  state h1 in m, h2 in m
  rate h1 = (q - k1*sqrt(max(h1 - h2, 0))*sqrt(1 m))/2 m^2
  rate h2 = (k1*sqrt(max(h1 - h2, 0))*sqrt(1 m) - 1.1 m^2/h * h2)/3 m^2
  around rest
}""",
     lambda a, b: [3 - mp.mpf("0.6") * mp.sqrt(max(a - b, 0)), mp.mpf("0.6") * mp.sqrt(max(a - b, 0)) - mp.mpf("1.1") * b],
     [27.0, 2.0], ["h1", "h2"])
case("stirred vessel", """model stirred {
  given k = 7.2e10 1/min
  given E = 8750 K
  given H = 60 K
  state c range 1, T in K range 400
  rate c = ((1 - c) - 1 min * k*exp(-E/max(T, 200 K))*c)/1 min
  rate T = ((350 K - T) + H*1 min * k*exp(-E/max(T, 200 K))*c - 2.1*(T - 305 K))/1 min
  around rest
}""",
     lambda c, T: [1 - c - mp.mpf(72000000000) * mp.exp(-8750 / T) * c,
                   350 - T + 60 * mp.mpf(72000000000) * mp.exp(-8750 / T) * c - mp.mpf("2.1") * (T - 305)],
     [0.9, 320.0], ["c", "T"])
case("loaded arm", """model arm {
  given m = 2 kg
  given l = 0.4 m
  given k = 9 N*m/rad
  state a in deg range 90, w in deg/s range 90
  rate a = w
  rate w = (m*9.81 m/s^2 * l*cos(a) - k*a - 0.3 N*m*s/rad * w)/(m*l^2)
  around rest
}""", lambda a, w: [w, 2 * mp.mpf("9.81") * mp.mpf("0.4") * mp.cos(a * mp.pi / 180) - 9 * a * mp.pi / 180 - mp.mpf("0.3") * w * mp.pi / 180],
     [30.0, 0.0], ["a", "w"])
case("magnet", """model magnet {
  given m = 0.05 kg
  given k = 6e-5 N*m^2/A^2
  input i in A range 1
  state y in mm range 10, v in m/s range 1
  rate y = v
  rate v = 9.81 m/s^2 - k*(i/y)^2/m
  around y = 8 mm find i
}""", lambda i: [mp.mpf("9.81") - mp.mpf("6e-5") * (i / mp.mpf("0.008")) ** 2 / mp.mpf("0.05")], [0.7], ["i"])
case("drag", """model drag {
  given m = 900 kg
  input F in N range 3000
  state v in m/s range 30, x in m range 100
  rate v = (F - 120 N * sign(v) - 0.41 N*s^2/m^2 * v*abs(v) - 11 N*s/m * v)/m
  rate x = v
  around v = 27 m/s find F
}""", lambda F: [F - 120 - mp.mpf("0.41") * 27 ** 2 - 11 * 27], [100.0], ["F"])
case("two springs", """model springs {
  state x in m, y in m
  rate x = (4 N - 3 N/m * x - 2 N/m^3 * x^3 - 5 N/m * (x - y))/(1 N*s/m)
  rate y = (5 N/m * (x - y) - 4 N/m * y - exp(y/1 m)*1 N)/(1 N*s/m)
  around rest
}""", lambda x, y: [4 - 3 * x - 2 * x ** 3 - 5 * (x - y), 5 * (x - y) - 4 * y - mp.exp(y)], [0.0, 0.0], ["x", "y"])
case("lamp", """model lamp {
  given C = 0.02 J/K
  input P in W range 100
  state T in K range 2000
  rate T = (P - 1.4e-11 W/K^4 * (T^4 - (293 K)^4) - 0.002 W/K * (T - 293 K))/C
  around rest, P = 60 W
}""", lambda T: [60 - mp.mpf("1.4e-11") * (T ** 4 - mp.mpf(293) ** 4) - mp.mpf("0.002") * (T - 293)], [1400.0], ["T"])
case("sampled growth", """model growth {
  every 1 s
  state p range 1, q range 1
  next p = 0.9*p + 0.3*cos(q)
  next q = 0.5*q + 0.2*sin(p) + 0.1
  around rest
}""", lambda p, q: [mp.mpf("-0.1") * p + mp.mpf("0.3") * mp.cos(q), mp.mpf("-0.5") * q + mp.mpf("0.2") * mp.sin(p) + mp.mpf("0.1")],
     [1.0, 0.1], ["p", "q"])

print(json.dumps({"header": {"tool": "scipy.optimize.root, mpmath.findroot", "version": "%s, %s" % (scipy.__version__, mp.__version__),
                             "command": "/usr/bin/python3 rest.py", "date": date.today().isoformat(), "content": "points of rest, invented data"},
                  "cases": CASES}, indent=1))
