"""Runs every command of the README's `sh` blocks, in order, and fails on the first that fails.

A block marked `sh fails=CODE` must end with that exit code.
"""

import re
import subprocess
import sys

text = open(sys.argv[1], encoding="utf-8").read()
blocks = re.findall(r"^```sh(?: fails=(\d+))?\n(.*?)^```$", text, flags=re.S | re.M)
if len(blocks) < 2:
    sys.exit("the README has fewer command blocks than expected")
for code, block in blocks:
    print(f"$ {block.strip()}", flush=True)
    done = subprocess.run(["sh", "-eu", "-c", block], stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True)
    if done.returncode != int(code or 0):
        sys.exit(f"{done.stdout}\nexit code {done.returncode}, expected {code or 0}")
print(f"{len(blocks)} blocks ran")
