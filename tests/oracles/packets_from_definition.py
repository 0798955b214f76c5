"""Tails of compact packets made of polynomial pieces, from the definition of the evolution.

psi(x, t) = (2 pi)^(-1/2) Int dp exp(i p x - i omega(p) t) phi(p), omega(p) = sqrt(m^2 + p^2), with phi the Fourier transform of
psi0 in closed form, on a momentum contour tilted above p = 0 as in box_tail_from_definition.py; then a double-exponential
rule in the distance from the light cone. No propagator, no Bessel function, no iterated integral: nothing in common with the
program's position-space route. Every case is computed twice with other tilts, steps, starting points and precisions, and
only digits on which both agree are kept.

    python packets_from_definition.py --verify 2      recompute the first two values and compare with the file
    python packets_from_definition.py --write         recompute everything and write the file
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
from flint import acb, arb, ctx

from box_tail_from_definition import RUNS, as_arb, by_decay, momentum_sum, round_decimal, to_fraction

FILE = Path(__file__).resolve().parents[2] / "references" / "packets_from_definition.json"
WANTED_DIGITS = 30
MOST_DIGITS = 26
LEAST_DIGITS = 20

# pieces[i][n] = [re, im] multiplies (x - knots[i])^n; "radial" pieces are psi(r), "mode" is a hard-wall eigenstate.
CASES = (
    {"name": "triangle", "knots": ["-1", "0", "1"], "pieces": [[["0", "0"], ["1", "0"]], [["1", "0"], ["-1", "0"]]],
     "mass": "1", "time": "1", "distance": "0"},
    {"name": "quadratic spline", "knots": ["-1/2", "-1/6", "1/6", "1/2"],
     "pieces": [[["0", "0"], ["0", "0"], ["9", "0"]], [["1", "0"], ["6", "0"], ["-18", "0"]],
                [["1", "0"], ["-6", "0"], ["9", "0"]]], "mass": "1", "time": "2", "distance": "0"},
    {"name": "lopsided complex", "knots": ["0", "1", "3/2", "3"],
     "pieces": [[["1", "0"], ["0", "1"]], [["2", "-1"], ["0", "0"], ["1", "0"]], [["-1", "0"]]],
     "mass": "1", "time": "3/2", "distance": "0"},
    {"name": "lopsided complex, farther", "knots": ["0", "1", "3/2", "3"],
     "pieces": [[["1", "0"], ["0", "1"]], [["2", "-1"], ["0", "0"], ["1", "0"]], [["-1", "0"]]],
     "mass": "2", "time": "1/3", "distance": "3/2"},
    {"name": "two shells", "radial": True, "knots": ["0", "1", "2"], "pieces": [[["1", "0"]], [["2", "0"], ["-1", "0"]]],
     "mass": "1/2", "time": "3", "distance": "0"},
    {"name": "moving triangle", "knots": ["-1", "0", "1"], "momentum": "3",
     "pieces": [[["0", "0"], ["1", "0"]], [["1", "0"], ["-1", "0"]]], "mass": "1", "time": "1", "distance": "1/10"},
    {"name": "sine, two half-waves", "mode": 2, "knots": ["-1", "1"], "pieces": [[["1", "0"]]],
     "mass": "1", "time": "1", "distance": "0"},
    {"name": "cosine, three half-waves", "mode": 3, "knots": ["-2", "2"], "pieces": [[["1", "0"]]],
     "mass": "1", "time": "1/2", "distance": "1/4"},
    {"name": "small triangle", "knots": ["-1/1000", "0", "1/1000"],
     "pieces": [[["0", "0"], ["1000", "0"]], [["1", "0"], ["-1000", "0"]]], "mass": "1", "time": "1", "distance": "0"},
)


def derivatives(piece, z):
    """Values (re, im) of all derivatives of the polynomial at z, as fractions."""
    result = []
    current = [(Fraction(c[0]), Fraction(c[1])) for c in piece]
    while current:
        result.append(tuple(sum(c[part] * z ** n for n, c in enumerate(current)) for part in (0, 1)))
        current = [(c[0] * n, c[1] * n) for n, c in enumerate(current)][1:]
    return result


def line_packet(case):
    """Knots and pieces on the whole line; a radial packet becomes x psi(|x|)."""
    knots = [Fraction(k) for k in case["knots"]]
    pieces = [[(Fraction(c[0]), Fraction(c[1])) for c in piece] for piece in case["pieces"]]
    if not case.get("radial"):
        return knots, pieces
    outward = []
    for left, piece in zip(knots, pieces):
        grown = [(Fraction(0), Fraction(0))] * (len(piece) + 1)
        for n, c in enumerate(piece):
            grown[n] = (grown[n][0] + left * c[0], grown[n][1] + left * c[1])
            grown[n + 1] = (grown[n + 1][0] + c[0], grown[n + 1][1] + c[1])
        outward.append(grown)
    inward = []
    for (left, right), piece in reversed(list(zip(zip(knots, knots[1:]), outward))):
        values = derivatives(piece, right - left)
        inward.append([tuple(-part * (-1) ** n / math.factorial(n) for part in value) for n, value in enumerate(values)])
    return [-k for k in reversed(knots[1:])] + knots, inward + outward


def jumps_from_right(knots, pieces):
    """Pairs (u, derivatives of psi0(a - u) left minus right of u) with u measured from the right end."""
    right = knots[-1]
    table = {}
    for left_end, right_end, piece in zip(knots, knots[1:], pieces):
        for point, z, sign in ((right_end, right_end - left_end, 1), (left_end, Fraction(0), -1)):
            entry = table.setdefault(right - point, {})
            for n, value in enumerate(derivatives(piece, z)):
                old = entry.get(n, (Fraction(0), Fraction(0)))
                # In u = a - y the order of the sides and the sign of odd derivatives turn.
                flip = -sign * (-1) ** n
                entry[n] = (old[0] + flip * value[0], old[1] + flip * value[1])
    return sorted((u, [entry[n] for n in sorted(entry)]) for u, entry in table.items())


def norm_squared(knots, pieces):
    total = Fraction(0)
    for left, right, piece in zip(knots, knots[1:], pieces):
        for m, x in enumerate(piece):
            for n, y in enumerate(piece):
                total += (x[0] * y[0] + x[1] * y[1]) * (right - left) ** (m + n + 1) / (m + n + 1)
    return total


def transform(jumps, p):
    """Int_0^(2a) exp(i p u) f(u) du = Sum over knots and orders of exp(i p u) (-1)^j jump_j / (i p)^(j+1)."""
    unit = acb(0, 1)
    inverse = 1 / (unit * p)
    total = acb(0)
    for u, values in jumps:
        power, inner = inverse, acb(0)
        for value in values:
            inner += acb(as_arb(value[0]), as_arb(value[1])) * power
            power = -power * inverse
        total += inner * (unit * p * as_arb(u)).exp()
    return total


def amplitude_factor(case, jumps, half_width, p, reflected):
    """exp(i p a) times Int exp(-i p y) psi0(y) dy."""
    if case.get("momentum"):
        momentum = Fraction(case["momentum"]) * (-1 if reflected else 1)
        return transform(jumps, p - as_arb(momentum))
    if case.get("mode"):
        b = arb.pi() * case["mode"] / (2 * as_arb(half_width))
        turn = (acb(0, 1) * b * as_arb(half_width)).exp()
        plus, minus = turn * transform(jumps, p - b), transform(jumps, p + b) / turn
        return (plus + minus) / 2 if case["mode"] % 2 else (plus - minus) / acb(0, 2)
    return transform(jumps, p)


def momentum_nodes(case, jumps, half_width, mass, time_, nearest, digits, run, reflected):
    numerator, denominator = run["tilt"]
    alpha = math.pi * numerator / denominator
    cut = digits * math.log(10)
    step = 2 * math.pi * alpha / (cut + 2) / run["finer"]
    sine = math.sin(alpha)
    left = math.log(float(mass * time_) * sine / (1.02 * cut))
    right = math.log(2.1 * cut / sine) - math.log(float(mass)) - nearest
    step_ball, m, m_t = arb(step), as_arb(mass), as_arb(mass * time_)
    tilt = arb.pi() * numerator / denominator
    unit = acb(0, 1)
    nodes = []
    for index in range(math.floor(left / step), math.ceil(right / step) + 1):
        grown = acb(step_ball * index, tilt).exp()
        shrunk = 1 / grown
        p, omega = m * (grown - shrunk) / 2, m * (grown + shrunk) / 2
        weight = step_ball * omega * amplitude_factor(case, jumps, half_width, p, reflected)
        nodes.append((weight * (-unit * m_t * shrunk).exp(), unit * p))
    return nodes


def one_side(case, run, reflected):
    """Int |psi|^2 right of the region's edge, not normalised."""
    knots, pieces = line_packet(case)
    if reflected:
        pieces = [[tuple(part * (-1) ** n / math.factorial(n) for part in value)
                   for n, value in enumerate(derivatives(piece, right - left))]
                  for left, right, piece in reversed(list(zip(knots, knots[1:], pieces)))]
        knots = [-k for k in reversed(knots)]
    mass, time_, gap = (Fraction(case[key]) for key in ("mass", "time", "distance"))
    half_width = (knots[-1] - knots[0]) / 2
    jumps = jumps_from_right(knots, pieces)
    depth = float(mass) * math.sqrt(float(gap * (gap + 2 * time_))) / math.log(10)
    # A narrow packet is a small difference of large terms.
    degree = max(len(piece) for piece in pieces)
    loss = max(0.0, -math.log10(float(half_width))) * (degree + 1)
    digits = WANTED_DIGITS + depth + max(0.0, -math.log10(float(half_width)) / 2)
    ctx.prec = math.ceil((digits + loss) * math.log2(10)) + run["extra_bits"]
    cut = digits * math.log(10)
    lengths = [half_width, time_, 1 / mass, 1 / (mass * mass * time_)] + ([gap] if gap else [])
    v0 = math.log(float(min(lengths))) + run["start"]
    first = v0 - math.log(cut + 5)
    last = math.log(0.55 * cut / float(mass))
    step = math.pi ** 2 / (cut + 4) / run["finer"]
    indices = range(math.floor((first - 0.5 * step) / step), math.ceil(last / step) + 1)
    lowest = indices[0] * step
    nearest = lowest - math.exp(v0 - lowest)
    if gap:
        nearest = max(nearest, math.log(float(gap)))
    nodes = by_decay(momentum_nodes(case, jumps, half_width, mass, time_, nearest, digits, run, reflected))
    total, step_ball, start, gap_ball = arb(0), arb(step), arb(v0), as_arb(gap)
    for index in indices:
        v = step_ball * index
        bend = (start - v).exp()
        r = (v - bend).exp()
        psi = momentum_sum(nodes, gap_ball + r, cut + 10)
        total += (psi.real ** 2 + psi.imag ** 2) * r * (1 + bend)
    return total * step_ball / (4 * arb.pi() ** 2)


def evaluate(case):
    """Both runs: the probability of both sides as a fraction and the number of digits they agree on."""
    knots, pieces = line_packet(case)
    norm = norm_squared(knots, pieces) / (2 if case.get("mode") else 1)
    results = []
    for run in RUNS:
        ball = (one_side(case, run, False) + one_side(case, run, True)) / as_arb(norm)
        results.append((to_fraction(ball), to_fraction(ball.rad())))
    spread = abs(results[0][0] - results[1][0]) + results[0][1] + results[1][1]
    value = results[1][0]
    digits = MOST_DIGITS if spread == 0 else math.floor(-math.log10(float(spread / value) * 20))
    return value, min(MOST_DIGITS, digits), spread


def write():
    values = []
    for case in CASES:
        started = time.perf_counter()
        value, digits, spread = evaluate(case)
        text, _ = round_decimal(value, max(digits, 1))
        print(f"{case['name']}: {text}  ({-math.log10(float(spread / value)):.1f} digits agree, "
              f"{time.perf_counter() - started:.1f} s)", flush=True)
        if digits < LEAST_DIGITS:
            print(f"only {digits} digits: nothing written", file=sys.stderr)
            return 1
        values.append({**case, "value": text, "digits": digits})
    record = {
        "source": "tests/oracles/packets_from_definition.py --write; "
                  f"Python {platform.python_version()}, python-flint {flint.__version__} "
                  f"(FLINT {flint.__FLINT_VERSION__}); P = Int |psi|^2 dx over |x - centre| > half-width + |t| + distance, "
                  "psi = (2 pi)^(-1/2) Int dp exp(i p x - i omega t) phi(p), hbar = c = 1, norm one",
        "how": "Momentum contour tilted above p = 0, trapezoid rule; double-exponential rule in the distance from the "
               "light cone, each side by itself. Two runs per value with other tilts, steps, starting points and precisions; "
               "only digits on which both agree are kept, rounded to nearest. The rules' errors are estimated by that "
               "agreement, not proven.",
        "values": values,
    }
    FILE.write_text(json.dumps(record, indent=1) + "\n", encoding="utf-8")
    return 0


def verify(count):
    stored = json.loads(FILE.read_text(encoding="utf-8"))["values"]
    failures = 0
    for entry in stored[:count]:
        value, digits, spread = evaluate(entry)
        _, half_unit = round_decimal(value, entry["digits"])
        good = abs(Fraction(entry["value"]) - value) <= half_unit * Fraction(11, 10) + spread and digits >= LEAST_DIGITS
        failures += not good
        print(f"{'agrees' if good else 'DIFFERS'}: {entry['name']}  file {entry['value']}", flush=True)
    return 1 if failures or count < 1 or not stored else 0


def main():
    parser = argparse.ArgumentParser(description="Packet tails from the definition: recompute and compare, or write.")
    action = parser.add_mutually_exclusive_group(required=True)
    action.add_argument("--verify", type=int, metavar="N", help="recompute the first N values and compare")
    action.add_argument("--write", action="store_true", help="recompute all values and write the reference file")
    arguments = parser.parse_args()
    return write() if arguments.write else verify(arguments.verify)


if __name__ == "__main__":
    sys.exit(main())
