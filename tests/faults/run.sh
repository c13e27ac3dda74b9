#!/bin/sh
# Malformed files, and what limbeck says about each: `check NAME.mech` must print
# exactly NAME.err on standard error, and end with exit status 3 where an error is
# among it, 0 where there are warnings alone.  The files that are too large or too
# strange to keep are made here.
#   sh tests/faults/run.sh PROGRAM
set -u
program=$(cd "$(dirname "$1")" && pwd)/$(basename "$1")
cd "$(dirname "$0")" || exit 1
folder=$(mktemp -d)
trap 'rm -rf "$folder"' EXIT
passed=0 failed=0

# judge NAME WANTED: what `check` left in $folder/got and $status against the file WANTED
judge() {
    wanted=0
    if grep -q ': error: ' "$2"; then wanted=3; fi
    if diff -u "$2" "$folder/got" && [ "$status" -eq "$wanted" ]; then
        passed=$((passed + 1))
    else
        echo "FAILED: tests/faults/$1 (exit status $status, wanted $wanted)"
        failed=$((failed + 1))
    fi
}

for file in *.mech; do
    "$program" check "$file" >/dev/null 2>"$folder/got"
    status=$?
    judge "$file" "${file%.mech}.err"
done

# made NAME: $folder/NAME.mech is the mechanism, $folder/want what is to be said.
# (Not behind a pipe: a subshell would count for itself.)
made() {
    (cd "$folder" && exec timeout 60 "$program" check "$1.mech" >/dev/null 2>got)
    status=$?
    judge "$1 (made)" "$folder/want"
}

want() { cat >"$folder/want"; }

repeat() { head -c "$2" /dev/zero | tr '\0' "$1"; }

want <<'END'
nul.mech:1:14: error: a NUL byte
    A -> B, k = 1?
                 ^
    delete it; if there are many, the file is not UTF-8 text
END
printf 'A -> B, k = 1\000\n' >"$folder/nul.mech"
made nul

want <<'END'
depth.mech:1:1013: error: parentheses, powers and signs are nested deeper than 1000 levels
    ...((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((...
                                                       ^
    give the inner parts names of their own
END
{ printf 'A -> B, k = '; repeat '(' 10000; printf 1; repeat ')' 10000; echo; } >"$folder/depth.mech"
made depth

want <<'END'
long.mech:1:10000001: error: neither a reaction nor a definition
    ...AAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAA
                                                       ^
    write `A -> B, k = ...` or `name = value`
END
repeat A 10000000 >"$folder/long.mech"
made long

want <<'END'
crlf.mech:2:13: error: nothing is called `q`
    B -> C, k = q
                ^
END
printf 'A -> B, k = 1\r\nB -> C, k = q\r\n' >"$folder/crlf.mech"
made crlf

want <<'END'
mark.mech:1:13: error: nothing is called `q`
    A -> B, k = q
                ^
END
printf '\357\273\277A -> B, k = q\n' >"$folder/mark.mech"
made mark

want <<'END'
cut.mech:1:22: error: the parenthesis is not closed
    A -> B, k = arrhenius(A = 1
                         ^
    write `)`; a line that goes on ends in an operator, `,` or `(`
END
printf 'A -> B, k = arrhenius(A = 1' >"$folder/cut.mech"
made cut

want <<'END'
empty.mech:1:1: error: the file has no reaction
    write one, such as `A -> B, k = 1 s^-1`
END
: >"$folder/empty.mech"
made empty

want <<'END'
tabs.mech:1:14: error: nothing is called `q`
     A -> B, k = q
                 ^
END
printf '\tA\t->\tB,\tk\t=\tq\n' >"$folder/tabs.mech"
made tabs

want <<'END'
huge.mech:1:6: error: a coefficient is at most 1000000
    A -> 1000000000 B, k = 1
         ^~~~~~~~~~
END
printf 'A -> 1000000000 B, k = 1\n' >"$folder/huge.mech"
made huge

# A sum of 20 000 terms is long, not wrong.
want <<'END'
sum.mech:1:6: warning: nothing uses `B`: it only accumulates
    A -> B, v = [A]/(1 s) + [A]/(1 s) + [A]/(1 s) + [A]/(1 s) + [A]/(1 s) + [A]/(1 s) + [A]/(1 s) + ...
         ^
END
{ printf 'A -> B, v = [A]/(1 s)'
  awk 'BEGIN { for (i = 1; i < 20000; i++) printf " + [A]/(1 s)" }'
  printf '\n[A]0 = 1\n'; } >"$folder/sum.mech"
made sum

# A chain of 20 000 definitions, each twice the next: no recursion, and the first
# value beyond a double is found where it arises.
want <<'END'
chain.mech:18977:10: error: `k18976` comes out without a finite value
    k18976 = 2*k18977
             ^~~~~~~~
END
awk 'BEGIN { for (i = 0; i < 20000; i++) printf "k%d = 2*k%d\n", i, i + 1
             print "k20000 = 1\nA -> B, k = k0" }' >"$folder/chain.mech"
made chain

echo "faults: $passed passed, $failed failed"
[ "$failed" -eq 0 ]
