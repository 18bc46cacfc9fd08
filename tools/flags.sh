#!/bin/sh
# Linker flags of the mathematical libraries: FLINT 3 is one library; before it Calcium, Arb and ANTIC stand
# beside FLINT. Found by asking the headers, so that no configure step is needed.
release=$(printf '#include <flint/flint.h>\n__FLINT_RELEASE\n' | ${CC:-cc} -E -P - 2>/dev/null | tail -n 1)
case $1 in
--libs)
    if [ "${release:-0}" -ge 30000 ] 2>/dev/null; then echo "-lflint -lmpfr -lgmp -lm"
    else echo "-lcalcium -lflint-arb -lantic -lflint -lmpfr -lgmp -lm"; fi ;;
esac
