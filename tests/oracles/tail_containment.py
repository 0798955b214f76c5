"""Checks the certified program's box tails against values that were computed another way.

Reads references/box_tail_from_definition.json and, where it is present, the boxes at rest in
references/check-values.json. For each value the program is asked for 28 digits; the reference, give or take one unit of
its last reliable digit, has to overlap the printed interval [lower, upper]. All comparisons are exact fractions of the
printed decimals. The interval must also be narrow, at most 10^-26 of its size: a wide one could hardly be wrong.

    python tail_containment.py --program PATH
    python tail_containment.py --self-test
"""

import argparse
import collections
import json
import math
import sys
import time
from fractions import Fraction
from pathlib import Path

import certified_program

REFERENCES = Path(__file__).resolve().parents[2] / "references"
DIGITS = 28
# 28 digits are a few units of the 28th, which are up to ten times more of a value with a leading 1.
WIDEST = Fraction(1, 10 ** (DIGITS - 2))

Value = collections.namedtuple("Value", "half_width mass time beyond value slack origin")


def unit_of_digit(value, digit):
    """One unit of the so many-th significant digit of a positive fraction."""
    exponent = math.floor(math.log10(value.numerator) - math.log10(value.denominator))
    # log10 of a number just under a power of ten can round up to it.
    if Fraction(10) ** exponent > value:
        exponent -= 1
    return Fraction(10) ** (exponent - digit + 1)


def from_definition(path):
    """The values of box_tail_from_definition.json."""
    values = []
    for entry in json.loads(path.read_text(encoding="utf-8"))["values"]:
        if entry["side"] != "both":
            continue
        value = Fraction(entry["value"])
        values.append(Value(entry["half_width"], entry["mass"], entry["time"], entry["beyond"], value,
                            unit_of_digit(value, entry["digits"]), path.name))
    return values


def boxes_at_rest(path):
    """The tails of the one-dimensional box at rest among the check values; other packets and quantities are skipped."""
    values = []
    for entry in json.loads(path.read_text(encoding="utf-8"))["values"]:
        if entry["quantity"] != "P(|x|>a+t) box 1D":
            continue
        packet = entry["params"]
        value = Fraction(entry["value"])
        # This file counts decimals after the point, which for a value below 1 is the more cautious reading too.
        slack = Fraction(1, 10 ** int(entry["digits_agreed_by_two_methods"]))
        values.append(Value(packet["a"], packet["m"], packet["t"], None, value, slack, path.name))
    return values


def judge(value, ends):
    """Complaint about one printed interval, or None."""
    lower, upper = map(Fraction, ends)
    if upper < value.value - value.slack or lower > value.value + value.slack:
        return "the reference lies outside"
    if upper - lower > WIDEST * abs(value.value):
        return f"too wide for {DIGITS} digits: {float((upper - lower) / value.value):.1e} of the value"
    return None


def check(values, ask, quiet=False):
    """Ask for every value, print what was found, and return the number of failures."""
    failures = 0
    for value in values:
        started = time.perf_counter()
        try:
            ends = ask(value)
            complaint = judge(value, ends)
            shown = f"[{ends[0]}, {ends[1]}]"
        except certified_program.ProgramFailed as failure:
            complaint, shown = f"the program failed: {failure}", "no answer"
        failures += complaint is not None
        if not quiet:
            print(f"{'ok' if complaint is None else 'FAILED'}: a={value.half_width} m={value.mass} t={value.time} "
                  f"R={value.beyond or 'a+t'} ({value.origin}) {shown} {time.perf_counter() - started:.2f} s"
                  + (f"\n  {complaint}; reference {float(value.value)!r}" if complaint else ""), flush=True)
    if not quiet:
        print(f"{len(values)} values, {failures} failures")
    return failures


def decimal_down_up(value, digits):
    """Ends around a fraction, rounded outward to so many digits, as decimal strings."""
    unit = unit_of_digit(value, digits)
    power = math.floor(math.log10(unit.numerator) - math.log10(unit.denominator) + 0.5)
    return f"{math.floor(value / unit)}e{power}", f"{math.ceil(value / unit)}e{power}"


def self_test(values):
    """Plays the program, honestly and with mistakes that the check has to catch."""
    def honest(value):
        return decimal_down_up(value.value, DIGITS)

    def shifted(value):
        # Beyond every slack, and an interval as narrow as an honest one.
        return decimal_down_up(value.value + 3 * unit_of_digit(value.value, DIGITS - 2), DIGITS)

    def wide(value):
        return decimal_down_up(value.value, DIGITS // 2)

    def failing(_value):
        raise certified_program.ProgramFailed("played")

    def one_shifted(value):
        return (shifted if value is values[len(values) // 2] else honest)(value)

    exact = [value for value in values if value.slack < unit_of_digit(value.value, DIGITS)]
    expected = ((honest, values, 0), (shifted, exact, len(exact)), (wide, values, len(values)),
                (failing, values, len(values)), (one_shifted, values, 1))
    good = bool(exact)
    for program, asked, count in expected:
        found = check(asked, program, quiet=True)
        good &= found == count
        print(f"{program.__name__}: {found} failures among {len(asked)}, {count} expected")
    print("self-test passed" if good else "self-test FAILED")
    return 0 if good else 1


def main():
    parser = argparse.ArgumentParser(description="Box tails against values computed another way.")
    parser.add_argument("--program", help="the certified program")
    parser.add_argument("--self-test", action="store_true", help="prove that the check can fail")
    arguments = parser.parse_args()
    values = from_definition(REFERENCES / "box_tail_from_definition.json")
    others = REFERENCES / "check-values.json"
    if others.exists():
        values += boxes_at_rest(others)
    if not values:
        print("FAILED: no reference values")
        return 1
    if arguments.self_test:
        return self_test(values)
    if not arguments.program:
        parser.error("--program or --self-test is needed")

    def ask(value):
        return certified_program.tail_of_box(arguments.program, value.half_width, value.mass, value.time, value.beyond,
                                             DIGITS)

    return 1 if check(values, ask) else 0


if __name__ == "__main__":
    sys.exit(main())
