"""Functions of one variable and their first four derivatives to 50 digits.

Run with Debian's python3-mpmath:  /usr/bin/python3 functions.py > functions.json

Each entry has the Go expression in x, the place, and the values of the function
and its derivatives of order 1 to 4.
"""

import json

import mpmath
from mpmath import mp, mpf

mp.dps = 60


def rise(x):
    return x / mpmath.expm1(x) if x else mpf(1)


def exprel(x):
    return mpmath.expm1(x) / x if x else mpf(1)


CASES = [
    ("math.Exp(x)", mpmath.exp, [-30, -1.5, 0.1, 20]),
    ("math.Exp2(x)", lambda x: mpf(2) ** x, [-30, -1.5, 0.1, 20]),
    ("math.Expm1(x)", mpmath.expm1, [-30, -1e-8, 0.1, 20]),
    ("math.Log(x)", mpmath.log, [1e-9, 0.7, 1.5, 1e12]),
    ("math.Log2(x)", lambda x: mpmath.log(x, 2), [1e-9, 0.7, 1.5, 1e12]),
    ("math.Log10(x)", mpmath.log10, [1e-9, 0.7, 1.5, 1e12]),
    ("math.Log1p(x)", mpmath.log1p, [-0.9, 1e-9, 0.7, 1e12]),
    ("math.Sin(x)", mpmath.sin, [-2, 1e-5, 0.7, 30]),
    ("math.Cos(x)", mpmath.cos, [-2, 1e-5, 0.7, 30]),
    ("math.Tan(x)", mpmath.tan, [-1.2, 1e-5, 0.7, 4]),
    ("math.Asin(x)", mpmath.asin, [-0.99, 1e-5, 0.7]),
    ("math.Acos(x)", mpmath.acos, [-0.99, 1e-5, 0.7]),
    ("math.Atan(x)", mpmath.atan, [-20, 1e-5, 0.7]),
    ("math.Sinh(x)", mpmath.sinh, [-20, 1e-5, 0.7]),
    ("math.Cosh(x)", mpmath.cosh, [-20, 1e-5, 0.7]),
    ("math.Tanh(x)", mpmath.tanh, [-20, 1e-5, 0.7, 3]),
    ("math.Asinh(x)", mpmath.asinh, [-20, 1e-5, 0.7]),
    ("math.Acosh(x)", mpmath.acosh, [1.01, 1.7, 300]),
    ("math.Atanh(x)", mpmath.atanh, [-0.99, 1e-5, 0.7]),
    ("math.Cbrt(x)", lambda x: mpmath.sign(x) * mpmath.root(abs(x), 3), [-8.5, 1e-6, 0.7]),
    ("math.Sqrt(x)", mpmath.sqrt, [1e-6, 0.7, 1e10]),
    ("math.Erf(x)", mpmath.erf, [-3, 1e-5, 0.7]),
    ("math.Erfc(x)", mpmath.erfc, [-3, 1e-5, 0.7, 5]),
    ("math.Erfinv(x)", mpmath.erfinv, [-0.9, 1e-5, 0.7]),
    ("math.Gamma(x)", mpmath.gamma, [-1.5, 0.3, 2.5, 11.25]),
    ("lgamma(x)", lambda x: mpmath.log(abs(mpmath.gamma(x))), [-1.5, 0.3, 2.5, 40]),
    ("math.J0(x)", lambda x: mpmath.besselj(0, x), [0.5, 3, 12]),
    ("math.J1(x)", lambda x: mpmath.besselj(1, x), [0.5, 3, 12]),
    ("math.Jn(4, x)", lambda x: mpmath.besselj(4, x), [0.5, 3, 12]),
    ("math.Y0(x)", lambda x: mpmath.bessely(0, x), [0.5, 3, 12]),
    ("math.Yn(3, x)", lambda x: mpmath.bessely(3, x), [0.5, 3, 12]),
    ("math.Pow(x, 2.5)", lambda x: x ** mpf(2.5), [1e-6, 0.7, 40]),
    ("math.Pow(x, 3)", lambda x: x ** 3, [-4, 0, 1e-6, 0.7]),
    ("math.Pow(x, -2)", lambda x: x ** -2, [-4, 1e-6, 0.7]),
    ("math.Pow(1.5, x)", lambda x: mpf(1.5) ** x, [-4, 1e-6, 30]),
    ("math.Pow(x, x)", lambda x: x ** x, [0.1, 0.7, 5]),
    ("math.Hypot(x, 0.75)", lambda x: mpmath.sqrt(x * x + mpf(0.75) ** 2), [-4, 1e-6, 0.7]),
    ("math.Atan2(x, 0.75)", lambda x: mpmath.atan2(x, mpf(0.75)), [-4, 1e-6, 0.7]),
    ("math.Atan2(0.75, x)", lambda x: mpmath.atan2(mpf(0.75), x), [-4, 1e-6, 0.7]),
    ("x / math.Expm1(x)", rise, [-60, -2.6, -2.4, -1e-3, 1e-9, 0.3, 2.4, 2.6, 40]),
    ("x / (math.Exp(x) - 1)", rise, [-2, 1e-7, 1e-3, 0.3, 5]),
    ("x / (1 - math.Exp(-x))", lambda x: rise(-x), [-2, 1e-7, 1e-3, 0.3, 5]),
    ("0.5 * (25 - x) / (math.Exp((25-x)/8) - 1)", lambda x: 4 * rise((25 - x) / 8), [-40, 20, 24.999, 25.000001, 60]),
    ("0.125 * (x + 40) / (1 - math.Exp(-(x + 40)/8))", lambda x: rise(-(x + 40) / 8), [-60, -40.001, -39.999999, 10]),
    ("math.Expm1(x) / x", exprel, [-30, -2, 1e-9, 1e-3, 0.3, 5, 45]),
    ("(math.Exp(2*x) - 1) / x", lambda x: 2 * exprel(2 * x), [-3, 1e-9, 1e-3, 0.3, 5]),
]


def number(v):
    return mpmath.nstr(v, 50, min_fixed=0, max_fixed=0)


def main():
    lines = []
    for text, f, places in CASES:
        for x in places:
            with mp.workdps(160):
                t = mpmath.taylor(f, mpf(x), 4)
                values = [number(v * mpmath.factorial(k)) for k, v in enumerate(t)]
            lines.append(json.dumps({"f": text, "x": x, "values": values}, separators=(",", ":")))
    print("[" + ",\n".join(lines) + "]")


main()
