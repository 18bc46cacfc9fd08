#!/bin/sh
# Runs every test of a build and adds up what they report. usage: run_all.sh BUILD
# The last line is `N passed, N failed, N skipped`; the exit status is 0 only if nothing failed.
build=$1
here=$(cd "$(dirname "$0")/.." && pwd)
cd "$here" || exit 1
log=$(mktemp) || exit 1
trap 'rm -f "$log"' EXIT
passed=0 failed=0 skipped=0

add() { # add NAME STATUS: reads $log
    name=$1 status=$2
    set -- $(awk '/^[0-9]+ passed, [0-9]+ failed/ {p=$1; f=$3; s=$5} END {print p+0, f+0, s+0}' "$log")
    if [ $(($1 + $2)) -eq 0 ]; then # a cmocka program
        for word in PASSED FAILED SKIPPED; do
            set -- "$@" "$(sed -n "s/^\[ *$word *\] \([0-9]*\) test.*/\1/p" "$log" | awk '{n+=$1} END {print n+0}')"
        done
        shift 3
    fi
    bad=$2
    if [ "$status" -ne 0 ] && [ "$bad" -eq 0 ]; then bad=1; fi # ended badly without saying so
    if [ "$status" -eq 0 ] && [ "$1" -eq 0 ]; then bad=1 && echo "$name ran no test"; fi
    passed=$((passed + $1)) failed=$((failed + bad)) skipped=$((skipped + $3))
    printf '%-40s %4d passed %3d failed %3d skipped\n' "$name" "$1" "$bad" "$3"
    if [ "$bad" -ne 0 ]; then cat "$log"; fi
}

one() { # one NAME COMMAND...
    name=$1
    shift
    timeout 900 "$@" >"$log" 2>&1 </dev/null
    add "$name" $?
}

for x in $(find "$build/tests/engine" "$build/tests/lang" -name 'test_*' -type f -perm -u+x 2>/dev/null | sort); do
    one "${x#"$build"/}" "$x"
done
for x in tests/run_*.py; do
    one "$x" python3 "$x" "$build"
done
case $build in *sanitize*) ;; *) one tests/shrunk.py python3 tests/shrunk.py ;; esac
echo "$passed passed, $failed failed, $skipped skipped"
[ "$failed" -eq 0 ]
