"""Tail of the one-dimensional box packet, computed from its definition.

The box packet psi0 = 1/sqrt(2 a) on [-a, a] evolves with the energy omega(p) = sqrt(m^2 + p^2):

    psi(x, t) = (2 pi)^(-1/2) Int dp exp(i p x - i omega t) phi(p),
    phi(p)    = (2 pi)^(-1/2) Int dx exp(-i p x) psi0(x) = sin(p a) / (p sqrt(pi a)),
    P(|x| > R) = 2 Int_R^inf |psi(x, t)|^2 dx.

The script evaluates exactly these two integrals, one inside the other. The momentum contour is only tilted, so that
the oscillating factor decays; it is never folded onto the branch cut, and no Bessel function and no propagator is
used, because those are the routes of the program that these values are meant to judge.

Momentum integral. With x = a + t + s the edges' phases join to exp(i p (s + t)) 2 i sin(p a) exp(i p a).

* m > 0: p = m sinh(eta), omega = m cosh(eta), eta = u + i alpha. One line above eta = 0 with 0 < alpha < pi/2 makes
  exp(i p s - i m t exp(-eta)) decay double-exponentially at both ends, since p (s + t) - omega t = p s - m t exp(-eta).
* m = 0: omega = |p| has a corner at p = 0, so each half line turns upwards about p = 0, to p = rho exp(i alpha)
  and p = -rho exp(-i alpha), and p (s + t) - |p| t is p s on the right and p (s + 2 t) on the left.

Either way psi(s) = Sum_j A_j exp(i p_j s) with A_j, p_j independent of s: the trapezoid rule in u or log(rho).

Position integral. |psi|^2 has a log^2 singularity on the light cone, s = 0. With R = a + t + gap, s = gap + r, the
rule runs over r itself, r = exp(v - exp(v0 - v)), which falls double-exponentially to 0. The distance to the cone is
therefore never formed by a subtraction. The factor 2 for the two sides is exact: psi0 is even.

Both rules are the trapezoid rule for functions analytic in a strip; its error exp(-2 pi d / h) and the
double-exponential substitutions: H. Takahasi and M. Mori, Publ. RIMS 9 (1974) 721-741, and L. N. Trefethen and
J. A. C. Weideman, SIAM Review 56 (2014) 385-458 (both cited from memory). The errors of the rules are estimated here,
not proven. Each value is computed twice, with other tilts, steps, starting points and precisions, and only digits on
which the two runs agree are recorded.

    python box_tail_from_definition.py --verify 6     recompute the first six values and compare with the file
    python box_tail_from_definition.py --write        recompute everything and write the file
"""

import argparse
import json
import math
import platform
import sys
import time
from fractions import Fraction
from pathlib import Path

import flint
from flint import acb, arb, ctx, fmpq

FILE = Path(__file__).resolve().parents[2] / "references" / "box_tail_from_definition.json"

# Digits asked of each rule, and the most that is written down: the difference is the safety margin.
WANTED_DIGITS = 44
MOST_DIGITS = 40
LEAST_DIGITS = 32

# The two runs share no node: tilt and starting point differ, and so do both steps and the precision.
RUNS = (
    {"tilt": (1, 3), "finer": 1.00, "start": 0.5, "extra_bits": 64},
    {"tilt": (1, 4), "finer": 1.13, "start": 0.2, "extra_bits": 112},
)

# half width a, mass m, time t, and R ("beyond") where it is not the light cone. The quick ones come first.
CASES = (
    ("1", "1", "1", None),
    ("1/10", "1", "1", None),
    ("1/10", "1", "100", None),
    ("5", "1", "5", None),
    ("1", "1", "1", "12"),
    ("1", "0", "1", None),
    ("1", "1", "1", "20"),
    ("1", "1", "1/10", None),
    ("1", "1", "10", None),
    ("3", "1", "1/2", None),
    ("1/100", "1", "1", None),
    ("20", "1", "20", None),
    ("1", "1", "1000", None),
    ("1/1000000", "1", "1", None),
    ("2", "1", "1000", None),
    ("1", "1", "1/1000000", None),
    ("1/1000", "1", "1/1000", None),
    ("100", "1", "1", None),
    ("1", "1", "1", "2.000001"),
    ("1", "1", "1", "2.5"),
    ("1", "1", "1", "3"),
    ("1", "1", "1", "60"),
    ("1/10", "1", "1", "1.2"),
    ("1/10", "1", "100", "101"),
    ("5", "1", "5", "12.5"),
    ("1", "2", "1", None),
    ("1/2", "3", "7/4", None),
    ("2", "1/2", "2", None),
    ("7/3", "1/100", "5/7", None),
    ("1", "10", "1", None),
    ("3/10", "25", "1/5", None),
    ("1", "1/1000000", "1", None),
    ("1", "2", "3", "9/2"),
    ("1/4", "40", "1/8", "1/2"),
    ("1", "1/3", "1", "30"),
    ("1", "0", "37/5", None),
    ("1", "0", "1000", None),
    ("1/10", "0", "1/100", None),
    ("1", "0", "1", "5/2"),
    ("1", "0", "1", "100"),
    ("2", "0", "9", "23/2"),
    ("1", "0", "1000000", None),
)


def as_arb(number):
    """The ball at the present precision around an exact fraction."""
    return arb(fmpq(number.numerator, number.denominator))


def massive_nodes(half_width, mass, time_, nearest, digits, run):
    """Pairs (A_j, i p_j) of the momentum rule for m > 0.

    `nearest` is the smallest distance from the cone, as a logarithm, at which psi is wanted: the nearer, the more
    slowly the integrand falls at large p.
    """
    numerator, denominator = run["tilt"]
    alpha = math.pi * numerator / denominator
    cut = digits * math.log(10)
    # The integrand is analytic and bounded for 0 < Im eta < pi, apart from poles at the rims.
    step = 2 * math.pi * alpha / (cut + 2) / run["finer"]
    sine = math.sin(alpha)
    # m t exp(-u) sin(alpha) > cut on the left; m s exp(u) sin(alpha) / 2 > cut on the right.
    left = math.log(float(mass * time_) * sine / (1.02 * cut))
    right = math.log(2.1 * cut / sine) - math.log(float(mass)) - nearest
    step_ball, m, a = arb(step), as_arb(mass), as_arb(half_width)
    m_t = as_arb(mass * time_)
    tilt = arb.pi() * numerator / denominator
    nodes = []
    imaginary_unit = acb(0, 1)
    for index in range(math.floor(left / step), math.ceil(right / step) + 1):
        eta = acb(step_ball * index, tilt)
        grown = eta.exp()
        shrunk = 1 / grown
        p = m * (grown - shrunk) / 2
        coth = (grown + shrunk) / (grown - shrunk)
        # dp / p = coth(eta) d eta; sin keeps its relative accuracy when p a is tiny.
        edges = 2 * imaginary_unit * (p * a).sin() * (imaginary_unit * p * a).exp()
        weight = step_ball * coth * edges * (-imaginary_unit * m_t * shrunk).exp()
        nodes.append((weight, imaginary_unit * p))
    return nodes


def massless_nodes(half_width, time_, nearest, digits, run):
    """Pairs (A_j, i p_j) for m = 0: two half lines that meet at p = 0, in u = log(rho)."""
    numerator, denominator = run["tilt"]
    alpha = math.pi * numerator / denominator
    cut = digits * math.log(10)
    step = 2 * math.pi * alpha / (cut + 2) / run["finer"]
    a, t = as_arb(half_width), as_arb(time_)
    # The integrand is about 2 a rho near 0, and the two half lines nearly cancel there.
    left = -cut - math.log(float(half_width)) - 3
    right = math.log(1.02 * cut / math.sin(alpha)) - nearest
    step_ball = arb(step)
    imaginary_unit = acb(0, 1)
    turn = (imaginary_unit * arb.pi() * numerator / denominator).exp()
    nodes = []
    for index in range(math.floor(left / step), math.ceil(right / step) + 1):
        rho = (step_ball * index).exp()
        for sign in (1, -1):
            p = rho * (turn if sign > 0 else -1 / turn)
            weight = sign * step_ball * 2 * imaginary_unit * (p * a).sin() * (imaginary_unit * p * a).exp()
            if sign < 0:
                weight = weight * (2 * imaginary_unit * p * t).exp()
            nodes.append((weight, imaginary_unit * p))
    return nodes


def by_decay(nodes):
    """The nodes as (Im p_j, A_j, i p_j), slowest decay first, so that a sum can stop early."""
    return sorted(((-float(exponent.real.mid()), weight, exponent) for weight, exponent in nodes), key=lambda n: n[0])


def momentum_sum(nodes, distance, cut):
    """Sum of A_j exp(i p_j s), left as soon as the terms are below the working accuracy."""
    total = acb(0)
    nearness = float(distance.mid())
    for rate, weight, exponent in nodes:
        if rate * nearness > cut:
            break
        total += weight * (exponent * distance).exp()
    return total


def tail(half_width, mass, time_, beyond, run):
    """P(|x| > R) as a ball; its radius holds the rounding, not the error of the two rules."""
    cone = half_width + time_
    gap = Fraction(0) if beyond is None else beyond - cone
    if gap < 0:
        raise ValueError("R has to be on or beyond the light cone")
    # Beyond a gap psi is of the size exp(-m sqrt(gap (gap + 2 t))), but the tilted integrand is not as small.
    depth = float(mass) * math.sqrt(float(gap * (gap + 2 * time_))) / math.log(10)
    digits = WANTED_DIGITS + depth + max(0.0, -math.log10(float(half_width)) / 2)
    ctx.prec = math.ceil(digits * math.log2(10)) + run["extra_bits"]
    cut = digits * math.log(10)

    lengths = [half_width, time_] + ([1 / mass, 1 / (mass * mass * time_)] if mass else []) + ([gap] if gap else [])
    v0 = math.log(float(min(lengths))) + run["start"]
    # |psi|^2 grows at most like log^2 towards r = 0: r = exp(v - exp(v0 - v)) has to reach e^-cut times the scale.
    first = v0 - math.log(cut + 5)
    if mass:
        # exp(-2 m r) and faster: stop where the exponent passes the cut.
        last = math.log(0.55 * cut / float(mass))
    else:
        # |psi|^2 dr falls like r^-3 dlog(r) beyond every length.
        last = math.log(float(half_width + time_ + gap)) + cut / 3 + 1
    step = math.pi ** 2 / (cut + 4) / run["finer"]

    indices = range(math.floor((first - 0.5 * step) / step), math.ceil(last / step) + 1)
    lowest = indices[0] * step
    nearest = lowest - math.exp(v0 - lowest)
    if gap:
        nearest = max(nearest, math.log(float(gap)))
    if mass:
        nodes = by_decay(massive_nodes(half_width, mass, time_, nearest, digits, run))
    else:
        nodes = by_decay(massless_nodes(half_width, time_, nearest, digits, run))

    total, step_ball, start = arb(0), arb(step), arb(v0)
    gap_ball = as_arb(gap)
    for index in indices:
        v = step_ball * index
        bend = (start - v).exp()
        r = (v - bend).exp()
        s = gap_ball + r
        psi = momentum_sum(nodes, s, cut + 10)
        total += (psi.real ** 2 + psi.imag ** 2) * r * (1 + bend)
    # psi = Sum / (2 pi i sqrt(2 a)); two equal sides.
    return 2 * total * step_ball / (8 * arb.pi() ** 2 * as_arb(half_width))


def to_fraction(ball):
    """Exact value of a ball's midpoint."""
    mantissa, exponent = ball.mid().man_exp()
    return Fraction(int(mantissa)) * Fraction(2) ** int(exponent)


def round_decimal(value, digits):
    """The fraction rounded to so many significant digits, and half a unit of its last digit."""
    exponent = math.floor(math.log10(value.numerator) - math.log10(value.denominator))
    scaled = round(value / Fraction(10) ** (exponent - digits + 1))
    if scaled >= 10 ** digits:
        exponent += 1
        scaled = round(value / Fraction(10) ** (exponent - digits + 1))
    elif scaled < 10 ** (digits - 1):
        exponent -= 1
        scaled = round(value / Fraction(10) ** (exponent - digits + 1))
    text = str(scaled)
    unit = Fraction(10) ** (exponent - digits + 1)
    if -5 < exponent < 0:
        return "0." + "0" * (-exponent - 1) + text, unit / 2
    if exponent == 0:
        return text[0] + "." + text[1:], unit / 2
    return f"{text[0]}.{text[1:]}e{exponent}", unit / 2


def evaluate(case):
    """Both runs: the value as an exact fraction and how many significant digits they agree on."""
    half_width, mass, time_ = (Fraction(text) for text in case[:3])
    beyond = None if case[3] is None else Fraction(case[3])
    results = []
    for run in RUNS:
        ball = tail(half_width, mass, time_, beyond, run)
        middle = to_fraction(ball)
        radius = to_fraction(ball.rad())
        results.append((middle, radius))
    spread = abs(results[0][0] - results[1][0]) + results[0][1] + results[1][1]
    value = results[1][0]
    relative = float(spread / value)
    # A twentieth of a unit in the last digit: the rounded value is then right to within 0.55 units.
    digits = MOST_DIGITS if relative == 0 else math.floor(-math.log10(relative * 20))
    return value, min(MOST_DIGITS, digits), spread


def write():
    """Recompute all values and write the reference file."""
    values = []
    for case in CASES:
        started = time.perf_counter()
        value, digits, spread = evaluate(case)
        text, _ = round_decimal(value, digits)
        agreed = -math.log10(float(spread / value))
        print(f"a={case[0]} m={case[1]} t={case[2]} R={case[3] or 'a+t'}: {text}  "
              f"({agreed:.1f} digits agree, {time.perf_counter() - started:.1f} s)", flush=True)
        if digits < LEAST_DIGITS:
            print(f"only {digits} digits: nothing written", file=sys.stderr)
            return 1
        values.append({"half_width": case[0], "mass": case[1], "time": case[2], "beyond": case[3], "side": "both",
                       "value": text, "digits": digits})
    record = {
        "source": "tests/oracles/box_tail_from_definition.py --write; "
                  f"Python {platform.python_version()}, python-flint {flint.__version__} "
                  f"(FLINT {flint.__FLINT_VERSION__}); "
                  "P(|x| > R) = 2 Int_R^inf |psi|^2 dx with psi = (2 pi)^(-1/2) Int dp exp(i p x - i omega t) phi(p), "
                  "psi0 = 1/sqrt(2 a) on [-a, a], hbar = c = 1",
        "how": "Momentum contour tilted above p = 0, trapezoid rule; double-exponential rule in the distance from the "
               "light cone. Two runs per value with other tilts, steps, starting points and precisions; only digits on "
               "which both agree are kept, rounded to nearest. beyond = null means R = a + t. The rules' errors are "
               "estimated by that agreement, not proven.",
        "values": values,
    }
    FILE.write_text(json.dumps(record, indent=1) + "\n", encoding="utf-8")
    print(f"{len(values)} values written to {FILE.name}")
    return 0


def verify(count):
    """Recompute the first `count` values and compare each with the file to its last digit."""
    stored = json.loads(FILE.read_text(encoding="utf-8"))["values"]
    failures = 0
    for entry in stored[:count]:
        case = (entry["half_width"], entry["mass"], entry["time"], entry["beyond"])
        value, digits, spread = evaluate(case)
        _, half_unit = round_decimal(value, entry["digits"])
        difference = abs(Fraction(entry["value"]) - value)
        # Half a unit from the rounding of the file, and what the two fresh runs disagree by.
        good = difference <= half_unit * Fraction(11, 10) + spread and digits >= min(entry["digits"], LEAST_DIGITS)
        failures += not good
        print(f"{'agrees' if good else 'DIFFERS'}: a={case[0]} m={case[1]} t={case[2]} R={case[3] or 'a+t'}  file "
              f"{entry['value']} ({entry['digits']} digits), recomputed {round_decimal(value, max(digits, 1))[0]}",
              flush=True)
    print(f"{min(count, len(stored))} of {len(stored)} values recomputed from the definition, {failures} differ")
    return 1 if failures or count < 1 or not stored else 0


def main():
    parser = argparse.ArgumentParser(description="Box tail from the definition: recompute and compare, or write.")
    action = parser.add_mutually_exclusive_group(required=True)
    action.add_argument("--verify", type=int, metavar="N", help="recompute the first N values and compare")
    action.add_argument("--write", action="store_true", help="recompute all values and write the reference file")
    arguments = parser.parse_args()
    return write() if arguments.write else verify(arguments.verify)


if __name__ == "__main__":
    sys.exit(main())
