"""Does the violation test notice wrong bounds? Builds the engine once more with every bound multiplied by 0.3 and runs the random
violation test, which must fail. usage: shrunk.py"""
import os
import subprocess
import sys

here = os.path.dirname(os.path.dirname(os.path.abspath(__file__)))
flags = ["BUILD=build/shrunk", "CFLAGS=-O2 -DTW_BOUND_FACTOR=0.3"]
program = "build/shrunk/tests/engine/numeric/test_violation"
made = subprocess.run(["make", "-s", "-j2", *flags, program], cwd=here, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True)
if made.returncode != 0:
    print(made.stdout)
    print("0 passed, 1 failed, 0 skipped")
    sys.exit(1)
run = subprocess.run([os.path.join(here, program)], cwd=here, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True,
                     env=dict(os.environ, TW_TRIALS="60"), timeout=600)
noticed = run.returncode != 0 and "FAILED" in run.stdout
if not noticed:
    print(run.stdout)
    print("the violation test passed although every bound was multiplied by 0.3")
print("%d passed, %d failed, 0 skipped" % (noticed, not noticed))
sys.exit(not noticed)
