"""mpmath.quad on the integrals of bench_quadrature.c, on the ranges as they stand. CPU times only: its tolerance is absolute, so where
the value is tiny it stops early and is wrong. Runs of over 3 seconds are given up."""
import json
import os
import signal
import statistics
import subprocess
import sys
import time

import mpmath
from mpmath import mp, mpf


here = os.path.dirname(os.path.dirname(os.path.dirname(os.path.abspath(__file__))))
program = os.path.join(here, sys.argv[1] if len(sys.argv) > 1 else "build", "termwise")
PARAMETERS = (5, 100, 10 ** 4, 10 ** 6)


class TooLong(Exception):
    pass


def give_up(signum, frame):
    raise TooLong


signal.signal(signal.SIGPROF, give_up)
third = lambda: mpf(2) / 3
CASES = [
    ("exp(-s*x)/sqrt(1+x^2)", lambda s: lambda x: mp.exp(-s * x) / mp.sqrt(1 + x * x), [0, mp.inf]),
    ("x^(-2/3)*exp(-s*x)/(1+x)", lambda s: lambda x: x ** -third() * mp.exp(-s * x) / (1 + x), [0, mp.inf]),
    ("exp(-s*x)*log(x)/(1+x)", lambda s: lambda x: mp.exp(-s * x) * mp.log(x) / (1 + x), [0, mp.inf]),
    ("exp(-s*(x-log(x)))", lambda s: lambda x: mp.exp(-s * (x - mp.log(x))), [0, mp.inf]),
    ("exp(-s*(x^2/2+x^4/4))/(1+x^2)", lambda s: lambda x: mp.exp(-s * (x * x / 2 + x ** 4 / 4)) / (1 + x * x), [-mp.inf, mp.inf]),
    ("exp(-s*cosh(x))", lambda s: lambda x: mp.exp(-s * mp.cosh(x)), [0, mp.inf]),
    ("exp(-s*x)/((20*x-1)^2+1)", lambda s: lambda x: mp.exp(-s * x) / ((20 * x - 1) ** 2 + 1), [0, mp.inf]),
]


def timed(f, points, digits):
    """(ms or None, value or None)"""
    mp.dps = digits
    signal.setitimer(signal.ITIMER_PROF, 3)
    try:
        start = time.process_time()
        value = mpmath.quad(f, points)
        return 1000 * (time.process_time() - start), value
    except (TooLong, OverflowError, MemoryError, ZeroDivisionError, ValueError):
        return None, None
    finally:
        signal.setitimer(signal.ITIMER_PROF, 0)


def median_of(make, s, points, digits):
    runs = [timed(make(s), points, digits)]
    if runs[0][0] is not None and runs[0][0] < 300:
        runs += [timed(make(s), points, digits) for _ in range(2)]
    known = [t for t, _ in runs if t is not None]
    return (statistics.median(known) if known else None), runs[0][1]


def certified(name, points, s):
    """The value by the program, to 20 digits."""
    ends = ["-inf" if p == -mp.inf else "inf" if p == mp.inf else str(p) for p in points]
    body = "integral from %s to %s of %s dx" % (ends[0], ends[1], name)
    r = subprocess.run([program, "--results", "json", "-e", "evaluate %s at s = %d to 20 digits" % (body, s)],
                       stdout=subprocess.PIPE, text=True, check=True)
    mp.dps = 30
    return mpf(json.loads(r.stdout)["re"]["mid"])


def table():
    """{digits: [(ms or None, 8 digits are right), ...]}"""
    found = {16: [], 50: [], 200: []}
    for name, make, points in CASES:
        for s in PARAMETERS:
            truth = certified(name, points, s)
            for digits in found:
                ms, value = median_of(make, s, points, digits)
                mp.dps = 30
                good = value is not None and abs(value - truth) <= mpf(10) ** -8 * abs(truth)
                found[digits].append((ms, good))
    return found


def main():
    for name, make, points in CASES:
        for s in PARAMETERS:
            line = []
            for digits in (16, 50, 200):
                ms, _ = median_of(make, s, points, digits)
                line.append("%d: over 3 s" % digits if ms is None else "%d: %.1f ms" % (digits, ms))
            print("mpmath.quad %s, s = %d\n    %s" % (name, s, "  ".join(line)), flush=True)


if __name__ == "__main__":
    main()
