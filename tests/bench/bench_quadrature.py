"""mpmath.quad on the integrals of bench_quadrature.c, on the ranges as they stand. Times only: its tolerance is absolute, so where
the value is tiny it stops early and is wrong. Runs of over 3 seconds are given up."""
import signal
import statistics
import time

import mpmath
from mpmath import mp, mpf


class TooLong(Exception):
    pass


def give_up(signum, frame):
    raise TooLong


signal.signal(signal.SIGALRM, give_up)
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
    mp.dps = digits
    signal.alarm(3)
    try:
        start = time.perf_counter()
        mpmath.quad(f, points)
        return 1000 * (time.perf_counter() - start)
    except (TooLong, OverflowError, MemoryError, ZeroDivisionError, ValueError):
        return None
    finally:
        signal.alarm(0)


for name, make, points in CASES:
    for s in (5, 100, 10 ** 4, 10 ** 6):
        line = []
        for digits in (16, 50, 200):
            runs = [timed(make(s), points, digits)]
            if runs[0] is not None and runs[0] < 300:
                runs += [timed(make(s), points, digits) for _ in range(2)]
            known = [t for t in runs if t is not None]
            line.append("%d: %.1f ms" % (digits, statistics.median(known)) if known else "%d: over 3 s" % digits)
        print("mpmath.quad %s, s = %d\n    %s" % (name, s, "  ".join(line)), flush=True)
