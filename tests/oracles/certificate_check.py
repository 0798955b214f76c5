"""Checks what a certificate says about itself, from references/certificate-format.md alone.

Shape, hash, and the arithmetic between its decimals, in exact fractions. That the bounds are true is not checked here.

    python certificate_check.py FILE...
    python certificate_check.py --program PATH      # makes certificates with the program and checks them
    python certificate_check.py --self-test --program PATH      # every spoilt copy must be found
"""

import argparse
import copy
import hashlib
import json
import re
import shlex
import subprocess
import sys
import tempfile
from fractions import Fraction
from pathlib import Path

DECIMAL = re.compile(r"[0-9]+(\.[0-9]+)?(e-?[0-9]+)?\Z")
MEMBERS = {"format", "format_version", "program", "program_version", "quantity", "inputs", "lower", "upper", "value",
           "digits", "status", "routes", "notes", "caution", "sha256"}
# What every request has, and what each kind of packet adds; the value is what may be missing.
INPUTS = {"packet", "mass", "beyond", "side", "digits"}
OPTIONAL = {"time", "over", "route", "max_bits", "time_limit"}
PARAMETERS = {"box": ({"half_width"}, {"momentum", "rapidity", "boost_velocity"}),
              "cosine": ({"half_width"}, {"mode", "momentum"}), "bspline": ({"half_width", "order"}, {"momentum"}),
              "piecewise": ({"knots", "pieces"}, set()), "ball": ({"radius"}, set()),
              "well": ({"radius"}, {"mode"}), "gaussian": ({"sigma"}, {"momentum"})}
ROUTE = {"name", "method", "lower", "upper", "bits", "nodes", "note", "witness"}
REQUESTS = ["--half-width 1 --time 1", "--half-width 1/3 --mass 0 --time -2.5 --side left",
            "--half-width 1 --time 1 --beyond 115133", "--half-width 1 --time 0 --route kernel",
            "--half-width [0.9,1.1] --time [-1,1] --digits 5", "--half-width 1 --time 1 --digits 60 --max-bits 100",
            "--half-width 1 --time 1 --digits 200 --route kernel --time-limit 100"]


def unique(pairs):
    """An object without repeated members."""
    members = dict(pairs)
    if len(members) != len(pairs):
        raise ValueError("a member occurs twice")
    return members


def no_fraction(text):
    """Numbers with fraction or exponent do not occur."""
    raise ValueError(f"the number {text}")


def decimal(text):
    """A decimal as an exact fraction."""
    if not isinstance(text, str) or not DECIMAL.match(text):
        raise ValueError(f"no decimal: {text!r}")
    return Fraction(text)


def last_unit(text):
    """One unit of the last digit of a decimal."""
    body, _, exponent = text.partition("e")
    return Fraction(10) ** (int(exponent or 0) - len(body.partition(".")[2]))


def ends(holder):
    """The bounds as fractions, in order."""
    lower, upper = decimal(holder["lower"]), decimal(holder["upper"])
    demand(lower <= upper, "bounds in the wrong order")
    return lower, upper


def demand(holds, what):
    """Raises a named complaint."""
    if not holds:
        raise ValueError(what)


def check(text):
    """Raises ValueError with the first thing that is wrong."""
    document = json.loads(text, object_pairs_hook=unique, parse_float=no_fraction)
    demand(isinstance(document, dict) and set(document) - {"at"} == MEMBERS, "members")
    demand(document["format"] == "coneproof-certificate" and document["format_version"] == 1, "format")
    inputs = document["inputs"]
    demand(inputs.get("packet") in PARAMETERS, "packet")
    needed, possible = PARAMETERS[inputs["packet"]]
    demand(INPUTS | needed <= set(inputs) <= INPUTS | OPTIONAL | needed | possible, "members of inputs")
    # An extremum is over a parameter and says where it is taken; everything else has a time.
    demand(("over" in inputs) == ("at" in document) and ("over" in inputs) != ("time" in inputs), "time, over and at")
    if "at" in document:
        ends(document["at"])
    content = {name: value for name, value in document.items() if name != "sha256"}
    canonical = json.dumps(content, sort_keys=True, separators=(",", ":"), ensure_ascii=False)
    demand(hashlib.sha256(canonical.encode("utf-8")).hexdigest() == document["sha256"], "hash")
    lower, upper = ends(document)
    demand(upper <= 1, "a probability above one")
    digits, asked = document["digits"], int(inputs["digits"])
    demand(0 <= digits <= asked and (digits == 0 or (upper - lower) * 10**digits <= lower), "digits")
    demand(document["status"] == ("certified" if digits == asked else "fewer digits"), "status")
    if document["value"] is not None:
        value, unit = decimal(document["value"]), last_unit(document["value"])
        # The unrounded interval lies between the decimals, each within its own last unit.
        slack = last_unit(document["lower"]) + last_unit(document["upper"])
        demand(max(abs(value - lower), abs(value - upper)) < unit + slack, "value")
    for route in document["routes"]:
        demand(set(route) == ROUTE, "members of a route")
        if route["lower"] is not None:
            low, high = ends(route)
            demand(low <= upper and lower <= high, f"the interval of {route['name']}")


def make(program, request, folder):
    """The certificate of one request, as text."""
    path = Path(folder) / "certificate.json"
    command = [*shlex.split(program), "tail", "box", *request.split(), "--certificate", str(path)]
    finished = subprocess.run(command, capture_output=True, text=True, check=False)
    if finished.returncode not in (0, 3):
        sys.exit(f"{request}: status {finished.returncode}: {finished.stderr.strip()}")
    return path.read_text(encoding="utf-8")


def rehashed(document):
    """The document with a fitting hash."""
    content = {name: value for name, value in document.items() if name != "sha256"}
    canonical = json.dumps(content, sort_keys=True, separators=(",", ":"), ensure_ascii=False)
    return json.dumps(content | {"sha256": hashlib.sha256(canonical.encode("utf-8")).hexdigest()})


def spoilt(text):
    """Copies that must be refused, with what was done to them."""
    document = json.loads(text)
    for name in MEMBERS:
        shorter = {key: value for key, value in document.items() if key != name}
        yield f"without {name}", rehashed(shorter) if name != "sha256" else json.dumps(shorter)
    for place in (m.start() for m in re.finditer(r"[0-9]", text)):
        yield f"digit at {place}", text[:place] + str((int(text[place]) + 1) % 10) + text[place + 1:]
    for name, value in (("lower", "1"), ("upper", "0"), ("value", "0.5"), ("digits", 16), ("status", "fewer digits"),
                        ("lower", "-1"), ("upper", "inf"), ("format_version", 2)):
        yield f"{name} = {value}", rehashed(document | {name: value})
    for bound in ({"lower": "0.9", "upper": "0.95"}, {"lower": "1e-9", "upper": "2e-9"}):
        other = copy.deepcopy(document)
        other["routes"][0] |= bound
        yield "a route elsewhere", rehashed(other)


def main():
    """Checks files, fresh certificates, or itself."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("files", nargs="*")
    parser.add_argument("--program")
    parser.add_argument("--self-test", action="store_true")
    options = parser.parse_args()
    texts = [(name, Path(name).read_text(encoding="utf-8")) for name in options.files]
    with tempfile.TemporaryDirectory() as folder:
        if options.program:
            texts += [(request, make(options.program, request, folder)) for request in REQUESTS]
    wrong = 0
    for name, text in texts:
        try:
            check(text)
        except ValueError as error:
            wrong += 1
            print(f"{name}: {error}")
    print(f"{len(texts)} certificates checked, {wrong} wrong")
    if options.self_test:
        found = missed = 0
        for what, text in spoilt(texts[0][1]):
            try:
                check(text)
                missed += 1
                print(f"not noticed: {what}")
            except ValueError:
                found += 1
        print(f"{found} spoilt copies found, {missed} not")
        wrong += missed
    sys.exit(1 if wrong or not texts else 0)


if __name__ == "__main__":
    main()
