"""Derivatives of the models of reference-cases.json to 50 digits.

Run with Debian's python3-mpmath:  /usr/bin/python3 derivatives.py > derivatives.json

The Go text of each model is turned into Python line by line and evaluated on
Taylor polynomials of degree 3 along a direction, with numbers of 60 digits.
Beside each coefficient the sum of the absolute values of its terms is carried:
that is what errors are measured against. Nothing here shares code with the tape.
"""

import json
import os
import re

import mpmath
from mpmath import mp, mpf

mp.dps = 60
DEGREE = 3


class Jet:
    """A polynomial in the direction's parameter, with sums of absolute terms."""

    def __init__(self, c, s=None):
        self.c = c
        self.s = s if s is not None else [abs(v) for v in c]

    @staticmethod
    def of(v):
        return v if isinstance(v, Jet) else Jet([mpf(v)] + [mpf(0)] * DEGREE)

    def __add__(self, o):
        o = Jet.of(o)
        return Jet([a + b for a, b in zip(self.c, o.c)], [a + b for a, b in zip(self.s, o.s)])

    def __neg__(self):
        return Jet([-a for a in self.c], self.s)

    def __sub__(self, o):
        return self + (-Jet.of(o))

    def __mul__(self, o):
        o = Jet.of(o)
        return Jet(product(self.c, o.c), product(self.s, o.s))

    def __truediv__(self, o):
        return self * compose(lambda x: 1 / x, Jet.of(o))

    def __radd__(self, o):
        return Jet.of(o) + self

    def __rsub__(self, o):
        return Jet.of(o) - self

    def __rmul__(self, o):
        return Jet.of(o) * self

    def __rtruediv__(self, o):
        return Jet.of(o) / self


def product(a, b):
    return [sum(a[i] * b[k - i] for i in range(k + 1)) for k in range(DEGREE + 1)]


def compose(g, x):
    """g(x) from the Taylor coefficients of g, which mpmath finds numerically."""
    with mp.workdps(140):
        t = mpmath.taylor(g, x.c[0], DEGREE)
    d, e = [mpf(0)] + x.c[1:], [mpf(0)] + x.s[1:]
    c, s = [mpf(0)] * (DEGREE + 1), [mpf(0)] * (DEGREE + 1)
    power, absolute = Jet.of(1).c, Jet.of(1).s
    for v in t:
        c = [u + v * w for u, w in zip(c, power)]
        s = [u + abs(v) * w for u, w in zip(s, absolute)]
        power, absolute = product(power, d), product(absolute, e)
    # A constant with a large argument is no better than its argument.
    s[0] = max(s[0], abs(t[1]) * abs(x.c[0]))
    return Jet(c, s)


def absolute(x):
    return -x if x.c[0] < 0 else x


class Maths:
    Pi = mpmath.pi

    def __getattr__(self, name):
        table = {
            "Exp": mpmath.exp, "Log": mpmath.log, "Sin": mpmath.sin, "Cos": mpmath.cos, "Tan": mpmath.tan,
            "Sqrt": mpmath.sqrt, "Tanh": mpmath.tanh, "Cosh": mpmath.cosh, "Sinh": mpmath.sinh,
            "Expm1": mpmath.expm1,
        }
        if name == "Abs":
            return absolute
        return lambda x: compose(table[name], Jet.of(x))


class Fields:
    pass


def fields(text, name):
    m = re.search(r"type %s struct \{(.*?)\n\}" % name, text, re.S)
    return [line.split()[0] for line in m.group(1).strip().split("\n")] if m else []


def translate(text):
    """Turns the Go of the reference models, which uses little of the language, into Python."""
    text = re.sub(r"type \w+ struct \{.*?\n\}\n", "", text, flags=re.S)
    text = re.sub(r"//.*", "", text)
    text = re.sub(r"return State\{\n(.*?)\n(\t*)\}", lambda m: "return State{" + m.group(1).replace("\n", " ").replace("\t", "") + "}", text, flags=re.S)
    out, depth = [], 0
    for line in text.split("\n"):
        line = line.strip()
        if not line:
            continue
        if line == "}":
            depth -= 1
            continue
        block = line.endswith("{")
        if block:
            line = line[:-1].strip()
        line = line.replace(":=", "=")
        line = re.sub(r"^func (\w+)\(([^)]*)\).*$", lambda m: "def %s(%s)" % (m.group(1), ", ".join(p.split()[0] for p in m.group(2).split(","))), line)
        line = re.sub(r"^for (\w+) = range (\w+)$", r"for \1 in range(len(\2))", line)
        line = re.sub(r"State\{(.*)\}", lambda m: "dict(" + re.sub(r"(\w+): ", r"\1=", m.group(1)) + ")", line)
        line = line.replace("float64(", "mpf(")
        out.append("    " * depth + line + (":" if block else ""))
        if block:
            depth += 1
    return "\n".join(out)


def evaluator(case):
    text = case["equations"]
    env = {"math": Maths(), "mpf": mpf, "len": len}
    exec(translate(text), env)
    states, params = fields(text, "State"), fields(text, "Params")
    n = case["n"]

    def f(z):
        q = Fields()
        for name, v in zip(params, z[n:]):
            setattr(q, name, v)
        if states:
            s = Fields()
            for name, v in zip(states, z[:n]):
                setattr(s, name, v)
            r = env["model"](s, q)
            return [Jet.of(r[name]) for name in states]
        out = [None] * n
        env["model"](list(z[:n]), q, out)
        return [Jet.of(v) for v in out]

    return f, states, params


def along(f, z, a):
    return f([Jet([mpf(v), mpf(d)] + [mpf(0)] * (DEGREE - 1)) for v, d in zip(z, a)])


def unit(k, n):
    return [1 if i == k else 0 for i in range(n)]


def direction(count, shift):
    """Numbers that are exact in binary, of both signs, none zero."""
    return [(((7 * i + 3 * shift) % 11) - 5.5) / 4 for i in range(count)]


def number(v):
    return mpmath.nstr(v, 50, min_fixed=0, max_fixed=0)


def entries(values):
    """The entries that are not identically zero, each with the sum of its terms."""
    return {str(k): [number(v), mpmath.nstr(s, 4, min_fixed=0, max_fixed=0)] for k, (v, s) in enumerate(values) if s != 0}


def point(case, f, z, n, free):
    m = len(z) - n
    total = n + m
    columns = [along(f, z, unit(k, total)) for k in range(total)]
    jac = [(columns[k][i].c[1], columns[k][i].s[1]) for i in range(n) for k in list(range(n)) + [n + free]]
    pars = [(columns[n + j][i].c[1], columns[n + j][i].s[1]) for i in range(n) for j in range(m)]
    w, a = direction(n, 1), direction(n + 1, 2)
    # Along a in (x, p_free).
    full = a[:n] + [a[n] if j == free else 0 for j in range(m)]
    t = along(f, z, full)
    second = [(2 * v.c[2], 2 * v.s[2]) for v in t]
    third = [(6 * v.c[3], 6 * v.s[3]) for v in t]
    adjoint = []
    for k in list(range(n)) + [n + free]:
        up = along(f, z, [x + e for x, e in zip(full, unit(k, total))])
        down = along(f, z, [x - e for x, e in zip(full, unit(k, total))])
        v = sum(wi * (p.c[2] - q.c[2]) / 2 for wi, p, q in zip(w, up, down))
        s = sum(abs(wi) * (p.s[2] + q.s[2]) / 2 for wi, p, q in zip(w, up, down))
        adjoint.append((v, s))
    value = [(v.c[0], v.s[0]) for v in t]
    return {
        "z": z, "w": w, "a": a, "value": entries(value), "jacobian": entries(jac), "parameters": entries(pars),
        "second": entries(second), "third": entries(third), "adjoint": entries(adjoint),
    }


def state(raw, states):
    if isinstance(raw, dict):
        return [float(raw[name]) for name in states]
    return [float(v) for v in raw]


def points(case, states, params):
    base = {k: float(v) for k, v in case["params"].items()}

    def place(at, more, raw):
        values = dict(base)
        values.update({k: float(v) for k, v in (more or {}).items()})
        values.update({k: float(v) for k, v in at.items() if k in params})
        return state(raw, states) + [values[k] for k in params]

    yield place(case["start"]["at"], None, case["start"]["state"])
    for fact in [x for x in case["facts"] if x.get("state")][:1 if case["n"] > 20 else 3]:
        z = place(fact["at"], fact.get("params"), fact["state"])
        yield z
        # And a place that is special in no way.
        yield [v * (1 + 0.01 * ((3 * i) % 7 - 3)) + 0.001 for i, v in enumerate(z)]


def main():
    with open(os.path.join(os.path.dirname(os.path.abspath(__file__)), "reference-cases.json")) as file:
        cases = json.load(file)["cases"]
    out = []
    for case in cases:
        f, states, params = evaluator(case)
        free = params.index(case["follow"]["param"])
        found = [point(case, f, z, case["n"], free) for z in points(case, states, params)]
        out.append({"id": case["id"], "free": free, "points": found})
    lines = [json.dumps(case, separators=(",", ":")) for case in out]
    print("[" + ",\n".join(lines) + "]")


main()
