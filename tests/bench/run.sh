#!/bin/sh
# Every measurement in one run, side by side: the C programs of this folder, then the program as a user starts it, then mpmath
# on the same integrals. Medians; compare ratios, the machine may be shared. usage: run.sh BUILD
build=$1
for x in "$build"/tests/bench/bench_*; do
    if [ -x "$x" ] && [ -f "$x" ]; then
        printf '== %s\n' "$(basename "$x")"
        "$x"
    fi
done
for x in tests/bench/bench_*.py; do
    printf '== %s\n' "$(basename "$x")"
    python3 "$x" "$build"
done
