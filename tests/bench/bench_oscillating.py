"""Certified quadrature of oscillating integrals, the program as a user runs it, beside mpmath on the same integrals: quadosc where the
phase is linear, else quad over one panel an oscillation. Medians in milliseconds; the program's start-up is taken off. Runs of
mpmath of over a second are given up. usage: bench_oscillating.py BUILD"""
import os
import signal
import statistics
import subprocess
import sys
import time

import mpmath
from mpmath import mp, mpf

program = os.path.join(sys.argv[1] if len(sys.argv) > 1 else "build", "termwise")


class TooLong(Exception):
    pass


def give_up(signum, frame):
    raise TooLong


signal.signal(signal.SIGALRM, give_up)


def osc(f, s):
    return mpmath.quadosc(f, [0, mp.inf], omega=s)


def panels(a, b, steepest):
    return lambda f, s: mpmath.quad(f, mpmath.linspace(a, b, int(steepest * s * (b - a) / 6) + 4))


CASES = [
    ("integral from 0 to inf of cos(s*x)/(1 + x^2) dx", lambda s: lambda x: mp.cos(s * x) / (1 + x * x), osc),
    ("integral from 0 to inf of sin(s*x)/sqrt(1 + x) dx", lambda s: lambda x: mp.sin(s * x) / mp.sqrt(1 + x), osc),
    ("integral from 0 to 2 of cos(s*(x^2 - x))/(1 + x) dx", lambda s: lambda x: mp.cos(s * (x * x - x)) / (1 + x),
     panels(0, 2, 3)),
    ("integral from 0 to pi of cos(s*sin(x)) dx", lambda s: lambda x: mp.cos(s * mp.sin(x)), panels(0, mp.pi, 1)),
    ("integral from 0 to 1 of exp(i*s*x)*x^(-1/3)*(1 - x)^(1/4) dx",
     lambda s: lambda x: mp.expj(s * x) * x ** (-mpf(1) / 3) * (1 - x) ** mpf("0.25"), panels(0, 1, 1)),
]


def run(statements):
    start = time.perf_counter()
    subprocess.run([program, "--quiet"], input="large s\n" + statements, text=True, stdout=subprocess.DEVNULL, check=True)
    return 1000 * (time.perf_counter() - start)


def ours(integral, s, digits):
    repeats = 2
    line = "evaluate %s at s = %d to %d digits\n" % (integral, s, digits)
    return statistics.median(run(line * repeats) - run("") for _ in range(2)) / repeats


def theirs(f, way, s, digits):
    mp.dps = digits
    signal.alarm(1)
    try:
        start = time.perf_counter()
        way(f(mpf(s)), mpf(s))
        return "%8.1f" % (1000 * (time.perf_counter() - start))
    except (TooLong, OverflowError, MemoryError, ZeroDivisionError, ValueError):
        return "       -"
    finally:
        signal.alarm(0)


print("%-62s %9s %6s %8s %8s" % ("integral", "s", "digits", "ours", "mpmath"))
for integral, f, way in CASES:
    for s in (100, 10**4, 10**6):
        for digits in (16, 50):
            print("%-62s %9d %6d %8.1f %s" % (integral, s, digits, ours(integral, s, digits), theirs(f, way, s, digits)))
