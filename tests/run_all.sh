#!/bin/sh
# Runs every test of a build and adds up what they report. usage: run_all.sh BUILD
# The last line is `N passed, N failed, N skipped`; the exit status is 0 only if nothing failed.
build=$1
here=$(cd "$(dirname "$0")/.." && pwd)
cd "$here" || exit 1
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

# Two tests at a time, or JOBS; each leaves its output and status in $work, read in order afterwards.
work=$(mktemp -d) || exit 1
trap 'rm -rf "$work"' EXIT
{ # those that take longest first
    case $build in # the last two run no program of this build
    *sanitize*) ls tests/run_*.py | grep -v run_stdlib ;;
    *) ls tests/run_*.py tests/shrunk.py ;;
    esac
    find "$build/tests/engine" "$build/tests/lang" -name 'test_*' -type f -perm -u+x 2>/dev/null | sort -r
} >"$work/list"
build=$build work=$work xargs -P "${JOBS:-2}" -I '{}' sh -c '
    out=$work/$(echo "{}" | tr / _)
    case "{}" in
    *.py) timeout 900 python3 "{}" "$build" >"$out" 2>&1 </dev/null ;;
    *) timeout 900 "{}" >"$out" 2>&1 </dev/null ;;
    esac
    echo $? >"$out.status"' <"$work/list"
while read -r x; do
    out=$work/$(echo "$x" | tr / _)
    log=$out
    add "${x#"$build"/}" "$(cat "$out.status" 2>/dev/null || echo 1)"
done <"$work/list"
echo "$passed passed, $failed failed, $skipped skipped"
[ "$failed" -eq 0 ]
