"""Propagators and box densities at points, computed from the definitions.

    G(x, t)   = (2 pi)^-d Int d^d p exp(i p x - i omega(p) t),      omega = sqrt(m^2 + p^2), as t -> t - i0,
    psi(x, t) = (2 pi)^-1 Int dp exp(i p x - i omega t) 2 sin(p a)/(p sqrt(2 a)).

The angular integrals leave half lines in p >= 0:

    d = 1   (1/pi) Int cos(p x) exp(-i omega t) dp
    d = 2   (1/(2 pi)) Int p J_0(p r) exp(-i omega t) dp
    d = 3   (1/(2 pi^2 r)) Int p sin(p r) exp(-i omega t) dp          (r = 0: (1/(2 pi^2)) Int p^2 exp(-i omega t) dp)
    psi     (pi sqrt(2 a))^-1 (S(x + a) - S(x - a)),   S(y) = Int sin(p y)/p exp(-i omega t) dp, odd in y.

From p = 0 to 1 the integral runs along the real line. Beyond 1 the path leaves at an angle: downwards inside the cone,
where exp(-i omega t) falls faster than the oscillating factor grows; outside, the factor is split into its two
exponentials (Hankel functions for d = 2) and each runs to its own side. No path crosses the branch cut of omega on the
imaginary axis. Neither rapidities nor propagators in closed form are used, because those are the routes of the program
that these values are meant to judge; for mass zero omega = p is exact on all paths.

Gauss-Legendre rules on panels, twice with other angles, panels, nodes and precisions; digits on which the two
runs agree are recorded. The errors are estimated by that agreement, not proven.

    python points_from_definition.py --verify 6     recompute the first six values of each kind, compare
    python points_from_definition.py --write        recompute everything and write both files
"""

import argparse
import json
import pathlib
import platform
import sys
from fractions import Fraction

import flint
from flint import acb, arb, ctx

REFERENCES = pathlib.Path(__file__).resolve().parents[2] / "references"
DIGITS = 32

PROPAGATORS = [
    (d, m, t, x)
    for d in (1, 2, 3)
    for m, t, x in [
        ("1", "1", "2"),
        ("1", "2", "1"),
        ("1", "5", "0"),
        ("1/2", "3", "7/2"),
        ("3", "4", "7/2"),
        ("1", "-2", "1"),
        ("1", "1", "12"),
        ("1/100", "1", "1/3"),
        ("0", "2", "1"),
        ("0", "1", "3"),
    ]
]
DENSITIES = [
    ("1", "1", "1", "1/2"),
    ("1", "1", "5", "0"),
    ("1", "1", "5", "1"),
    ("1", "1", "5", "3"),
    ("1", "1", "5", "9/2"),
    ("1", "1", "5", "11/2"),
    ("1", "1", "5", "8"),
    ("1", "1", "1", "3"),
    ("1", "1", "-5", "-3"),
    ("1/2", "1", "1/4", "1/3"),
    ("2", "1", "1/2", "7/4"),
    ("2", "1", "1/2", "-9/4"),
    ("1/10", "1", "3", "2"),
    ("1", "5", "2", "1/3"),
    ("3", "1/2", "4", "2"),
    ("1", "0", "1/2", "0"),
    ("1", "0", "5", "3"),
    ("1", "0", "5", "9/2"),
    ("1", "0", "2", "4"),
]


I = acb(0, 1)


def number(text):
    """An exact fraction as a number of the present precision."""
    value = Fraction(text)
    return arb(value.numerator) / arb(value.denominator)


def size(value):
    """The absolute value as a double, for choosing panels."""
    return float(abs(acb(value)).mid())


class Rule:
    """Gauss-Legendre rule with a number of nodes for each panel of a straight path."""

    def __init__(self, nodes, angle, panel):
        pairs = [arb.legendre_p_root(nodes, k, weight=True) for k in range(nodes)]
        self.pairs = [(x.mid(), w.mid()) for x, w in pairs]
        self.angle, self.panel = angle, panel

    def straight(self, f, start, end, count):
        """Int f(p) dp from start to end in count equal panels."""
        half = (acb(end) - acb(start)) / (2 * count)
        total = acb(0)
        for k in range(count):
            middle = acb(start) + half * (2 * k + 1)
            for x, weight in self.pairs:
                total += f(middle + half * x) * weight
        return (total * half).mid()

    def leaving(self, f, sign, rate, wave):
        """Int f(p) dp from 1 to infinity at the angle, upwards or downwards; f falls at least like exp(-rate |p - 1|)."""
        length = (ctx.dps + 4) * 2.31 / rate
        count = int(length * (1 + wave) / self.panel) + 1
        direction = (I * arb(str(sign * self.angle))).exp()
        return self.straight(f, acb(1), 1 + direction * arb(str(length)), count)


def macdonald(z):
    """K_0(z) at the exact midpoint; the library loses digits at middle arguments, so it gets as many as it needs."""
    digits, point = ctx.dps, z.mid()
    value = point.bessel_k(0)
    while float((abs(value).rad() / abs(value).mid()).log().mid()) > -2.31 * digits:
        ctx.dps *= 2
        value = point.bessel_k(0)
    ctx.dps = digits
    return value.mid()


def half_line(inner, up, down, m, t, y, rule):
    """Int_0^inf inner(p) exp(-i omega t) dp with inner = up + down, up falling above the real line, down below it."""
    omega = (lambda p: p) if m == 0 else (lambda p: (m * m + p * p).sqrt())
    wave = lambda p: (-I * omega(p) * t).exp()
    # Panels grow away from p = 0, near which omega has its branch points.
    marks = [arb(0)] + [m * 2**k for k in range(20) if size(m) and m * 2**k < 1] + [arb(1)]
    count = int(2 * size(y + t)) + 2
    total = sum(rule.straight(lambda p: inner(p) * wave(p), *ends, count) for ends in zip(marks, marks[1:]))
    fall = size(t - y) * 0.9 * float(arb(str(rule.angle)).sin().mid())
    if y < t:
        return total + rule.leaving(lambda p: inner(p) * wave(p), -1, fall, size(y + t))
    total += rule.leaving(lambda p: up(p) * wave(p), 1, fall, size(y + t))
    return total + rule.leaving(lambda p: down(p) * wave(p), -1, fall, size(y + t))


def propagator(d, m, t, x, rule):
    """G(x, t) for t > 0, x >= 0."""
    pi = arb.pi()
    if d == 1:
        half = lambda sign: lambda p: (sign * I * p * x).exp() / 2
        return half_line(lambda p: (p * x).cos(), half(1), half(-1), m, t, x, rule) / pi
    if d == 2:
        inner = lambda p: p * (p * x).bessel_j(0)
        # H_0^(1)(z) = (2/(pi i)) K_0(-i z), H_0^(2)(z) = -(2/(pi i)) K_0(i z): DLMF 10.27.8.
        half = lambda sign: lambda p: p * sign * macdonald(-sign * I * p * x) / (pi * I)
        return half_line(inner, half(1), half(-1), m, t, x, rule) / (2 * pi)
    if x == 0:
        return half_line(lambda p: p * p, None, None, m, t, x, rule) / (2 * pi**2)
    half = lambda sign: lambda p: sign * p * (sign * I * p * x).exp() / (2 * I)
    return half_line(lambda p: p * (p * x).sin(), half(1), half(-1), m, t, x, rule) / (2 * pi**2 * x)


def edge(m, t, y, rule):
    """S(y)."""
    if y < 0:
        return -edge(m, t, -y, rule)
    if y == 0:
        return acb(0)
    half = lambda sign: lambda p: sign * (sign * I * p * y).exp() / (2 * I * p)
    return half_line(lambda p: (p * y).sin() / p, half(1), half(-1), m, t, y, rule)


def amplitude(a, m, t, x, rule):
    """psi(x, t) for t > 0."""
    return (edge(m, t, x + a, rule) - edge(m, t, x - a, rule)) / (arb.pi() * (2 * a).sqrt())


RUNS = [(DIGITS + 22, 44, 0.875, 6), (DIGITS + 30, 50, 1.0625, 5)]
RULES = {}


def twice(evaluate):
    """The value from two runs, and the number of digits on which they agree, relative to the absolute value."""
    values = []
    for digits, nodes, angle, panel in RUNS:
        ctx.dps = digits
        if digits not in RULES:
            RULES[digits] = Rule(nodes, angle, panel)
        values.append(acb(evaluate(RULES[digits])).mid())
    ratio = abs(values[0] - values[1]).mid() / abs(values[1]).mid()
    agreed = DIGITS + 1 if ratio == 0 else -exponent(ratio) - 1
    return values[1], min(agreed - 1, DIGITS)


def exponent(value):
    """The decimal exponent of a positive number."""
    return int(float((value.log() / arb(10).log()).mid()) // 1)


def fixed(value, scale, digits):
    """The value rounded to `digits` digits relative to `scale`."""
    place = digits - exponent(scale) - 1
    scaled = value * arb(10) ** place
    return f"{int((scaled + arb(1) / 2).mid().floor().unique_fmpz())}e{-place}"


def record(keys, value, digits, conjugate):
    whole = abs(value).mid()
    if conjugate:
        value = value.conjugate()
    return {
        **keys,
        "real": fixed(value.real, whole, digits),
        "imaginary": fixed(value.imag, whole, digits),
        "square": fixed(whole**2, whole**2, digits),
        "digits": digits,
    }


def propagator_record(case):
    d, m, t, x = case
    # Fractions are formed at the precision of each run.
    evaluate = lambda rule: propagator(d, number(m), abs(number(t)), number(x), rule)
    value, digits = twice(evaluate)
    return record({"dimension": d, "mass": m, "time": t, "x": x}, value, digits, t.startswith("-"))


def density_record(case):
    a, m, t, x = case
    evaluate = lambda rule: amplitude(number(a), number(m), abs(number(t)), number(x), rule)
    value, digits = twice(evaluate)
    return record({"half_width": a, "mass": m, "time": t, "x": x}, value, digits, t.startswith("-"))


KINDS = {
    "propagator_from_definition.json": (PROPAGATORS, propagator_record),
    "density_from_definition.json": (DENSITIES, density_record),
}


def write():
    for name, (cases, make) in KINDS.items():
        values = []
        for case in cases:
            values.append(make(case))
            print(name, case, values[-1]["digits"], flush=True)
        text = {
            "source": f"tests/oracles/points_from_definition.py --write; Python {platform.python_version()}, "
            f"python-flint {flint.__version__} (FLINT {flint.__FLINT_VERSION__}); hbar = c = 1",
            "how": __doc__.split("\n\n")[1].strip()
            + "\nRotated paths in the momentum plane, Gauss-Legendre panels, two runs; 'digits' counts digits relative to "
            "the absolute value on which both agree, rounded to nearest; errors estimated by that agreement, not proven.",
            "values": values,
        }
        (REFERENCES / name).write_text(json.dumps(text, indent=1) + "\n", encoding="utf-8")


def verify(count):
    failures = 0
    for name, (cases, make) in KINDS.items():
        known = json.loads((REFERENCES / name).read_text(encoding="utf-8"))["values"]
        for case, expected in list(zip(cases, known))[:count]:
            if make(case) != expected:
                print(f"{name}: {case} differs", file=sys.stderr)
                failures += 1
    print(f"{failures} differences")
    return 1 if failures else 0


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("--verify", type=int, metavar="N")
    parser.add_argument("--write", action="store_true")
    arguments = parser.parse_args()
    if arguments.write:
        write()
        return 0
    return verify(arguments.verify or 3)


if __name__ == "__main__":
    sys.exit(main())
