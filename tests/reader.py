"""An independent reader of what the program writes: exact text of the language evaluated by mpmath. It shares no code with the
program. Used by the run_*.py tests."""
import json
import os
import re
import subprocess
import tempfile

import mpmath
from mpmath import mp, mpc, mpf

mp.dps = 50
HERE = os.path.dirname(os.path.dirname(os.path.abspath(__file__)))

NAMES = {k: getattr(mpmath, v) for k, v in dict(
    exp="exp", log="log", sqrt="sqrt", sin="sin", cos="cos", tan="tan", sinh="sinh", cosh="cosh", tanh="tanh", atan="atan",
    asin="asin", asinh="asinh", lnGamma="loggamma", psi="digamma", zeta="zeta", erf="erf", erfc="erfc", J="besselj",
    K="besselk", I="besseli", Ai="airyai", E1="e1", Ei="ei").items()}
NAMES.update(mpf=mpf, pi=mp.pi, i=mpc(0, 1), inf=mpmath.inf, euler_constant=mp.euler, abs=abs,
             Gamma=lambda a, *z: mpmath.gammainc(a, z[0]) if z else mpmath.gamma(a),
             polygamma=lambda n, z: mpmath.polygamma(int(n), z))


def value(words, **at):
    """The value of an expression of the language at a point."""
    code = re.sub(r"(?<![\w.])(\d+(?:\.\d+)?(?:e-?\d+)?)(?![\w.])", r"mpf('\1')", words.replace("^", "**"))
    return eval(code, {"__builtins__": {}}, dict(NAMES, **at))


def split_integral(words):
    return re.match(r"integral from (.+?) to (.+?) of (.+) d(\w+)$", words).groups()


def terms(contribution, at, big):
    """All terms (size order at large values) of one contribution."""
    s = at[big]
    out = []
    pre = value(contribution["prefactor"], **at)
    for lane in contribution["lanes"]:
        const = value(lane["constant"], **at) * mpmath.log(s) ** lane["log_power"]
        first, step = value(lane["first_exponent"], **at), value(lane["step"], **at)
        for n, c in enumerate(lane["coefficients"]):
            v = value(c, **at)
            if v:
                out.append((first + n * step, lane["log_power"], pre * const * v * s ** (first + n * step)))
    out.sort(key=lambda t: (t[0] if big_is_small(contribution) else -t[0], -t[1]))
    return out


def big_is_small(contribution):
    return any(not lane["step"].startswith("-") for lane in contribution["lanes"])


class Program:
    def __init__(self, build):
        self.path = os.path.join(HERE, build, "termwise")
        self.folder = tempfile.mkdtemp()

    def run(self, script, *options):
        """Runs a script from a file; (results as dicts, status, complaints)."""
        name = os.path.join(self.folder, "job.tw")
        with open(name, "w", encoding="utf-8") as f:
            f.write(script)
        r = subprocess.run([self.path, "--results", "json", *options, name], cwd=self.folder, stdout=subprocess.PIPE,
                           stderr=subprocess.PIPE, text=True, timeout=600,
                           env=dict(os.environ, TW_STDLIB=os.path.join(HERE, "stdlib")))
        return [json.loads(line) for line in r.stdout.splitlines()], r.returncode, r.stderr

    def read(self, name):
        with open(os.path.join(self.folder, name), encoding="utf-8", newline="") as f:
            return f.read()


class Score:
    def __init__(self):
        self.passed = self.failed = 0

    def check(self, good, words):
        if good:
            self.passed += 1
        else:
            self.failed += 1
            print("FAILED:", words)

    def end(self):
        print("%d passed, %d failed, 0 skipped" % (self.passed, self.failed))
        raise SystemExit(self.failed != 0)
