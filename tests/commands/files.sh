# What cannot be read or written.
try check "$SCRATCH/missing.mech"
try "$SCRATCH"
: >"$SCRATCH/empty.mech"
try check "$SCRATCH/empty.mech"
try run networks/brusselator.mech --until 1 -o "$SCRATCH/no/folder.csv"
try run networks/brusselator.mech --until 1 -o "$SCRATCH"
echo file >"$SCRATCH/file"
try emit networks/brusselator.mech -o "$SCRATCH/file"
try emit networks/brusselator.mech -o "$SCRATCH/file/below"
cat "$SCRATCH/file"
# A full disk, a closed pipe, a closed standard output.
try run networks/brusselator.mech --until 1 -o /dev/full
echo '$ limbeck check networks/brusselator.mech >/dev/full'
limbeck check networks/brusselator.mech >/dev/full
echo "[$?]"
echo '$ limbeck --help >/dev/full'
limbeck --help >/dev/full
echo "[$?]"
echo '$ limbeck check networks/brusselator.mech >&-'
limbeck check networks/brusselator.mech >&-
echo "[$?]"
echo '$ limbeck run networks/brusselator.mech --until 1000 --every 0.01 | head -n 1'
{ limbeck run networks/brusselator.mech --until 1000 --every 0.01; echo "[$?]" >"$SCRATCH/status"; } 2>"$SCRATCH/message" | head -n 1
cat "$SCRATCH/message" "$SCRATCH/status"
ls -A "$SCRATCH"
