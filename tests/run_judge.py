"""Proved numbers judged by mpmath, which shares no code with the program. usage: run_judge.py BUILD
TW_SEED and TW_TRIALS (default 100) may be set. Random integrals of the Watson and parts families are evaluated by the program
from their expansions; mpmath integrates the same integrand at 40 digits. A trial counts when mpmath's own error estimate is
below a tenth of the radius."""
import os
import random
import sys

import mpmath
from mpmath import mp, mpf

from reader import Program, Score, split_integral, value

seed = int(os.environ.get("TW_SEED", random.randrange(10**9)))
trials = int(os.environ.get("TW_TRIALS", 100))
print("seed", seed)
rng = random.Random(seed)
program = Program(sys.argv[1] if len(sys.argv) > 1 else "build")
score = Score()


def small():
    return rng.choice(["1/3", "1/2", "2/3", "1", "3/2", "2", "5/2", "3"])


def factor():
    """Smooth on x >= 0, of moderate growth."""
    a, b = small(), small()
    return rng.choice([
        "1/(1 + %s*x)" % a, "(1 + %s*x)^(%s)" % (a, rng.choice(["1/3", "-1/2", "3/2", "-5/3", "2"])),
        "1/sqrt(1 + %s*x^2)" % a, "cos(%s*x)" % a, "exp(-%s*x)" % a, "log(2 + %s*x)" % a, "1/(2 + %s*x + x^2)" % a,
        "cosh(%s*x)" % a, "atan(1 + %s*x)" % a, "(%s + x)" % b, "tanh(1 + x)", "exp(-%s*x^2)" % a, "erfc(%s*x)" % a])


def integral():
    q = "*".join(factor() for _ in range(rng.randint(1, 2)))
    kernel, start, end, denominator = "exp(-s*x)", "0", "inf", 1
    kind = rng.randrange(6)
    if kind == 1:
        power = rng.choice(["1/2", "-1/2", "-2/3", "1/3", "2"])
        q, denominator = "x^(%s)*%s" % (power, q), 6
    elif kind == 2:
        kernel = "exp(-%s*s*x)" % small()
    elif kind == 3:
        kernel = "exp(-s*x^2)"
    elif kind == 4:
        end = rng.choice(["1", "2", "3"])
    elif kind == 5:
        start = rng.choice(["1/2", "1", "2"])
    return "integral from %s to %s of %s*%s dx" % (start, end, kernel, q), denominator


def judge(words, s, denominator):
    """Value and error estimate: x = start + u^d/s takes the power at the end away, panels follow the decay. mpmath's tolerance
    is absolute, so exp(-s*start) is taken out first."""
    mp.dps = 40
    start, end, body, _ = split_integral(words)
    lo, hi = value(start), value(end)
    scale = mpmath.exp(s * lo)
    code = {}

    def f(u):
        x = lo + u**denominator / s
        return value(body, x=x, s=s) * scale * denominator * u ** (denominator - 1) / s

    d = mpf(1) / denominator
    last, tail = (hi - lo) * s, 0
    if hi == mpmath.inf:  # the range is cut where exponential decay has left nothing; what is cut off counts as doubt
        last = next((p for p in map(mpf, (150, 400, 1000, 2500)) if abs(f(p**d)) * p < mpf(10) ** -50), mpf(2500))
        tail = abs(f(last**d)) * last
    points = [mpf(0)] + [p**d for p in (0.05, 0.3, 1, 3, 8, 20, 50, 100, 300, 800) if p < last] + [last**d]
    got, error = mpmath.quad(f, points, error=True)
    return got / scale, (error + tail) / scale


counted = 0
for trial in range(trials):
    words, denominator = integral()
    s = rng.choice([5, 8, 12, 20, 40])
    results, status, complaints = program.run("large s\nlet F = %s\nlet A = expand F to 12 terms\nevaluate A at s = %d\n" % (words, s))
    if status != 0:
        print("not expanded:", words, complaints.strip().split("\n")[0])
        continue
    r = results[-1]
    mid, radius = mpf(r["re"]["mid"]), mpf(r["re"]["radius"])
    want, doubt = judge(words, mpf(s), denominator)
    if r["label"] not in ("proved", "exact") or doubt > radius / 10 + mpf(10) ** -30 * abs(want):
        print("not counted:", r["label"], mpmath.nstr(doubt, 3), mpmath.nstr(radius, 3), words, "s =", s, r.get("reason", ""))
        continue
    counted += 1
    score.check(abs(mid - want) <= radius + doubt + mpf(10) ** -30 * abs(want),
                "%s at s = %d: %s +- %s, mpmath %s" % (words, s, r["re"]["mid"], r["re"]["radius"], mpmath.nstr(want, 30)))
score.check(counted >= 0.95 * trials, "only %d of %d trials counted" % (counted, trials))
score.end()
