#!/bin/sh
# The commands as a person types them: each NAME.sh is run, and what it prints
# must be NAME.out, its exit status NAME.exit (0 where there is no such file).
#   sh tests/commands/run.sh PROGRAM [NAME...]
#   UPDATE=1 sh tests/commands/run.sh PROGRAM NAME    writes NAME.out anew, to be read before it is kept
# A case finds the program as `limbeck`, an empty folder in $SCRATCH, and `try`,
# which shows a command, all that it prints, and its exit status.
set -u
program=$(cd "$(dirname "$1")" && pwd)/$(basename "$1")
shift
here=$(cd "$(dirname "$0")" && pwd)
cd "$here/../.."
folder=$(mktemp -d)
trap 'rm -rf "$folder"' EXIT
mkdir "$folder/bin"
ln -s "$program" "$folder/bin/limbeck"
PATH=$folder/bin:$PATH
export PATH LC_ALL=C
unset COLUMNS NO_COLOR 2>/dev/null
TERM=dumb SCRATCH=$folder/scratch
export TERM SCRATCH
passed=0 failed=0

[ $# -gt 0 ] || set -- $(cd "$here" && ls ./*.sh | sed -e 's|^\./||' -e 's|\.sh$||' | grep -v '^run$')
for name; do
    rm -rf "$SCRATCH"
    mkdir "$SCRATCH"
    sh -c '. "$1/try"; . "$1/$2.sh"' sh "$here" "$name" >"$folder/out" 2>&1 </dev/null
    status=$?
    sed "s|$SCRATCH|SCRATCH|g" "$folder/out" >"$folder/shown"
    if [ -n "${UPDATE:-}" ]; then
        cp "$folder/shown" "$here/$name.out"
    fi
    wanted=0
    if [ -f "$here/$name.exit" ]; then wanted=$(cat "$here/$name.exit"); fi
    if diff -u "$here/$name.out" "$folder/shown" && [ "$status" -eq "$wanted" ]; then
        passed=$((passed + 1))
    else
        echo "FAILED: tests/commands/$name (exit status $status, wanted $wanted)"
        failed=$((failed + 1))
    fi
done
echo "commands: $passed passed, $failed failed"
[ "$failed" -eq 0 ]
