"""Exact numbers of the form INT*2^EXP, as they are exchanged with the checked program.

A pair (mantissa, exponent) of Python integers stands for mantissa * 2^exponent. Everything here is exact: a
containment check that rounds would prove nothing.
"""

import math

# Past this gap in size the larger number decides; shifting by more would only cost memory.
FAR_APART = 200_000


def parse(text):
    """Read "INT*2^EXP" or a plain integer."""
    mantissa, star, power = text.partition("*")
    if not star:
        return int(mantissa), 0
    if not power.startswith("2^"):
        raise ValueError(f"not of the form INT*2^EXP: {text!r}")
    return int(mantissa), int(power[2:])


def write(number):
    """The text form of a pair; zero is "0"."""
    mantissa, exponent = number
    return f"{mantissa}*2^{exponent}" if mantissa else "0"


def top_bit(number):
    """e with 2^(e-1) <= |number| < 2^e; None for zero."""
    mantissa, exponent = number
    return abs(mantissa).bit_length() + exponent if mantissa else None


def add(left, right):
    """left + right, exactly."""
    if not left[0]:
        return right
    if not right[0]:
        return left
    exponent = min(left[1], right[1])
    return (left[0] << (left[1] - exponent)) + (right[0] << (right[1] - exponent)), exponent


def negate(number):
    return -number[0], number[1]


def subtract(left, right):
    """left - right, exactly."""
    return add(left, negate(right))


def scale(number, power):
    """number * 2^power, exactly."""
    return number[0], number[1] + power


def sign(number):
    return (number[0] > 0) - (number[0] < 0)


def compare(left, right):
    """-1, 0 or 1 as left is below, equal to or above right."""
    if sign(left) != sign(right):
        return 1 if sign(left) > sign(right) else -1
    if not left[0]:
        return 0
    gap = top_bit(left) - top_bit(right)
    if abs(gap) > FAR_APART:
        return sign(left) if gap > 0 else -sign(left)
    return sign(subtract(left, right))


def log2(number):
    """log2 |number| as a float, for summaries only."""
    mantissa, exponent = number
    if not mantissa:
        return -math.inf
    dropped = max(0, abs(mantissa).bit_length() - 60)
    return math.log2(abs(mantissa) >> dropped) + dropped + exponent
