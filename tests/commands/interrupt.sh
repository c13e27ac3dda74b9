# Ctrl-C: what there is until then is kept, and the exit status is 130.  (In the foreground, since
# timeout otherwise signals its group too, and a second Ctrl-C ends the program at once.)
interrupted() { timeout --foreground --preserve-status -s INT 1 limbeck "$@"; echo "[$?]"; }
interrupted run networks/brusselator.mech --quiet --until 1e12 --every 1e11 -o "$SCRATCH/rows.csv"
head -n 2 "$SCRATCH/rows.csv"
interrupted run networks/brusselator.mech --until 1e12 --every 1e11 2>&1 | grep -v warning | tail -n 2
interrupted run networks/brusselator.mech --until 1e12 --every 1e11 --json | sed -n -e 's/.*\("interrupted": [a-z]*\).*/\1/p' -e '/^\[/p'
