"""Every rule of stdlib/ judged by mpmath, which shares no code with the program. usage: run_stdlib.py [BUILD [FILE...]]
Each rule's text is read here anew; its variables take random values that meet its conditions; both sides are evaluated to
nine digits or more. Functions of a rule's brackets are drawn from a few smooth, fast decaying ones. TW_SEED may be set."""
import functools
import os
import random
import re
import signal
import sys

import mpmath
from mpmath import mp, mpc, mpf

import reader
from reader import HERE, Score

TRIALS = 1
seed = int(os.environ.get("TW_SEED", random.randrange(10**9)))
print("seed", seed)
rng = random.Random(seed)
mp.dps = 140
reader.NAMES.update(Beta=mpmath.beta, Bi=mpmath.airybi, Y=mpmath.bessely, acosh=mpmath.acosh, min=min, max=max,
                    factorial=mpmath.factorial, Ai=mpmath.airyai)


class NotJudged(Exception):
    pass


def too_long(*_):
    raise NotJudged


signal.signal(signal.SIGALRM, too_long)


def rules(path):
    words = re.sub(r"#.*", "", open(path, encoding="utf-8").read())
    for m in re.finditer(r"^rule (\w+)(\(.*?\))?:\s(.*?)\n\s+becomes (.*?)(?:\n\s+when (.*?))?\n\s+because \"(.*?)\"", words,
                         re.S | re.M):
        name, brackets, left, right, when, _ = m.groups()
        inside = (brackets or "()")[1:-1]
        functions = re.findall(r"(\w+)\(\w+\)", inside)
        plain = re.findall(r"\w+", re.sub(r"\w+\(\w+\)", "", inside))
        yield name, plain, functions, " ".join(left.split()), " ".join(right.split()), when or ""


def to_python(words):
    """The language's text as a Python expression: integrals, derivatives and `at` become calls."""
    words = words.strip()
    while True:
        m = None
        for m in re.finditer(r"\b(integral|derivative) ", words):
            pass  # the last is the innermost
        if m is None:
            break
        start = m.start()
        if m.group(1) == "derivative":
            d = re.compile(r"derivative of (.+?) in (\w+)").match(words, start)
            call = "D(lambda %s: %s, %s)" % (d.group(2), d.group(1), d.group(2))
        else:
            d = re.compile(r"integral (from|along) (.+?) to (.+?) of (.+) d(\w+)").match(words, start)
            end = next(k for k in range(start, len(words) + 1)
                       if re.match(r".+ d\w+$", words[start:k]) and re.match(r"\W|$", words[k:k + 1])
                       and balanced(words[start:k]))
            d = re.match(r"integral (from|along) (.+?) to (.+?) of (.+) d(\w+)$", words[start:end])
            if d.group(1) == "along":
                call = "A(%s, %s, lambda %s: %s)" % (d.group(2)[4:-1], d.group(3)[4:-1], d.group(5), d.group(4))
            else:
                call = "Q(%s, %s, lambda %s: %s)" % (d.group(2), d.group(3), d.group(5), d.group(4))
            words = words[:start] + call + words[end:]
            continue
        words = words[:start] + call + words[d.end():]
    words = re.sub(r"\((\w)\((\w)\) at \2 = (\w+)\)", r"\1(\3)", words)
    words = re.sub(r"\b(\w)!", r"factorial(\1)", words)
    words = words.replace("^", "**")
    return re.sub(r"(?<![\w.])(\d+(?:\.\d+)?)(?![\w.'])", r"mpf('\1')", words)


def balanced(words):
    return words.count("(") == words.count(")")


@functools.lru_cache(None)
def nodes(level):
    """Double exponential nodes over (0, inf), powers at the ends included (Takahasi and Mori 1974): those that the level
    adds, with the step 2^-level."""
    h = mpf(2) ** -level
    last = int(5.2 / h)
    return [(h * mpmath.cosh(k * h) * mp.pi / 2, mpmath.exp(mp.pi / 2 * mpmath.sinh(k * h)))
            for k in range(-last, last + 1) if level == 3 or k % 2]


def half_line(f, a):
    """Integral of f from a to inf: the step is halved until twelve digits stand."""
    total = 0
    for level in range(3, 8):
        new = mpmath.fsum(f(a + x) * x * w for w, x in nodes(level))
        total, before = total / 2 + new, total
        if abs(total - before) <= mpf(10) ** -12 * abs(total):
            return total
    raise NotJudged


def unit(f, a, b):
    d = b - a
    return half_line(lambda x: f(a + d * x / (1 + x)) * d / (1 + x) ** 2, 0)


def quad(omega):
    def q(a, b, f):
        if b < a:
            return -q(b, a, f)
        if omega == "cube":
            raise NotJudged  # its phase grows: no period to sum by
        if a == -mpmath.inf:
            middle = 0 if b == mpmath.inf else b
            return half_line(lambda x: f(-x), -middle) + (half_line(f, 0) if b == mpmath.inf else 0)
        if b < mpmath.inf:
            return unit(f, a, b)
        if omega is None:
            return half_line(f, a)
        with mpmath.workdps(20):
            return unit(f, a, a + 1) + mpmath.quadosc(f, [a + 1, b], omega=omega)
    return q


# The frequency in whose half periods an integral that only oscillates is summed.
OMEGA = {"fourier_cosine_lorentz": "w", "fourier_sine_lorentz": "w", "fourier_cosine_lorentz_squared": "w",
         "fourier_cosine_root": "w", "fourier_sine_power": "w", "fourier_cosine_power": "w", "fourier_sine_over_x": "w",
         "airy_cosine": "cube", "airy_bi_sum": "cube", "fresnel_cosine": "cube", "fresnel_sine": "cube"}
FUNCTIONS = ["exp(-x**2/2)*(1 + x/3)", "exp(-x**2)*cos(x)", "exp(-(x - 1)**2)", "exp(-x**2/3)*x/(4 + x**2)"]


def draw(names, when):
    for _ in range(4000):
        at = {}
        for n in names:
            if re.search(r"\b%s integer" % n, when):
                at[n] = mpf(rng.randrange(0, 5))
            else:
                at[n] = mpf(rng.choice([1, 1, 1, -1])) * mpf(rng.randrange(1, 40)) / rng.choice([7, 9, 11, 13])
        conditions = [c for c in re.split(r",\s*", when) if c and not c.endswith("integer")]
        if all(holds(c, at) for c in conditions):
            return at
    raise ValueError("no values for " + when)


def holds(condition, at):
    """True with a margin: values just inside a condition make integrals that nearly diverge, which quadrature can't judge."""
    m = re.match(r"(.+?) (<|>) (.+)", condition)
    if m and not m.group(3).startswith("="):
        condition = "%s - (%s) > 0.2" % ((m.group(1), m.group(3)) if m.group(2) == ">" else (m.group(3), m.group(1)))
    code = re.sub(r"(?<![\w.])(\d+(?:\.\d+)?)(?![\w.])", r"mpf('\1')", condition.replace("^", "**"))
    return eval(code, dict(reader.NAMES, __builtins__={}, **at))


def value(words, at):
    return eval(to_python(words), dict(reader.NAMES, __builtins__={}, **at))


def along(start, end, f):
    """From infinity in one direction over 0 to infinity in another."""
    total = 0
    for angle, sign in ((start, -1), (end, 1)):
        turn = mpmath.expj(angle)
        total += sign * turn * mpmath.quad(lambda u: f(turn * u), [0, 1, 2, 4, 8])
    return total


def judge(score, name, names, functions, left, right, when):
    for _ in range(TRIALS):
        at = draw(names, when)
        omega = OMEGA.get(name)
        names_at = dict(at, Q=quad(at.get(omega, omega)), D=lambda f, x: mpmath.diff(f, x), A=along)
        for g in functions:
            body = re.sub(r"(?<![\w.*])(\d+)(?![\w.])", r"mpf('\1')", rng.choice(FUNCTIONS))
            names_at[g] = eval("lambda x: " + body, dict(reader.NAMES))
        signal.alarm(8)
        try:
            a, b = value(left, names_at), value(right, names_at)
        except (NotJudged, mpmath.libmp.libhyper.NoConvergence):
            print("not judged:", name)
            return
        except (ZeroDivisionError, ValueError) as error:
            score.check(False, "%s at %s: %s" % (name, at, error))
            return
        finally:
            signal.alarm(0)
        good = abs(a - b) <= mpf(10) ** -9 * max(1, abs(a))
        score.check(good, "%s at %s: %s against %s" % (name, {k: mpmath.nstr(v, 6) for k, v in at.items()},
                                                         mpmath.nstr(a, 12), mpmath.nstr(b, 12)))


score = Score()
folder = os.path.join(HERE, "stdlib")
files = sys.argv[2:] or [f for f in sorted(os.listdir(folder)) if f.endswith(".tw")]
for file in files:
    path = file if os.path.exists(file) else os.path.join(folder, file)
    read = list(rules(path))
    count = len(re.findall(r"^rule ", open(path, encoding="utf-8").read(), re.M))
    score.check(len(read) == count, "%s: %d of %d rules read" % (file, len(read), count))
    for rule in read:
        judge(score, *rule)
score.end()
