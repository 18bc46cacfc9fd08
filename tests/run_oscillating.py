"""Certified quadrature of oscillating integrals judged by mpmath, which shares no code with the program. usage:
run_oscillating.py BUILD. At s = 10, 10^2, 10^4, 10^6: closed forms (their source beside them) evaluated by mpmath at 40 digits.
At random (TW_SEED, TW_TRIALS): integrals along the real line at s where mpmath's own quadrature, panel by panel over the
oscillations, can still follow."""
import os
import random
import sys

import mpmath
from mpmath import mp, mpf

from reader import Program, Score, split_integral, value

seed = int(os.environ.get("TW_SEED", random.randrange(10**9)))
trials = int(os.environ.get("TW_TRIALS", 12))
print("seed", seed)
rng = random.Random(seed)
program = Program(sys.argv[1] if len(sys.argv) > 1 else "build")
score = Score()
mp.dps = 40


# integral, value as a function of s, source
CLOSED = [
    ("integral from 0 to inf of cos(s*x)/(1 + x^2) dx", lambda s: mpmath.pi / 2 * mpmath.exp(-s), "DLMF 1.14, table 1.14.2"),
    ("integral from 0 to inf of x*sin(s*x)/(1 + x^2) dx", lambda s: mpmath.pi / 2 * mpmath.exp(-s), "its derivative in s"),
    ("integral from 0 to inf of cos(s*x)/sqrt(1 + x^2) dx", lambda s: mpmath.besselk(0, s), "DLMF 10.32.6"),
    ("integral from 0 to inf of sin(s*sinh(x)) dx", lambda s: mpmath.pi / 2 * (mpmath.besseli(0, s) - mpmath.struvel(0, s))
     if s < 50 else None, "DLMF 11.5.6"),
    ("integral from 0 to inf of cos(s*cosh(x)) dx", lambda s: -mpmath.pi / 2 * mpmath.bessely(0, s), "DLMF 10.9.9"),
    ("integral from 0 to pi of cos(s*sin(x)) dx", lambda s: mpmath.pi * mpmath.besselj(0, s), "DLMF 10.9.1"),
    ("integral from 0 to pi of cos(3*x - s*sin(x)) dx", lambda s: mpmath.pi * mpmath.besselj(3, s), "DLMF 10.9.2"),
    ("integral from 0 to 1 of cos(s*x)/sqrt(1 - x^2) dx", lambda s: mpmath.pi / 2 * mpmath.besselj(0, s), "DLMF 10.9.4"),
    ("integral from 1 to inf of sin(s*x)/sqrt(x^2 - 1) dx", lambda s: mpmath.pi / 2 * mpmath.besselj(0, s), "DLMF 10.9.12"),
    ("integral from 0 to inf of cos(s*x^2) dx", lambda s: mpmath.sqrt(mpmath.pi / (8 * s)), "DLMF 7.7.3 and 7.4.1"),
    ("integral from 0 to 1 of sin(s*x^2) dx", lambda s: mpmath.sqrt(mpmath.pi / (2 * s)) * mpmath.fresnels(
        mpmath.sqrt(2 * s / mpmath.pi)), "DLMF 7.2.8"),
    ("integral from 0 to inf of cos(s*(x^3/3 + x)) dx", lambda s: mpmath.pi * s ** (-mpf(1) / 3) * mpmath.airyai(
        mpf(s) ** (mpf(2) / 3)), "DLMF 9.5.1"),
    ("integral from 0 to inf of cos(s*(x^3/3 - x)) dx", lambda s: mpmath.pi * s ** (-mpf(1) / 3) * mpmath.airyai(
        -mpf(s) ** (mpf(2) / 3)), "DLMF 9.5.1"),
    ("integral from 0 to inf of cos(s*x)/cosh(x) dx", lambda s: mpmath.pi / 2 * mpmath.sech(mpmath.pi * s / 2), "DLMF 4.40.7 at its "
     "contour"),
    ("integral from 0 to inf of exp(-x^2)*cos(s*x) dx", lambda s: mpmath.sqrt(mpmath.pi) / 2 * mpmath.exp(-mpf(s) ** 2 / 4),
     "DLMF 7.7.3 at a = 1"),
    ("integral from 0 to inf of sin(s*x)/x dx", lambda s: mpmath.pi / 2, "DLMF 6.2.14"),
    ("integral from 1 to inf of sin(s*x)/x dx", lambda s: mpmath.pi / 2 - mpmath.si(s), "DLMF 6.2.10"),
    ("integral from 1 to inf of exp(i*s*x)/x dx", lambda s: mpmath.e1(mpmath.mpc(0, -s)), "DLMF 6.2.2"),
    ("integral from 0 to inf of exp(i*s*x)/(1 + x) dx", lambda s: mpmath.exp(mpmath.mpc(0, -s)) * mpmath.e1(mpmath.mpc(0, -s)),
     "DLMF 6.2.2"),
    ("integral from 0 to inf of sin(s*x)^2/x^2 dx", lambda s: mpmath.pi * s / 2, "by parts from DLMF 6.2.14"),
    ("integral from 0 to inf of x^(-1/3)*cos(s*x) dx", lambda s: mpmath.gamma(mpf(2) / 3) * s ** (-mpf(2) / 3) / 2, "DLMF 5.9.6"),
    ("integral from 0 to inf of sqrt(x)*exp(-x)*cos(s*x) dx", lambda s: (mpmath.gamma(mpf(3) / 2) * mpmath.mpc(
        1, -s) ** (-mpf(3) / 2)).real, "DLMF 5.9.1"),
    ("integral from 0 to 1 of x^(-1/3)*(1 - x)^(1/4)*exp(i*s*x) dx", lambda s: mpmath.beta(mpf(2) / 3, mpf(5) / 4) * mpmath.hyp1f1(
        mpf(2) / 3, mpf(23) / 12, mpmath.mpc(0, s)), "DLMF 13.4.1"),
    ("integral from 0 to inf of sin(s*sqrt(x))*exp(-x) dx", lambda s: s * mpmath.sqrt(mpmath.pi) / 2 * mpmath.exp(
        -mpf(s) ** 2 / 4), "DLMF 7.7.3 and its derivative"),
]


def numbers(script):
    """The numbers that the lines of a script give, in order; None for a failed one."""
    results, _, complaints = program.run("large s\n" + script, "--keep-going")
    out = []
    for r in results:
        if r["result"] == "number":
            out.append(r)
        elif r["result"] == "error":
            print(r["message"])
            out.append(None)
    return out


def judge(name, r, want, doubt, digits):
    """The ball holds the value; each part is as accurate as was asked."""
    if r is None or r["label"] != "proved":
        score.check(False, "%s: no proved value" % name)
        return
    for part in ("re", "im"):
        mid, radius, known = mpf(r[part]["mid"]), mpf(r[part]["radius"]), getattr(mpmath.mpc(want), "real" if part == "re" else
                                                                               "imag")
        score.check(abs(mid - known) <= radius + doubt + abs(want) * mpf(10) ** -36,
                    "%s: %s is %s +/- %s, not %s" % (name, part, r[part]["mid"], r[part]["radius"], mpmath.nstr(known, 30)))
        if known:
            score.check(radius <= abs(known) * mpf(10) ** (1 - digits), "%s: radius of %s %s" % (name, part, r[part]["radius"]))


def closed_forms():
    for s in (10, 100, 10**4, 10**6):
        got = numbers("".join("evaluate %s at s = %d to 20 digits\n" % (words, s) for words, _, _ in CLOSED))
        for (words, closed, source), r in zip(CLOSED, got):
            want = closed(mpf(s))
            if want is not None:
                judge("%s at s = %d (%s)" % (words, s, source), r, want, 0, 20)


def panels(f, a, b, s, steepest):
    """mpmath's Gauss-Legendre panel by panel, about one oscillation each; (value, its own estimate of the error)."""
    n = int(steepest * s * (b - a) / 6) + 4
    return mpmath.quad(f, mpmath.linspace(a, b, n + 1), error=True, method="gauss-legendre")


def random_case():
    a = rng.choice(["1/3", "1/2", "1", "2", "3"])
    q = rng.choice(["1/(1 + %s*x)", "1/sqrt(1 + %s*x^2)", "exp(-%s*x)", "log(2 + %s*x)", "1/(1 + %s*x^2)", "cosh(x/%s)",
                    "(2 + x)^(%s)", "atan(1 + %s*x)", "tanh(1 + %s*x)", "1/((4*x - 1)^2 + %s)"]) % a
    p, steepest = rng.choice([("x", 1), ("x^2", 4), ("x^2 - x", 3), ("x^3/3 - x/2", 4), ("x + x^2/4", 2), ("sin(2*x)", 2),
                              ("exp(x/2)", 2), ("x^4/4 - x^2/3", 8), ("sqrt(1 + x^2)", 1), ("log(1 + x)", 1), ("x^3", 12)])
    kernel = rng.choice(["cos(s*(%s))", "sin(s*(%s))", "exp(i*s*(%s))"]) % p
    if rng.randrange(3) == 0 and "cosh" not in q:
        return "integral from 0 to inf of %s*exp(-x)*%s dx" % (kernel.replace(p, "x"), q), 0, 60, 1
    low, high = rng.choice([(0, 1), (0, 2), (mpf(1) / 2, 2), (-1, 1) if "log" not in p else (0, 1)])
    return "integral from %s to %s of %s*%s dx" % ("1/2" if low == mpf(1) / 2 else low, high, kernel, q), low, high, steepest


def random_values():
    mp.dps = 30
    cases = [random_case() + (rng.choice([90, 130, 200]),) for _ in range(trials)]
    got = numbers("".join("evaluate %s at s = %d to 18 digits\n" % (c[0], c[4]) for c in cases))
    for (words, low, high, steepest, s), r in zip(cases, got):
        body = split_integral(words)[2]
        if high == 60:
            s_panels = 12
            want, doubt = mpmath.quad(lambda u: value(body, x=u, s=mpf(s)), mpmath.linspace(0, 75, 75 * s // s_panels),
                                      error=True, method="gauss-legendre")
        else:
            want, doubt = panels(lambda x: value(body, x=x, s=mpf(s)), low, high, s, steepest)
        if doubt < abs(want) * mpf(10) ** -16:
            if r is None or r["label"] != "proved":
                score.check(False, "%s at s = %d: no proved value" % (words, s))
                continue
            mid = mpmath.mpc(mpf(r["re"]["mid"]), mpf(r["im"]["mid"]))
            radius = mpf(r["re"]["radius"]) + mpf(r["im"]["radius"])
            score.check(abs(mid - want) <= radius + doubt + abs(want) * mpf(10) ** -24, "%s at s = %d: %s not %s" % (
                words, s, mpmath.nstr(mid, 25), mpmath.nstr(want, 25)))
        else:
            print("not counted:", words, s, mpmath.nstr(doubt, 3))


closed_forms()
random_values()
score.end()
