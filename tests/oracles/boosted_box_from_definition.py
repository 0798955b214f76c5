"""Probabilities of the boosted box, computed from its definition.

A box psi0 = 1/sqrt(2 a) on [-a, a] at rest, of mass 1, is seen by an observer of rapidity theta (hbar = c = 1):

    phi(k)    = sin(k a) / (k sqrt(pi a)),
    phi'(p)   = sqrt(omega(Lp)/omega(p)) phi(Lp),   Lp = p cosh(theta) + omega(p) sinh(theta),  omega = sqrt(1 + p^2),
    psi'(x,t) = (2 pi)^(-1/2) Int dp exp(i p x - i omega t) phi'(p),
    P         = Int |psi'|^2 dx over the region.

The script evaluates these two integrals, one inside the other, in the variables p and x of the definition. No branch
cut is used, no integral over x is done in closed form, and rapidities do not occur as variables of integration, because
those are the ways of the program that these values are meant to judge.

Momentum. The sine is written as two exponentials, the edges of the box. A term that decays for Im p > 0 at both ends is
integrated along two rays, p = p0 + u exp(i alpha) and p = p0 - u exp(-i alpha), u > 0; between the two lines of the cone
of the edge at +a it decays below the axis on the right and above it on the left: p = p0 + u exp(-i alpha),
u < 0 and u > 0. The corner p0 is near 0, so that the rays stay between the branch points ±i and ±i cosh(theta); both
terms pass above the pole Lp = 0, p = -sinh(theta). On each ray u = exp(y),
trapezoid rule in y: with t = 0 or t > 0 and x beyond the cone the terms decay like exp(-u) times powers.

Position. With r the distance from the cone, where |psi'|^2 has a log^2 singularity, the rule is the double-exponential one of
H. Takahasi and M. Mori, Publ. RIMS 9 (1974) 721-741 (cited from memory): r = exp(v - exp(v0 - v)) outwards, r = l/(1 + exp(-pi sinh v)) on a finite
interval. The errors of the rules are estimated, not proven: each value is computed twice, with other tilts, steps and
precisions, and only digits on which the two runs agree are recorded.

    python boosted_box_from_definition.py --verify 3     recompute the first three values and compare with the file
    python boosted_box_from_definition.py --write        recompute everything and write the file
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

FILE = Path(__file__).resolve().parents[2] / "references" / "boosted_box_from_definition.json"
WANTED_DIGITS = 30
LEAST_DIGITS = 20
RUNS = (
    {"tilt": (1, 4), "finer": 1.0, "start": 0.4, "corner": (1, 10), "bits": 64},
    {"tilt": (1, 5), "finer": 1.15, "start": 0.1, "corner": (3, 20), "bits": 112},
)
# half-width, rapidity, time, region: "cone", "cone+d" or "inside" with the distance X < a exp(theta), |x| > X, t = 0.
CASES = (
    ("1", "1/2", "0", "cone", None),
    ("1", "1/2", "0", "cone", "1/2"),
    ("1", "1/2", "0", "inside", "1"),
    ("2", "3/2", "0", "cone", None),
    ("1/10", "1", "0", "cone", None),
    ("1/5", "1/10", "0", "cone", None),
    ("1", "1/2", "1", "cone", None),
    ("1/3", "-2/3", "1/2", "cone", None),
    ("1", "-1/4", "3/2", "cone", "1/3"),
    ("1/2", "1", "0", "inside", "3/4"),
    ("3/2", "3/4", "0", "inside", "3/2"),
)


def ball(value):
    fraction = Fraction(value)
    return arb(fmpq(fraction.numerator, fraction.denominator))


class Momentum:
    """Nodes p_j and weights such that psi'(x) = Sum_j A_j exp(i p_j (x - origin))."""

    def __init__(self, half_width, theta, time_, origin, nearest, run):
        self.a, self.theta, self.t, self.origin = half_width, theta, time_, origin
        self.log_small = nearest
        self.run = run
        self.digits = WANTED_DIGITS + 4

    def rays(self, falling):
        """Nodes of one edge; `falling` for the edge at +a between the lines of its cone."""
        alpha = ball(Fraction(*self.run["tilt"])) * arb.pi()
        corner = ball(Fraction(*self.run["corner"]))
        cut = self.digits * math.log(10)
        strip = min(self.run["tilt"][0] / self.run["tilt"][1], 0.5 - self.run["tilt"][0] / self.run["tilt"][1]) * math.pi
        step = 2 * math.pi * 0.8 * strip / (cut + 6) / self.run["finer"]
        first, last = -cut - 2, -self.log_small + math.log(cut / math.sin(float(alpha.mid()))) + 1
        turn_right = acb(0, -alpha if falling else alpha).exp()
        turn_left = acb(0, -alpha).exp()
        ball_step = arb(step)
        for index in range(math.floor(first / step), math.ceil(last / step)):
            u = (ball_step * index).exp()
            yield corner + u * turn_right, u * turn_right * ball_step
            yield corner - u * turn_left, u * turn_left * ball_step

    def nodes(self, sign, falling):
        """Terms of sign exp(sign i a Lp)/(2 i Lp)."""
        result = []
        half = arb(1) / 2
        scale = (2 * arb.pi()).rsqrt() * (arb.pi() * self.a).rsqrt()
        for p, dp in self.rays(falling):
            omega = (1 + p * p).sqrt()
            boosted = p * self.theta.cosh() + omega * self.theta.sinh()
            energy = (1 + boosted * boosted).sqrt()
            weight = scale * (energy.sqrt() / omega.sqrt()) * sign / (acb(0, 2) * boosted) * dp
            phase = acb(0, 1) * (p * self.origin - omega * self.t + sign * self.a * boosted)
            result.append((acb(0, 1) * p, (weight * phase.exp())))
        return result


def amplitude(nodes, distance):
    total = acb(0)
    for rate, weight in nodes:
        total += weight * (rate * distance).exp()
    return total


def prune(nodes, digits, reach):
    """Without the terms that are small for all distances up to `reach`."""
    least = 10.0 ** (-digits - 6)
    kept = []
    for rate, weight in nodes:
        size = abs(weight)
        if reach is not None:
            size = size * (abs(rate.real) * reach).exp()
        if not float(size.upper()) < least:
            kept.append((rate, weight))
    return kept


def beyond(half_width, theta, time_, distance, run):
    """One side: P(x > cone + distance), cone = a exp(theta) + t."""
    cut = WANTED_DIGITS * math.log(10)
    v0 = math.log(float(half_width.mid()) * 0.5) + run["start"]
    first, last = v0 - math.log(cut + 5), math.log(0.6 * cut)
    step = math.pi ** 2 / (cut + 4) / run["finer"]
    lowest = first - step
    small = lowest - math.exp(v0 - lowest)
    origin = half_width * theta.exp() + time_ + distance
    momentum = Momentum(half_width, theta, time_, origin, small, run)
    # Sorted by decay so that the sum can stop early.
    nodes = prune(momentum.nodes(1, False) + momentum.nodes(-1, False), momentum.digits, None)
    nodes.sort(key=lambda node: -float(node[0].real.mid()))
    rates = [-float(node[0].real.mid()) for node in nodes]
    total = arb(0)
    for index in range(math.floor(first / step), math.ceil(last / step) + 1):
        v = arb(step) * index
        bend = (arb(v0) - v).exp()
        r = (v - bend).exp()
        limit = (cut + 30) / float(r.mid())
        count = next((place for place, rate in enumerate(rates) if rate > limit), len(rates))
        psi = amplitude(nodes[:count], r)
        total += (psi.real ** 2 + psi.imag ** 2) * r * (1 + bend)
    return total * step


def between(half_width, theta, start, run):
    """One side at t = 0: P(start < x < a exp(theta)), start at least a exp(-theta)."""
    cut = WANTED_DIGITS * math.log(10)
    cone = half_width * theta.exp()
    length = cone - start
    step = 0.075 / run["finer"]
    most = math.asinh((cut + 8) / math.pi)
    small = math.log(float(length.mid())) - math.pi * math.sinh(most + step)
    zero = arb(0)
    momentum = Momentum(half_width, theta, zero, cone, small, run)
    falling = prune(momentum.nodes(-1, True), momentum.digits + 12, length)
    rising = prune(momentum.nodes(1, False), momentum.digits + 12, length)
    falling.sort(key=lambda node: float(abs(node[0].real).mid()))
    total = arb(0)
    for index in range(-math.ceil(most / step), math.ceil(most / step) + 1):
        v = arb(step) * index
        growth = (-arb.pi() * v.sinh()).exp()
        r = length / (1 + growth)
        # On the ray to the lower right exp(-i p r) falls; to the upper left the weight falls faster than it grows.
        limit = (cut + 40) / float(r.mid()) + 400 / float(half_width.mid())
        nodes = [node for node in falling if float(abs(node[0].real).mid()) < limit]
        psi = amplitude(nodes, -r) + amplitude(rising, -r)
        density = psi.real ** 2 + psi.imag ** 2
        total += density * length * growth / (1 + growth) ** 2 * arb.pi() * v.cosh()
    return total * step


def probability(case, run):
    ctx.prec = math.ceil((2.2 * WANTED_DIGITS + 12) * math.log2(10)) + run["bits"]
    half_width, theta, time_ = (ball(text) for text in case[:3])
    if case[3] == "inside":
        inner = between(half_width, theta, ball(case[4]), run)
        return 2 * (inner + beyond(half_width, theta, arb(0), arb(0), run))
    distance = ball(case[4] or "0")
    right = beyond(half_width, theta, time_, distance, run)
    # The left side is the right side for -theta; where a sinh(theta) + t < 0 time is reversed.
    if Fraction(case[2]) == 0 and Fraction(case[1]) > 0:
        return 2 * right
    mirrored = time_ - half_width * theta.sinh()
    if not mirrored > 0 or not time_ + half_width * theta.sinh() > 0:
        raise ValueError("a case outside of what this script is made for")
    return right + beyond(half_width, -theta, time_, distance, run)


def evaluate(case):
    started = time.perf_counter()
    first, second = (probability(case, run) for run in RUNS)
    difference = abs(float((first - second).mid())) + float(first.rad()) + float(second.rad())
    value = float(second.mid())
    digits = 40 if difference == 0 else math.floor(-math.log10(20 * difference / value))
    print(f"{case}: {second.mid().str(40, radius=False)}  ({digits} digits, {time.perf_counter() - started:.1f} s)", flush=True)
    return second, min(digits, WANTED_DIGITS)


def write():
    values = []
    for case in CASES:
        value, digits = evaluate(case)
        if digits < LEAST_DIGITS:
            print(f"only {digits} digits: nothing written", file=sys.stderr)
            return 1
        text = value.mid().str(digits, radius=False)
        values.append({"half_width": case[0], "rapidity": case[1], "time": case[2], "region": case[3],
                       "distance": case[4], "value": text, "digits": digits})
    record = {
        "source": "tests/oracles/boosted_box_from_definition.py --write; "
                  f"Python {platform.python_version()}, python-flint {flint.__version__} (FLINT {flint.__FLINT_VERSION__})",
        "how": "psi'(x, t) = (2 pi)^(-1/2) Int dp exp(i p x - i omega t) sqrt(omega(Lp)/omega(p)) phi(Lp) along rays in the p "
               "plane, |psi'|^2 integrated over x by double-exponential rules; both sides; mass 1. Two runs per value with "
               "other tilts, corners, steps and precisions; only digits on which both agree are kept, rounded to nearest. "
               "region cone: beyond the cones of the edge events, by the distance if there is one; inside: |x| > distance.",
        "values": values,
    }
    FILE.write_text(json.dumps(record, indent=1) + "\n", encoding="utf-8")
    print(f"{len(values)} values written to {FILE.name}")
    return 0


def verify(count):
    stored = json.loads(FILE.read_text(encoding="utf-8"))["values"]
    failures = 0
    for entry in stored[:count]:
        case = (entry["half_width"], entry["rapidity"], entry["time"], entry["region"], entry["distance"])
        value, digits = evaluate(case)
        relative = abs(float((value - ball(entry["value"])).mid())) / float(value.mid())
        good = relative < 10.0 ** (1 - entry["digits"]) and digits >= LEAST_DIGITS
        failures += not good
        print(f"{'agrees' if good else 'DIFFERS'}: file {entry['value']}", flush=True)
    print(f"{min(count, len(stored))} of {len(stored)} values recomputed from the definition, {failures} differ")
    return 1 if failures or count < 1 or not stored else 0


def main():
    parser = argparse.ArgumentParser(description="Boosted box from the definition: recompute and compare, or write.")
    action = parser.add_mutually_exclusive_group(required=True)
    action.add_argument("--verify", type=int, metavar="N", help="recompute the first N values and compare")
    action.add_argument("--write", action="store_true", help="recompute all values and write the file")
    arguments = parser.parse_args()
    return write() if arguments.write else verify(arguments.verify)


if __name__ == "__main__":
    sys.exit(main())
