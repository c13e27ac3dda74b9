# Files are replaced whole, links and permissions stay, folders are made.
mkdir "$SCRATCH/real"
echo old >"$SCRATCH/real/rows.csv"
chmod 640 "$SCRATCH/real/rows.csv"
ln -s real/rows.csv "$SCRATCH/rows.csv"
try run networks/brusselator.mech --until 1 --every 0.5 -o "$SCRATCH/rows.csv"
ls -l "$SCRATCH/real/rows.csv" | cut -c 1-10
[ -L "$SCRATCH/rows.csv" ] && head -n 1 "$SCRATCH/rows.csv"
try emit networks/brusselator.mech -o "$SCRATCH/new/model"
try emit networks/brusselator.mech -o "$SCRATCH/new/model/" --name other --quiet
try emit networks/brusselator.mech -o "$SCRATCH/new/model" --json
ls -A "$SCRATCH/new/model"
try run networks/brusselator.mech --until 1 --every 1 --json -o "$SCRATCH/beside.csv" | cut -c 1-60
wc -l <"$SCRATCH/beside.csv"
try emit networks/brusselator.mech -o "$SCRATCH/glue" --for gsl --quiet
ls -A "$SCRATCH/glue"
try emit networks/lotka-volterra.mech -o "$SCRATCH/glue" --for cvodes
try emit networks/lotka-volterra.mech -o "$SCRATCH/glue" --for cvodes --json --quiet
