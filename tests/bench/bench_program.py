"""The program as a user starts it: start-up, coefficients, parsing. usage: bench_program.py BUILD
Prints medians of CPU time in milliseconds; coefficient times have the start-up time taken off."""
import math
import os
import resource
import statistics
import subprocess
import sys
import tempfile

here = os.path.dirname(os.path.dirname(os.path.dirname(os.path.abspath(__file__))))
build = os.path.join(here, sys.argv[1] if len(sys.argv) > 1 else "build")
program = os.path.join(build, "termwise")
env = dict(os.environ, TW_STDLIB=os.path.join(here, "stdlib"))


def median_ms(command, repeat=15):
    times = []
    for _ in range(repeat):
        before = resource.getrusage(resource.RUSAGE_CHILDREN)
        subprocess.run(command, env=env, stdout=subprocess.DEVNULL, stdin=subprocess.DEVNULL, check=True)
        after = resource.getrusage(resource.RUSAGE_CHILDREN)
        times.append(1000 * (after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime))
    return statistics.median(times)


start_up = median_ms([program, "-e", "quit"], 60)
print("start-up: %.1f ms" % start_up)
print("an empty program with the same libraries: %.1f ms" % median_ms([os.path.join(build, "tests", "bench", "empty")], 60))

INTEGRANDS = [
    ("x-rational", "1/(2 + 3*x + x^2)"), ("algebraic", "(1 + x)^(1/3)/sqrt(1 + x^2)"),
    ("logarithm", "log(1 + 2*x)"), ("fractional powers", "x^(-2/3)*(1 + sqrt(x))^(1/2)"),
]
print("%-20s %10s %10s %10s" % ("coefficients, ms", 8, 100, 1000))
for name, q in INTEGRANDS:
    row = []
    for n in (8, 100, 1000):
        script = "large s\nexpand integral from 0 to inf of exp(-s*x)*%s dx to %d terms" % (q, n)
        row.append(median_ms([program, "--quiet", "-e", script], 5) - start_up)
    print("%-20s %10.1f %10.1f %10.1f   growth from 100 to 1000: N^%.1f" % (name, *row, math.log10(row[2] / row[1])))

with tempfile.NamedTemporaryFile("w", suffix=".tw") as f:
    line = "let F%d = integral from 0 to inf of exp(-s*x)*(1 + x^2)^(-1/2)*cos(3*x) dx\n"
    size = 0
    k = 0
    while size < 10_000_000:
        size += f.write(line % k)
        k += 1
    f.flush()
    took = median_ms([program, "--parse-only", f.name], 3)
    print("parse %.1f MB: %.0f ms, %.1f MB/s" % (size / 1e6, took, size / 1e3 / took))
peak = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1024
print("greatest resident memory of these runs: %.0f MiB" % peak)
