# --native: the same numbers, kept in a folder of the user's own; without it the tables, and why
XDG_CACHE_HOME=$SCRATCH/caches
export XDG_CACHE_HOME
engine() { grep -o '"engine[^,]*'; }
limbeck run networks/brusselator.mech --until 5 --every 1 --quiet >"$SCRATCH/tables.csv"
limbeck run networks/brusselator.mech --until 5 --every 1 --native --quiet >"$SCRATCH/native.csv"
cut -c -8 "$SCRATCH/tables.csv" >"$SCRATCH/a"; cut -c -8 "$SCRATCH/native.csv" >"$SCRATCH/b"
cmp "$SCRATCH/a" "$SCRATCH/b" && echo "the same rows"
stat -c %a "$SCRATCH/caches/limbeck"
ls "$SCRATCH/caches/limbeck" | sed 's/_.*\./_DIGEST./'
limbeck steady networks/brusselator.mech --native --json | engine
limbeck networks/brusselator.mech --native --json | engine
ls "$SCRATCH/caches/limbeck" | wc -l
chmod 755 "$SCRATCH/caches/limbeck"
try run networks/brusselator.mech --until 1 --every 1 --native | grep -v '^[01],'
limbeck oscillate networks/brusselator.mech --native --scope given --json | engine
try check networks/brusselator.mech --native
