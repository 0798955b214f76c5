"""Checks references/bessel_k_handbook.json: every table entry and every identity, with mpmath.

The entries have the form of a printed table (M. Abramowitz and I. A. Stegun, Handbook of Mathematical Functions, table
9.8, cited from memory); a slip of a digit there must not pass for a mistake of the program. The identities are those
that the tests of K_0, K_1 and K_2 rest on, with their numbers in the NIST Digital Library of Mathematical Functions; a
wrong equation would make a test worthless.
"""

import json
import sys
from fractions import Fraction
from pathlib import Path

from mpmath import besseli, besselk, cosh, diff, euler, exp, fac, gamma, harmonic
from mpmath import inf, ln, mp, mpf, nsum, pi, quad, sqrt

FILE = Path(__file__).resolve().parents[2] / "references" / "bessel_k_handbook.json"
DIGITS = 40

QUANTITIES = {
    "exp(x) K_0(x)": lambda x: exp(x) * besselk(0, x),
    "exp(x) K_1(x)": lambda x: exp(x) * besselk(1, x),
    "x^2 K_2(x)": lambda x: x * x * besselk(2, x),
    "exp(x) K_2(x)": lambda x: exp(x) * besselk(2, x),
}


def table_entry_is_right(entry):
    """Within half a unit of the last digit, by exact comparison with a 40-digit value."""
    value = QUANTITIES[entry["quantity"]](mpf(entry["x"]))
    decimals = len(entry["value"].partition(".")[2])
    half_unit = Fraction(1, 2 * 10 ** decimals)
    return abs(Fraction(mp.nstr(value, DIGITS - 2)) - Fraction(entry["value"])) <= half_unit


def series_of_k0(z):
    tail = nsum(lambda k: harmonic(k) * (z * z / 4) ** k / fac(k) ** 2, [1, inf])
    return -(ln(z / 2) + euler) * besseli(0, z) + tail


def asymptotic_errors(nu, z, terms):
    """(error of the expansion cut after so many terms, first neglected term), both relative to the leading factor."""
    total, term = mpf(0), mpf(1)
    for k in range(1, terms + 1):
        total += term
        term *= mpf(4 * nu * nu - (2 * k - 1) ** 2) / (8 * k * z)
    return besselk(nu, z) / (sqrt(pi / (2 * z)) * exp(-z)) - total, term


def identity_errors():
    """(equation, how far it is from holding, what is allowed) for each identity at a few points."""
    small, tiny = mpf(10) ** (5 - DIGITS), mpf("1e-12")
    for z in (mpf("0.3"), mpf(2), mpf("7.5")):
        for nu in (0, 1):
            wronskian = besseli(nu, z) * besselk(nu + 1, z) + besseli(nu + 1, z) * besselk(nu, z)
            yield "DLMF 10.28.2", wronskian * z - 1, small
        yield "DLMF 10.29.1", (besselk(2, z) - besselk(0, z)) * z / (2 * besselk(1, z)) - 1, small
        yield "DLMF 10.29.3", diff(lambda y: besselk(0, y), z) / besselk(1, z) + 1, mpf("1e-15")
        yield "DLMF 10.31.2", series_of_k0(z) / besselk(0, z) - 1, mpf("1e-20")
        for nu in (0, 1, 2):
            integral = quad(lambda t: exp(-z * cosh(t)) * cosh(nu * t), [0, 2, 4, 6, 8])
            yield "DLMF 10.32.9", integral / besselk(nu, z) - 1, mpf("1e-20")
    for nu in (1, 2):
        yield "DLMF 10.30.2", besselk(nu, tiny) / (gamma(nu) * (tiny / 2) ** -nu / 2) - 1, tiny
    # The limit is logarithmic: K_0(z) + ln z tends to ln 2 - gamma.
    yield "DLMF 10.30.3", besselk(0, tiny) + ln(tiny) - (ln(2) - euler), tiny
    for nu in (0, 1, 2):
        for terms in (3, 6, 10):
            error, neglected = asymptotic_errors(nu, mpf(25), terms)
            # Between nothing and the whole of the first neglected term, with its sign.
            yield "DLMF 10.40.2", error / neglected - mpf(1) / 2, mpf(1) / 2


def main():
    mp.dps = DIGITS
    record = json.loads(FILE.read_text(encoding="utf-8"))
    wrong = [entry for entry in record["values"] if not table_entry_is_right(entry)]
    for entry in wrong:
        print(f"WRONG: {entry}")
    print(f"{len(record['values'])} table entries, {len(wrong)} wrong")
    failed = set()
    tried = set()
    for equation, error, allowed in identity_errors():
        tried.add(equation)
        if not abs(error) <= allowed:
            failed.add(equation)
            print(f"FAILED: {equation}: {mp.nstr(error, 5)}, allowed {mp.nstr(allowed, 5)}")
    listed = {identity["equation"] for identity in record["identities"]}
    for equation in sorted(listed ^ tried):
        print(f"FAILED: {equation} is listed but not evaluated, or the other way round")
    print(f"{len(tried)} identities, {len(failed)} failed")
    return 1 if wrong or failed or listed != tried or not record["values"] else 0


if __name__ == "__main__":
    sys.exit(main())
