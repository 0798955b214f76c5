"""Tails of the one-dimensional gaussian packet, computed from its definition.

The packet psi0 = (2 pi s^2)^(-1/4) exp(-x^2/(4 s^2) + i k x) evolves with the energy omega(p) = sqrt(m^2 + p^2):

    psi(x, t) = (2 pi)^(-1/2) Int dp exp(i p x - i omega t) phi(p),
    phi(p)    = (2 s^2/pi)^(1/4) exp(-s^2 (p - k)^2),
    P(x > R)  = Int_R^inf |psi(x, t)|^2 dx,     P(x < -R) likewise.

The script evaluates exactly these two integrals, one inside the other, both by the Gauss-Legendre rule on panels. The
momentum integral runs along the real axis; the working precision is raised by the size of the tail, so that nothing is
gained from moving the contour, and neither a lattice of momenta nor a shifted contour (the two routes of the program
that these values judge) is used. On a panel with centre c and half-width d the factor exp(i p x) is
exp(i c x) exp(i d node x), so that all panels and the positions of one panel are one product of matrices. The position
integral goes out to where |psi|^2 <= (2 pi s^2)^(-1/2) exp(2 m^2 s^2 - 2 m (|x| - |t|)) is negligible (from shifting the
contour by m, with |Im omega| <= m there).

The rules' errors are estimated, not proven: every value is computed twice with other panels, other numbers of nodes,
other ends and another precision, and only digits on which the two runs agree are recorded.

    python gaussian_from_definition.py --verify 4     recompute the first four values and compare with the file
    python gaussian_from_definition.py --write        recompute everything and write the file
"""

import argparse
import json
import platform
import sys
import time
from fractions import Fraction
from math import ceil, log
from pathlib import Path

import flint
from flint import acb, acb_mat, arb, ctx, fmpq

FILE = Path(__file__).resolve().parents[2] / "references" / "gaussian_from_definition.json"
WANTED_DIGITS = 27
MOST_DIGITS = 25
LEAST_DIGITS = 20

# Panel width, nodes per panel in position and in momentum, further distance to the end, further bits. The width is in units of min(1/m, 4 s) near the
# light cone of the centre and 1/m beyond.
RUNS = (
    {"panel": 1.0, "nodes": 26, "momentum_nodes": 38, "further": 0.0, "extra_bits": 0},
    {"panel": 0.83, "nodes": 29, "momentum_nodes": 43, "further": 3.0, "extra_bits": 40},
)

# sigma, momentum, mass, time, beyond, side.
CASES = (
    ("1/2", "0", "1", "1", "2", "right"),
    ("1/2", "0", "1", "1", "6", "right"),
    ("1/10", "0", "1", "1", "2", "right"),
    ("1/2", "0", "1", "5", "12", "right"),
    ("1/2", "1", "1", "2", "3", "right"),
    ("1/2", "1", "1", "2", "3", "left"),
    ("1/2", "-1", "1", "-2", "3", "right"),
    ("1", "2", "1", "1", "5", "right"),
    ("1", "2", "1", "1", "5", "left"),
    ("1", "0", "1", "3", "1/2", "right"),
    ("2", "0", "1", "1", "10", "right"),
    ("2", "1/3", "1", "10", "12", "right"),
    ("2", "1/3", "1", "10", "12", "left"),
    ("1/4", "0", "1", "1/10", "3", "right"),
    ("1/4", "3", "1", "1/2", "3/2", "right"),
    ("1/4", "3", "1", "1/2", "3/2", "left"),
    ("1/3", "0", "2", "1", "2", "right"),
    ("1/3", "-2", "1/2", "3", "4", "left"),
    ("1", "0", "1", "-3/2", "20", "right"),
    ("1/2", "0", "1", "1", "40", "right"),
    ("3", "5", "1", "4", "8", "right"),
    ("1/5", "0", "3", "2", "9/4", "right"),
    ("1/2", "1/2", "1", "3", "-1", "right"),
    ("1", "-1", "1", "2", "-3/2", "left"),
)


def exact(text):
    value = Fraction(text)
    return arb(fmpq(value.numerator, value.denominator))


def number(text):
    return float(Fraction(text))


def gauss_legendre(count):
    """Nodes and weights on [-1, 1] at the current precision."""
    return [arb.legendre_p_root(count, index, weight=True) for index in range(count)]


class Momenta:
    """The samples of phi(p) exp(-i omega t) times the weights, panel by panel, without phi's constant factor."""

    def __init__(self, sigma, momentum, mass, when, reach, half, count):
        rule = gauss_legendre(count)
        self.half = half
        panels = ceil(float(reach / half)) // 2 + 1
        self.centres = [momentum + half * (2 * index + 1) for index in range(-panels, panels)]
        self.nodes = [node for node, _ in rule]
        rows = []
        for centre in self.centres:
            row = []
            for node, weight in rule:
                p = centre + half * node
                offset = p - momentum
                phase = acb(-sigma * sigma * offset * offset, -(mass * mass + p * p).sqrt() * when)
                row.append(phase.exp() * weight * half)
            rows.append(row)
        self.samples = acb_mat(rows)

    def densities(self, places):
        """|psi|^2 at all places, without constant factors."""
        turns = acb_mat([[acb(0, self.half * node * x).exp() for x in places] for node in self.nodes])
        parts = self.samples * turns
        found = []
        for column, x in enumerate(places):
            total = acb(0)
            for row, centre in enumerate(self.centres):
                total += parts[row, column] * acb(0, centre * x).exp()
            found.append(total.real * total.real + total.imag * total.imag)
        return found


def tail(case, run, size):
    """P on one side, once the size of the tail (its negative natural logarithm) is known."""
    sigma_text, momentum_text, mass_text, time_text, beyond_text, side = case
    digits_nats = WANTED_DIGITS * log(10)
    # Absolute accuracy of psi beyond sqrt(P), in nats and in bits.
    goal = size / 2 + digits_nats + 20
    ctx.prec = int(goal / log(2)) + 60 + run["extra_bits"]
    sigma, momentum, mass = exact(sigma_text), exact(momentum_text), exact(mass_text)
    if side == "left":
        momentum = -momentum
    when, beyond = exact(time_text), exact(beyond_text)
    s, m, t, r = number(sigma_text), number(mass_text), abs(number(time_text)), number(beyond_text)
    end = max(r, t + m * s * s + (size + digits_nats) / (2 * m)) + run["further"]
    reach = arb(ceil(goal ** 0.5 / s + run["further"]))
    half = arb(1) / ceil(max(4 / m, end / 7, s * 2))
    momenta = Momenta(sigma, momentum, mass, when, reach, half, run["momentum_nodes"])
    rule = gauss_legendre(run["nodes"])
    total, left = arb(0), beyond
    while r < end:
        narrow = abs(r) < t + 8 * s
        width = Fraction(run["panel"] * min(1 / m, 4 * s) if narrow else run["panel"] / m).limit_denominator(1000)
        middle = arb(fmpq(width.numerator, width.denominator)) / 2
        found = momenta.densities([left + middle * (1 + node) for node, _ in rule])
        part = sum((weight * value for (_, weight), value in zip(rule, found)), arb(0)) * middle
        total += part
        left += 2 * middle
        r += float(width)
        if r > t and abs(part) < total * arb(10) ** -(WANTED_DIGITS + 4):
            break
    # |phi|^2 and the two factors (2 pi)^(-1/2).
    return total * sigma * (arb(2) / arb.pi()).sqrt() / (2 * arb.pi())


def agreed(first, second):
    """The digits on which two balls agree, as (text, count)."""
    ctx.prec = 400
    low, high = arb(first.mid()), arb(second.mid())
    spread = abs(low - high) + first.rad() + second.rad() + abs(low) * arb(10) ** -60
    count = int(float(-(spread / abs(low)).log() / arb(10).log())) - 1
    count = min(count, MOST_DIGITS)
    return low.str(count, radius=False), count


def compute(case):
    size = 10.0
    for _ in range(6):
        first = tail(case, RUNS[0], size)
        if first > 0 and float(-arb(first.mid()).log()) < size + 12:
            break
        size = size * 2 + 20 if not first > 0 else float(-arb(first.mid()).log()) + 5
    value, count = agreed(first, tail(case, RUNS[1], size))
    return {"sigma": case[0], "momentum": case[1], "mass": case[2], "time": case[3], "beyond": case[4],
            "side": case[5], "value": value, "digits": count}


def same(left, right):
    count = min(left["digits"], right["digits"]) - 1
    low, high = Fraction(left["value"]), Fraction(right["value"])
    return abs(low - high) <= abs(low) * Fraction(1, 10 ** count)


def write():
    values = []
    for case in CASES:
        start = time.time()
        entry = compute(case)
        print(entry, f"{time.time() - start:.1f} s", flush=True)
        if entry["digits"] < LEAST_DIGITS:
            print("too few digits agree; not recorded", file=sys.stderr)
            return 1
        values.append(entry)
    document = {
        "source": "tests/oracles/gaussian_from_definition.py --write; Python "
                  f"{platform.python_version()}, python-flint {flint.__version__} (FLINT {flint.__FLINT_VERSION__}); "
                  "psi0 = (2 pi s^2)^(-1/4) exp(-x^2/(4 s^2) + i k x), side right: P(x > R), side left: P(x < -R), "
                  "hbar = c = 1",
        "how": "Momentum integral along the real axis and position integral by Gauss-Legendre panels. Two runs per value "
               "with other panels, nodes, ends and precisions; only digits on which both agree are kept, rounded to "
               "nearest. The rules' errors are estimated by that agreement, not proven.",
        "values": values,
    }
    FILE.write_text(json.dumps(document, indent=1) + "\n", encoding="utf-8")
    return 0


def verify(count):
    recorded = json.loads(FILE.read_text(encoding="utf-8"))["values"]
    for case, entry in list(zip(CASES, recorded))[:count]:
        found = compute(case)
        good = same(found, entry)
        print("agrees" if good else "DIFFERS", found)
        if not good:
            return 1
    return 0


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    action = parser.add_mutually_exclusive_group(required=True)
    action.add_argument("--write", action="store_true", help="recompute everything and write the file")
    action.add_argument("--verify", type=int, metavar="N", help="recompute the first N values and compare")
    chosen = parser.parse_args()
    return write() if chosen.write else verify(chosen.verify)


if __name__ == "__main__":
    sys.exit(main())
