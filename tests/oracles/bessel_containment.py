"""Checks enclosures of the modified Bessel functions K_0, K_1 and K_2 against two independent libraries.

The checked program reads one case per line from standard input,

    nu bits x_re x_im

and answers each with one line: "lo hi" when x_im is 0, otherwise "re_lo re_hi im_lo im_hi", or "error: ...".
All numbers are exact, INT*2^EXP. Asked of every answer:

* containment: the FLINT ball of K_nu(x), at 64 bits more than asked for, lies inside the printed interval. Where that
  ball is wider than a tenth of the interval, or reaches over its end, it is computed again at higher precision;
* tightness: the width is at most 2^(8 - bits) |K_nu(x)|, so that a program cannot pass with intervals that say nothing;
* for a part of the real cases, the value of mpmath.besselk lies inside as well. mpmath gives no error bound, so the
  interval is widened by |K| 2^-(bits + 40) there, and mpmath works with 80 bits more than asked for.

    python bessel_containment.py --program PATH [--cases N] [--seed S]
    python bessel_containment.py --self-test

CONEPROOF_EFFORT multiplies the number of cases. Every failing case is printed with all its inputs and the seed.

K_nu: NIST Digital Library of Mathematical Functions, section 10.25 (definition), 10.31 (series at integer order),
10.40 (large arguments). Reference values: FLINT's acb_hypgeom_bessel_k through python-flint; mpmath.besselk.
"""

import argparse
import collections
import math
import os
import random
import shlex
import subprocess
import sys
import time

import flint
import mpmath
from flint import acb, arb, ctx

import dyadic

Case = collections.namedtuple("Case", "nu bits re im")

EXTRA_BITS = 64
LOOSE_BITS = 8
# FLINT can lose all digits for |x| of 20 to 400 at small precision; this many more attempts at twice the extra bits.
ATTEMPTS = 9
# From this working precision on, K_1 and K_2 are put together from functions that FLINT finds quickly.
LONG_PRECISION = 260


def request_line(case):
    return f"{case.nu} {case.bits} {dyadic.write(case.re)} {dyadic.write(case.im)}"


def dyadic_near(random_, value_log2, mantissa_bits):
    """A positive dyadic with a mantissa of so many bits, within a factor of two of 2^value_log2."""
    mantissa = random_.getrandbits(mantissa_bits) | 1 << (mantissa_bits - 1)
    return mantissa, math.floor(value_log2) - mantissa_bits + 1


def draw_bits(random_, highest):
    """Mostly 10 to 300 bits, a few per cent above 1000."""
    choice = random_.random()
    if choice < 0.55:
        return random_.randint(10, min(120, highest))
    if choice < 0.86:
        return random_.randint(10, min(300, highest))
    if choice < 0.96 or highest <= 1000:
        return random_.randint(10, min(1000, highest))
    return random_.randint(1000, highest)


def draw_real(random_):
    """A real case: sizes from 1e-300 to 1e6, more of them where the method of evaluation changes."""
    bits = draw_bits(random_, 3500)
    choice = random_.random()
    if choice < 0.45:
        size = random_.uniform(math.log2(0.01), math.log2(500))
    elif choice < 0.55:
        # Integers, where a mistake in a series or a table would be least hidden by rounding.
        return Case(random_.randrange(3), bits, (random_.randint(1, 400), 0), (0, 0))
    else:
        # A thousand and more bits beyond 1e4 teach little and cost the program most.
        size = random_.uniform(math.log2(1e-300), math.log2(1e6 if bits <= 1000 else 1e4))
    if random_.random() < 0.5:
        x = dyadic_near(random_, size, random_.randint(1, 8))
    else:
        x = dyadic_near(random_, size, random_.randint(9, max(53, bits + 20)))
    return Case(random_.randrange(3), bits, x, (0, 0))


def draw_complex(random_):
    """A complex case with Re z >= 0: most with 1e-3 <= |z| <= 1e3, some near the imaginary axis and some on it."""
    choice = random_.random()
    # As for real arguments: a thousand and more bits where FLINT and the program are quick enough.
    bits = draw_bits(random_, 3500 if choice < 0.9 else 1000)
    size = random_.uniform(math.log2(1e-3), math.log2(1e3)) if choice < 0.9 else random_.uniform(-100, 16)
    choice = random_.random()
    if choice < 0.2:
        smallness = 2.0 ** random_.uniform(-40, -1)
        angle = math.copysign(math.pi / 2 - smallness, random_.random() - 0.5)
    elif choice < 0.3:
        angle = math.copysign(2.0 ** random_.uniform(-60, -1), random_.random() - 0.5)
    else:
        angle = random_.uniform(-1.55, 1.55)
    mantissa_bits = random_.randint(1, 8) if random_.random() < 0.5 else random_.randint(9, max(53, bits + 20))
    real = dyadic_near(random_, size + math.log2(math.cos(angle)), mantissa_bits)
    imaginary = dyadic_near(random_, size + math.log2(abs(math.sin(angle))), mantissa_bits)
    if angle < 0:
        imaginary = dyadic.negate(imaginary)
    if random_.random() < 0.1:
        real = (0, 0)
    return Case(random_.randrange(3), bits, real, imaginary)


def draw_cases(seed, count):
    """The same cases for the same seed and count: `count` real ones and a twentieth as many complex ones."""
    random_ = random.Random(seed)
    cases = [draw_real(random_) for _ in range(count)]
    return cases + [draw_complex(random_) for _ in range(max(1, count // 20))]


def ends(ball):
    """The exact ends of a real FLINT ball, or None when it is not finite."""
    if not ball.is_finite():
        return None
    middle = tuple(map(int, ball.mid().man_exp()))
    radius = tuple(map(int, ball.rad().man_exp()))
    return dyadic.subtract(middle, radius), dyadic.add(middle, radius)


def ball_of_k(nu, z, precision):
    """FLINT's K_nu(z) as a ball.

    Beyond some 200 bits FLINT can take minutes over one K_1 or K_2 with |z| of about 50 to 500, though never over K_0
    or I_nu. There K_1 comes from the Wronskian I_0 K_1 + I_1 K_0 = 1/z (DLMF 10.28.2), K_2 = K_0 + 2 K_1 / z from
    10.29.1; the balls carry the errors along.
    """
    if nu == 0 or precision < LONG_PRECISION:
        return z.bessel_k(nu)
    k0 = z.bessel_k(0)
    k1 = (1 / z - z.bessel_i(1) * k0) / z.bessel_i(0)
    return k1 if nu == 1 else k0 + 2 * k1 / z


def reference(case, precision):
    """Ends of K_nu's parts, (lo, hi) each, at this working precision; None where FLINT knows nothing."""
    ctx.prec = precision
    if case.im[0]:
        value = ball_of_k(case.nu, acb(arb(case.re), arb(case.im)), precision)
        parts = (ends(value.real), ends(value.imag))
    else:
        parts = (ends(ball_of_k(case.nu, arb(case.re), precision)),)
    return None if None in parts else parts


def width(interval):
    return dyadic.subtract(interval[1], interval[0])


def magnitude(parts):
    """A lower bound of |K_nu| that is at most sqrt(2) too small: the larger of the parts."""
    lowest = (0, 0)
    for low, high in parts:
        near = low if dyadic.sign(low) > 0 else dyadic.negate(high) if dyadic.sign(high) < 0 else (0, 0)
        lowest = near if dyadic.compare(near, lowest) > 0 else lowest
    return lowest


def decide(answer, truth):
    """Where a reference ball lies: "inside" or "outside" the printed interval, "unclear" if it has to be sharper."""
    low, high = answer
    true_low, true_high = truth
    if dyadic.compare(true_high, low) < 0 or dyadic.compare(true_low, high) > 0:
        return "outside"
    if dyadic.compare(low, true_low) > 0 or dyadic.compare(true_high, high) > 0:
        return "unclear"
    own_width = width(truth)
    if dyadic.compare((10 * own_width[0], own_width[1]), width(answer)) > 0:
        return "unclear"
    return "inside"


def read_answer(case, line):
    """The intervals of an answer line; ValueError says what is wrong with it."""
    fields = line.split()
    if len(fields) != (4 if case.im[0] else 2):
        raise ValueError("not the right number of fields")
    numbers = [dyadic.parse(field) for field in fields]
    intervals = tuple(zip(numbers[0::2], numbers[1::2]))
    if any(dyadic.compare(low, high) > 0 for low, high in intervals):
        raise ValueError("an interval with its ends exchanged")
    return intervals


def judge(case, line):
    """(complaint or None, log2 of the relative width times 2^bits) for one answer."""
    if line.startswith("error"):
        return line, math.inf
    try:
        intervals = read_answer(case, line)
    except ValueError as complaint:
        return f"unreadable answer: {complaint}", math.inf
    extra = EXTRA_BITS
    verdicts = ("unclear",)
    truth = None
    for _ in range(ATTEMPTS):
        truth = reference(case, case.bits + extra)
        if truth is not None:
            verdicts = tuple(map(decide, intervals, truth))
            if "outside" in verdicts:
                return "does not contain the value", math.inf
            if verdicts == ("inside",) * len(verdicts):
                break
        extra *= 2
    else:
        return "the reference does not fit inside at any precision tried", math.inf
    size = magnitude(truth)
    looseness = max(dyadic.log2(width(interval)) for interval in intervals) - dyadic.log2(size) + case.bits
    for interval in intervals:
        if dyadic.compare(width(interval), dyadic.scale(size, LOOSE_BITS - case.bits)) > 0:
            return f"too wide: 2^({looseness:.1f} - bits) of |K|", looseness
    return None, looseness


def judge_with_mpmath(case, line):
    """Complaint or None: the same containment, with mpmath's besselk and the slack named at the top of the file."""
    low, high = read_answer(case, line)[0]
    with mpmath.workprec(case.bits + 80):
        value = mpmath.besselk(case.nu, mpmath.ldexp(case.re[0], case.re[1]))
        is_negative, mantissa, exponent, _ = value._mpf_
    value = (-int(mantissa) if is_negative else int(mantissa)), int(exponent)
    slack = dyadic.scale(value, -(case.bits + 40))
    if dyadic.compare(dyadic.add(value, slack), low) < 0 or dyadic.compare(dyadic.subtract(value, slack), high) > 0:
        return "does not contain mpmath's value"
    return None


def fits_mpmath(case):
    """mpmath is slow for very many bits and for arguments far from 1: these cases are left to FLINT."""
    return not case.im[0] and case.bits <= 300 and -40 < dyadic.top_bit(case.re) < 14


def check(seed, cases, answers, mpmath_count, quiet=False):
    """Judge all answers; print failures and a summary. Returns the number of failures."""
    def say(text):
        if not quiet:
            print(text, flush=True)

    failures = 0
    widest = []
    compared_with_mpmath = 0
    if len(answers) != len(cases):
        say(f"FAILED: {len(cases)} cases asked, {len(answers)} lines answered (seed {seed})")
        failures += 1
    for number, (case, line) in enumerate(zip(cases, answers)):
        complaint, looseness = judge(case, line)
        if complaint is None and compared_with_mpmath < mpmath_count and fits_mpmath(case):
            complaint = judge_with_mpmath(case, line)
            compared_with_mpmath += 1
        if complaint is not None:
            failures += 1
            say(f"FAILED: {complaint}\n  seed {seed}, case {number}: {request_line(case)}\n  answer: {line[:300]}")
        else:
            widest.append((looseness, number))
    widest.sort(reverse=True)
    real_count = sum(not case.im[0] for case in cases)
    kinds = collections.Counter((case.nu, "complex" if case.im[0] else "real") for case in cases)
    say(f"seed {seed}: {real_count} real and {len(cases) - real_count} complex cases against FLINT "
        f"{flint.__FLINT_VERSION__}, {compared_with_mpmath} of the real ones also against mpmath {mpmath.__version__}")
    say("  " + ", ".join(f"K_{nu} {kind}: {count}" for (nu, kind), count in sorted(kinds.items()))
        + f"; above 1000 bits: {sum(case.bits > 1000 for case in cases)}")
    for looseness, number in widest[:3]:
        say(f"  widest that passed: 2^({looseness:.2f} - bits) of |K|, case {number}: "
            f"{request_line(cases[number])[:160]}")
    say(f"  failures: {failures}")
    return failures


def run_program(program, cases):
    """The program's answers, one line per case."""
    text = "".join(request_line(case) + "\n" for case in cases)
    finished = subprocess.run(shlex.split(program), input=text, capture_output=True, text=True, check=False)
    if finished.returncode:
        print(f"FAILED: the program ended with status {finished.returncode}: {finished.stderr[:1000]}")
    return finished.returncode, finished.stdout.splitlines()


def imitate(case):
    """An honest answer for the self-test: FLINT's value, widened to 2^(2 - bits) of its size."""
    extra = EXTRA_BITS
    truth = None
    while truth is None or dyadic.compare(
            max(map(width, truth), key=dyadic.log2), dyadic.scale(magnitude(truth), -case.bits - 20)) > 0:
        truth = reference(case, case.bits + extra)
        extra *= 2
    margin = dyadic.scale(magnitude(truth), 1 - case.bits)
    return [(dyadic.subtract(low, margin), dyadic.add(high, margin)) for low, high in truth]


def answer_line(intervals):
    return " ".join(dyadic.write(end) for interval in intervals for end in interval)


def moved(interval, numerator):
    """The interval moved by numerator/16 of its width."""
    step = width(interval)
    shift = step[0] * numerator, step[1] - 4
    return dyadic.add(interval[0], shift), dyadic.add(interval[1], shift)


def self_test(seed):
    """Plays the program with and without mistakes: the check must pass the honest answers and catch each mistake."""
    cases = draw_cases(seed, 400)
    honest = [imitate(case) for case in cases]
    lines = [answer_line(intervals) for intervals in honest]
    last = len(cases) - 1
    # 9/16 of the width puts the value just outside.
    spoilt = {
        "a real interval just beside the value": (7, answer_line([moved(honest[7][0], 9)])),
        "a real interval just beside the value, other side": (8, answer_line([moved(honest[8][0], -9)])),
        "an imaginary part just beside the value": (last, answer_line([honest[last][0], moved(honest[last][1], 9)])),
        "a real interval 2^9 times too wide": (9, answer_line([(
            dyadic.subtract(honest[9][0][0], dyadic.scale(width(honest[9][0]), 9)), honest[9][0][1])])),
        "a point just beside the value": (10, answer_line([(honest[10][0][0],) * 2])),
        "ends exchanged": (11, answer_line([honest[11][0][::-1]])),
        "an error": (12, "error: no convergence"),
        "not a number": (13, "nan nan"),
    }
    good = check(seed, cases, lines, 20) == 0
    print(f"{'passes' if good else 'WRONG'}: honest answers")
    for name, (place, line) in spoilt.items():
        caught = check(seed, cases[place:place + 1], [line], 0, quiet=True) == 1
        good &= caught
        print(f"{'caught' if caught else 'MISSED'}: {name}")
    mixed = list(lines)
    mixed[7] = spoilt["a real interval just beside the value"][1]
    print("one failure is expected below:")
    among = check(seed, cases, mixed, 0) == 1
    short = check(seed, cases[:20], lines[:19], 0, quiet=True) == 1
    narrow = next(place for place, case in enumerate(cases) if fits_mpmath(case))
    with_mpmath = judge_with_mpmath(cases[narrow], answer_line([moved(honest[narrow][0], 9)])) is not None
    print(f"{'caught' if among else 'MISSED'}: one moved interval among {len(cases)} answers")
    print(f"{'caught' if short else 'MISSED'}: a missing answer")
    print(f"{'caught' if with_mpmath else 'MISSED'}: a moved interval, by mpmath alone")
    good &= among and short and with_mpmath
    print("self-test passed" if good else "self-test FAILED")
    return 0 if good else 1


def main():
    parser = argparse.ArgumentParser(description="Containment and tightness of K_0, K_1, K_2 enclosures.")
    parser.add_argument("--program", help="command that answers the cases, with its arguments if it needs any")
    parser.add_argument("--cases", type=int, default=20000, help="real cases; a twentieth as many complex ones follow")
    parser.add_argument("--seed", type=int, default=20250101)
    parser.add_argument("--self-test", action="store_true", help="prove that the check can fail")
    arguments = parser.parse_args()
    if arguments.self_test:
        return self_test(arguments.seed)
    if not arguments.program:
        parser.error("--program or --self-test is needed")
    count = max(1, round(arguments.cases * float(os.environ.get("CONEPROOF_EFFORT", "1"))))
    cases = draw_cases(arguments.seed, count)
    started = time.perf_counter()
    status, answers = run_program(arguments.program, cases)
    answered = time.perf_counter()
    failures = check(arguments.seed, cases, answers, max(1, count // 40))
    print(f"  the program took {answered - started:.1f} s, this check {time.perf_counter() - answered:.1f} s")
    return 1 if failures or status else 0


if __name__ == "__main__":
    sys.exit(main())
