"""Values of the dilogarithm from mpmath, and the identities that the tests rest on.

    python dilogarithm.py             checks every entry of references/dilogarithm.json and every identity
    python dilogarithm.py --write     writes the file

mpmath.polylog works by another series for most arguments (zeta values, or its own inversion), so it judges the
program's reductions. Each value is computed twice, at 80 and at 120 digits, and must agree to 60.
"""

import json
import sys
from pathlib import Path

import mpmath
from mpmath import log, mp, mpf, pi, polylog

FILE = Path(__file__).resolve().parents[2] / "references" / "dilogarithm.json"
DIGITS = 50
ARGUMENTS = (
    "1e-30 1/1000000007 1/10 1/4 49/100 1/2 51/100 7/10 9/10 999/1000 999999999/1000000000 "
    "-1e-30 -1/10 -49/100 -1/2 -51/100 -9/10 -999999/1000000 -1 -1000001/1000000 -3/2 -2 -21/10 -10 -1000 -1e30"
).split()


def number(text):
    top, _, bottom = text.partition("/")
    return mpf(top) / mpf(bottom or 1)


def value(text):
    results = []
    for digits in (80, 120):
        mp.dps = digits
        results.append(polylog(2, number(text)).real)
    mp.dps = 80
    assert abs(results[0] - results[1]) <= abs(results[1]) * mpf(10) ** -60, text
    return mp.nstr(results[1], DIGITS, strip_zeros=False)


def identity_errors():
    mp.dps = 60
    li = lambda x: polylog(2, x).real
    for x in (mpf("0.1"), mpf("0.37"), mpf("0.8")):
        yield "DLMF 25.12.3", li(-x) + li(x / (1 + x)) + log(1 + x) ** 2 / 2
        yield "DLMF 25.12.4", li(-x) + li(-1 / x) + pi**2 / 6 + log(x) ** 2 / 2
        yield "DLMF 25.12.5", li(x * x) - 2 * (li(x) + li(-x))
        yield "DLMF 25.12.6", li(x) + li(1 - x) - pi**2 / 6 + log(x) * log(1 - x)
        for y in (mpf("0.2"), mpf("0.9")):
            u, v = x * (1 - y) / (1 - x * y), y * (1 - x) / (1 - x * y)
            yield "five terms", li(x) + li(y) - li(x * y) - li(u) - li(v) - log(1 - u) * log(1 - v)


def main():
    if "--write" in sys.argv:
        record = {
            "source": f"mpmath {mpmath.__version__}, polylog(2, x), by tests/oracles/dilogarithm.py --write",
            "how": "Computed at 80 and at 120 digits, agreeing to 60; rounded to nearest at 50 digits.",
            "values": [{"x": text, "value": value(text)} for text in ARGUMENTS],
        }
        FILE.write_text(json.dumps(record, indent=1) + "\n", encoding="utf-8")
    record = json.loads(FILE.read_text(encoding="utf-8"))
    wrong = [entry for entry in record["values"] if entry["value"] != value(entry["x"])]
    failed = [name for name, error in identity_errors() if not abs(error) < mpf(10) ** -50]
    print(f"{len(record['values'])} values, {len(wrong)} wrong; failed identities: {failed or 'none'}")
    return 1 if wrong or failed or not record["values"] else 0


if __name__ == "__main__":
    sys.exit(main())
