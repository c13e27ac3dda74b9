# Ctrl-C: what there is until then is kept, and the exit status is 130.
interrupted() { timeout --preserve-status -s INT 1 limbeck "$@"; echo "[$?]"; }
interrupted run networks/brusselator.mech --quiet --until 1e12 --every 1e11 -o "$SCRATCH/course.csv"
head -n 2 "$SCRATCH/course.csv"
interrupted run networks/brusselator.mech --until 1e12 --every 1e11 2>&1 | grep -v warning | tail -n 2
interrupted run networks/brusselator.mech --until 1e12 --every 1e11 --json | sed -n -e 's/.*\("interrupted": [a-z]*\).*/\1/p' -e '/^\[/p'
