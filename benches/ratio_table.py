#!/usr/bin/env python3
"""Prints the time of one box tail by each route, as a ratio to a yardstick timed in the same run.

    python3 benches/ratio_table.py [--program target/release/coneproof] [--yardsticks FOLDER] [--runs 9]

FOLDER holds programs `panels` and `convolution` that take half-width, time and digits (mass 1) and print
`time=SECONDS`; without it the times stand alone. Every time is the best of the runs, each in a fresh process,
measured inside the process by the program itself; `whole process` is measured from outside.
"""

import argparse
import json
import os
import re
import subprocess
import time

CASES = [("1", "1"), ("1/10", "100"), ("20", "20"), ("1/1000000", "1"), ("2", "1000")]


def run(command, **environment):
    start = time.perf_counter()
    done = subprocess.run(command, capture_output=True, text=True, env={**os.environ, **environment})
    return done.stdout, time.perf_counter() - start


def coneproof(program, a, t, digits, route, runs, threads="1"):
    best = whole = None
    command = [program, "tail", "box", "--half-width", a, "--mass", "1", "--time", t, "--digits", str(digits),
               "--route", route, "--format", "json"]
    for _ in range(runs):
        output, outside = run(command, RAYON_NUM_THREADS=threads)
        result = json.loads(output)
        if result["status"] != "certified":
            return None, None
        best = min(best or 1e9, result["seconds"])
        whole = min(whole or 1e9, outside)
    return best, whole


def yardstick(folder, name, a, t, digits, runs):
    def decimal(text):
        top, _, bottom = text.partition("/")
        return repr(int(top) / int(bottom)) if bottom else top

    times = []
    for _ in range(runs):
        found = re.search(r"time=([0-9.]+)", run([os.path.join(folder, name), decimal(a), decimal(t), str(digits)])[0])
        if not found:
            return None
        times.append(float(found.group(1)))
    return min(times)


def shown(seconds):
    return "-" if seconds is None else f"{1e3 * seconds:.2f} ms"


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--program", default="target/release/coneproof")
    parser.add_argument("--yardsticks")
    parser.add_argument("--runs", type=int, default=9)
    options = parser.parse_args()
    print("| a, t | digits | kernel | spectral | both | yardstick | faster route / yardstick | both / faster |")
    print("|---|---|---|---|---|---|---|---|")
    for a, t in CASES:
        for digits in (15, 30, 100) + ((1000,) if (a, t) == ("1", "1") else ()):
            runs = options.runs if digits < 1000 else min(options.runs, 3)
            kernel, _ = coneproof(options.program, a, t, digits, "kernel", runs)
            spectral, both = None, None
            if digits < 1000:
                spectral, _ = coneproof(options.program, a, t, digits, "spectral", runs)
                both, _ = coneproof(options.program, a, t, digits, "both", runs, threads="2")
            peers = []
            # The yardsticks take absolute digits and are slow away from (1, 1).
            if options.yardsticks and (a, t) == ("1", "1"):
                names = ("panels", "convolution") if digits < 1000 else ("panels",)
                peers = [yardstick(options.yardsticks, name, a, t, digits, runs) for name in names]
            peer = min((p for p in peers if p), default=None)
            faster = min((s for s in (kernel, spectral) if s), default=None)
            ratio = f"{faster / peer:.2f}" if faster and peer else "-"
            times = f"{both / faster:.1f}" if both and faster else "-"
            print(f"| {a}, {t} | {digits} | {shown(kernel)} | {shown(spectral)} | {shown(both)} | {shown(peer)} "
                  f"| {ratio} | {times} |", flush=True)
    one, _ = coneproof(options.program, "1", "1", 1000, "kernel", 3, threads="1")
    two, _ = coneproof(options.program, "1", "1", 1000, "kernel", 3, threads="2")
    print(f"\n1000 digits, kernel: one thread {shown(one)}, two threads {shown(two)}, ratio {one / two:.2f}")
    _, whole = coneproof(options.program, "1", "1", 15, "both", options.runs)
    print(f"whole process, cold, 15 digits, both routes: {shown(whole)}")


if __name__ == "__main__":
    main()
