"""The figures of the README, in the form in which they stand there. usage: figures.py BUILD
CPU times in milliseconds, medians; quadrature beside mpmath.quad on the same integrals, with how many of its values have 8 right
digits, judged by the certified ones (its tolerance is absolute)."""
import math
import os
import re
import statistics
import subprocess
import sys

here = os.path.dirname(os.path.dirname(os.path.dirname(os.path.abspath(__file__))))
sys.path.insert(0, os.path.join(here, "tests", "bench"))
build = os.path.join(here, sys.argv[1] if len(sys.argv) > 1 else "build")
import bench_quadrature as judge  # noqa: E402

GOALS = {"start-up": "10", "x-rational": "50", "algebraic": "50"}


def lines_of(*command):
    return subprocess.run(command, stdout=subprocess.PIPE, text=True, check=True, cwd=here).stdout.splitlines()


def program_rows():
    lines = lines_of(sys.executable, "tests/bench/bench_program.py", os.path.relpath(build, here))
    number = lambda line: re.search(r": ([0-9.]+) ms", line).group(1)
    yield "start to first prompt", "%s (of it the system's loader: %s)" % (number(lines[0]), number(lines[1])), "under 10"
    for line in lines:
        m = re.match(r"(x-rational|algebraic|logarithm|fractional powers) +([0-9.-]+) +([0-9.-]+) +([0-9.-]+) .*N\^([0-9.]+)", line)
        if m:
            few, some, many = (max(0.0, float(m.group(k))) for k in (2, 3, 4))
            yield ("8, 100, 1000 coefficients, " + m.group(1), "%.1f, %.1f, %.1f (growth N^%s)" % (few, some, many, m.group(5)),
                   "1000 under 50" if m.group(1) in GOALS else "growth below N^2 log N")
    m = re.search(r"([0-9.]+) MB/s", "\n".join(lines))
    yield "reading a script of 10 MB", "%s MB/s" % m.group(1), ""


def remainder_rows():
    times, one, quality = [], [], []
    for line in lines_of(os.path.join(build, "tests", "bench", "bench_remainder")):
        m = re.search(r"one s ([0-9.]+) .*quality ([0-9.]+) .* ([0-9.]+) \+ ([0-9.]+) ms", line)
        if m:
            one.append(float(m.group(1)))
            quality.append(float(m.group(2)))
            times.append(float(m.group(3)) + float(m.group(4)))
    yield ("bound of the remainder, %d integrals, median and worst" % len(times),
           "%.1f, %.1f" % (statistics.median(times), max(times)), "")
    yield "... bound/error at one s, worst", "%.3f" % max(one), "1.05"
    yield "... bound/error for all s >= s0, worst", "%.2f" % max(quality), "2.5"


def our_quadrature():
    """{digits: [ms, ...]} of all cases."""
    found = {16: [], 50: [], 200: []}
    for line in lines_of(os.path.join(build, "tests", "bench", "bench_quadrature")):
        for digits, ms in re.findall(r"(16|50|200): ([0-9.]+) ms", line):
            found[int(digits)].append(float(ms))
    return found


def quadrature_rows():
    ours, theirs = our_quadrature(), judge.table()
    for digits in (16, 50, 200):
        times = sorted(t for t, _ in theirs[digits] if t is not None)
        right = sum(1 for _, good in theirs[digits] if good)
        slow = len(theirs[digits]) - len(times)
        yield ("certified quadrature, %d digits, median and worst of %d" % (digits, len(ours[digits])),
               "%.1f, %.1f" % (statistics.median(ours[digits]), max(ours[digits])), "12 at most" if digits < 200 else "")
        yield ("... mpmath.quad, median and worst of %d" % len(theirs[digits]),
               "%.1f, %s; 8 digits right: %d" % (statistics.median(times), "over 3000" if slow else "%.1f" % times[-1], right), "")


print("| what | CPU ms | goal |")
print("| --- | --- | --- |")
for rows in (program_rows, remainder_rows, quadrature_rows):
    for row in rows():
        print("| %s | %s | %s |" % row, flush=True)
