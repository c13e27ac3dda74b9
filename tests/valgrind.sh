#!/bin/sh
# The commands under Valgrind on every mechanism of networks/: any error or lost
# block fails.
#   sh tests/valgrind.sh PROGRAM [FILE...]
set -u
program=$1
shift
[ $# -gt 0 ] || set -- networks/*.mech
folder=$(mktemp -d)
trap 'rm -rf "$folder"' EXIT
failed=0 passed=0

try() {
    if valgrind -q --error-exitcode=99 --leak-check=full --errors-for-leak-kinds=definite,indirect \
        "$@" >"$folder/out" 2>"$folder/err"; then :; fi
    if grep -q '^==' "$folder/err"; then
        echo "valgrind: $*"
        grep '^==' "$folder/err" | head -n 20
        failed=$((failed + 1))
    else
        passed=$((passed + 1))
    fi
}

for file in "$@"; do
    try "$program" check "$file"
    try "$program" steady --json "$file"
    try "$program" emit "$file" -o "$folder/model"
    try "$program" run --until 1 "$file"
    try "$program" oscillate --scope given "$file"
done
echo "$passed passed, $failed failed"
[ "$failed" -eq 0 ]
