"""What a plain f64 FFT says about the tail of a box packet, beside the certified values.

The usual way to evolve a free packet: sample psi0 on a grid, FFT, multiply by exp(-i omega(p) t), inverse FFT, and sum
|psi|^2 dx over |x| > R. Here: box of half-width 1, mass 1, time 1, on 2^22 points over a span of 400.

Grid of the first column: x_j = (j - N/2) dx with dx = 400 / 2^22. The edge x = 1 is 10485.76 steps from the origin, so
no point meets it and it does not matter whether the box is taken open, closed or with half weight at its edges; psi0 is
normalised on the grid. The second column moves the grid by dx / 2 and changes nothing else. Both choices are equally
reasonable; that the two columns differ shows what the grid alone decides.

The box has 20971 grid points in the first case, an odd number, and 20972 in the second. The sampled spectrum at the
largest momentum pi / dx is then at a crest or exactly zero, so it joins its periodic continuation with a kink or
without one, because omega(p) has opposite slopes at the two ends. A kink leaves a density that falls like x^-4 all over
the grid, which more accurate arithmetic would not remove.

    python fft_today.py [--program PATH]

Without a program, the values of references/box_tail_from_definition.json stand in the certified column.
"""

import argparse
import json
import math
import sys
from fractions import Fraction
from pathlib import Path

import numpy

import certified_program

FILE = Path(__file__).resolve().parents[2] / "references" / "box_tail_from_definition.json"
POINTS = 2 ** 22
SPAN = 400.0
HALF_WIDTH = MASS = TIME = 1.0
# R, and what this FFT is documented to give there, to the digits that are documented.
DOCUMENTED = ((2, "0.021315"), (12, "2.0e-13"), (20, "4.1e-14"))


def fft_tails(shift):
    """P(|x| > R) for the documented R, on the grid moved by shift * dx."""
    step = SPAN / POINTS
    x = (numpy.arange(POINTS) - POINTS // 2 + shift) * step
    p = 2 * numpy.pi * numpy.fft.fftfreq(POINTS, d=step)
    psi = numpy.where(numpy.abs(x) <= HALF_WIDTH, 1.0, 0.0)
    psi /= math.sqrt(numpy.sum(psi ** 2) * step)
    psi = numpy.fft.ifft(numpy.exp(-1j * numpy.hypot(MASS, p) * TIME) * numpy.fft.fft(psi))
    density = numpy.abs(psi) ** 2
    return [float(numpy.sum(density[numpy.abs(x) > beyond]) * step) for beyond, _ in DOCUMENTED]


def matches(value, documented):
    """Does the value round to the documented decimal?"""
    mantissa, _, power = documented.partition("e")
    decimals = len(mantissa.partition(".")[2])
    unit = Fraction(10) ** (int(power or 0) - decimals)
    return abs(Fraction(value) - Fraction(documented)) <= unit / 2


def judgement(value, lower, upper):
    """In words: which digits of an FFT value are right."""
    truth = (lower + upper) / 2
    relative = abs(Fraction(value) - truth) / truth
    if relative >= Fraction(1, 2):
        return f"no digit is right: {float(value / truth):.3g} times the true value"
    # A digit counts as right while the error is below one unit of it.
    leading = Fraction(10) ** math.floor(math.log10(truth))
    right = 0
    while abs(Fraction(value) - truth) < leading / Fraction(10) ** right:
        right += 1
    plural = "digit" if right == 1 else "digits"
    return f"only {right} significant {plural} right, the rest is wrong (relative error {float(relative):.1e})"


def certified_interval(program, beyond):
    """(lower, upper) strings: from the program, or the value computed from the definition and its last digit."""
    if program:
        return certified_program.tail_of_box(program, "1", "1", "1", None if beyond == 2 else str(beyond), 15)
    for entry in json.loads(FILE.read_text(encoding="utf-8"))["values"]:
        box = (entry["half_width"], entry["mass"], entry["time"])
        if box == ("1", "1", "1") and entry["beyond"] == (None if beyond == 2 else str(beyond)):
            return entry["value"], entry["value"]
    raise SystemExit(f"no reference value for R = {beyond}")


def main():
    parser = argparse.ArgumentParser(description="A plain FFT beside the certified tail of the box packet.")
    parser.add_argument("--program", help="the certified program")
    arguments = parser.parse_args()
    usual, moved = fft_tails(0.0), fft_tails(0.5)
    title = "certified, lower end" if arguments.program else "from the definition"
    print("box, half-width 1, mass 1, time 1; FFT on 2^22 points over a span of 400")
    print(f"{'P(|x| > R)':<12}{'FFT':<14}{'FFT, grid + dx/2':<19}{title}")
    verdicts = []
    good = True
    for (beyond, documented), value, other in zip(DOCUMENTED, usual, moved):
        try:
            ends = certified_interval(arguments.program, beyond)
        except certified_program.ProgramFailed as failure:
            print(f"R = {beyond}: the program failed: {failure}")
            good = False
            continue
        print(f"R = {beyond:<8}{value:<14.6g}{other:<19.6g}{ends[0]}")
        lower, upper = map(Fraction, ends)
        verdicts.append(f"R = {beyond}: FFT: {judgement(value, lower, upper)}")
        verdicts.append(f"{' ' * len(f'R = {beyond}')}  moved grid: {judgement(other, lower, upper)}")
        if not matches(value, documented):
            print(f"R = {beyond}: this FFT gives {value!r}, documented is {documented}")
            good = False
    print("\n".join(verdicts))
    return 0 if good else 1


if __name__ == "__main__":
    sys.exit(main())
