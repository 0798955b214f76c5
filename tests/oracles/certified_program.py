"""Runs the certified program for a box at rest and reads the interval it prints as JSON."""

import json
import shlex
import subprocess
from fractions import Fraction


class ProgramFailed(Exception):
    """The program ended with an error, or its answer could not be read."""


def find_interval(record):
    """The first object with both "lower" and "upper", wherever it stands in the record."""
    if isinstance(record, dict):
        if "lower" in record and "upper" in record:
            return record["lower"], record["upper"]
        record = list(record.values())
    if isinstance(record, list):
        for part in record:
            found = find_interval(part)
            if found:
                return found
    return None


def tail_of_box(program, half_width, mass, time, beyond, digits):
    """Printed ends of P(|x| > beyond), or of the tail beyond the light cone for None, as (lower, upper) strings."""
    command = shlex.split(program) + ["tail", "box", "--half-width", half_width, "--mass", mass, "--time", time]
    if beyond is not None:
        command += ["--beyond", beyond]
    command += ["--digits", str(digits), "--format", "json"]
    finished = subprocess.run(command, capture_output=True, text=True, check=False)
    if finished.returncode:
        raise ProgramFailed(f"status {finished.returncode}: {finished.stderr.strip()[:500]}")
    try:
        ends = find_interval(json.loads(finished.stdout))
        if ends is None:
            raise ProgramFailed("no lower and upper in its answer")
        lower, upper = (Fraction(end) for end in ends)
    except (ValueError, TypeError) as error:
        raise ProgramFailed(f"unreadable answer: {error}") from error
    if lower > upper:
        raise ProgramFailed("the ends of its interval are exchanged")
    return ends
