# One object on standard output, nothing on standard error, the same exit status.
show() {
    printf '$ limbeck %s\n' "$*"
    limbeck "$@" 2>"$SCRATCH/error"
    printf '[%d]\n' $?
    cat "$SCRATCH/error"
}
show check --json missing.mech
show stedy --json
show run --json networks/brusselator.mech
show --json
show check --json --set '[C]=1' networks/brusselator.mech
printf 'A -> X, k = 1 s^-1\nA -> Y, k = kk\n' >"$SCRATCH/faulty.mech"
show check --json "$SCRATCH/faulty.mech"
show "$SCRATCH/faulty.mech" --json
