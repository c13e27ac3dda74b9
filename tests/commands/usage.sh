try
try bogusword
try stedy
try stedy networks/brusselator.mech
try help oscilate
try networks/brusselator.mech check
try check networks/brusselator.mech networks/rober.mech
try check
try check --untill 3 networks/brusselator.mech
try run --untill 3 networks/brusselator.mech
try check --until 3 networks/brusselator.mech
try run networks/brusselator.mech
try run networks/brusselator.mech --until
try run networks/brusselator.mech --until -5
try run networks/brusselator.mech --until soon
try run networks/brusselator.mech --until 5 --every 0
try run networks/brusselator.mech --until 5 --tolerance 1
try run networks/brusselator.mech --until 5 --tolerance tiny
try steady networks/brusselator.mech --seed -1
try steady networks/brusselator.mech --seed 1.5
try steady networks/brusselator.mech --json=yes
try oscillate networks/brusselator.mech --scope any
try oscillate networks/brusselator.mech --samples 0
try oscillate networks/brusselator.mech --seconds nan
try oscillate networks/michaelis-menten.mech --scope ranges
try emit networks/brusselator.mech
try emit networks/brusselator.mech -o "$SCRATCH" --name int
try emit networks/brusselator.mech -o "$SCRATCH" --name 2x
try check --set networks/brusselator.mech
try check --set k networks/brusselator.mech
try check --set '[C]=1' networks/brusselator.mech
try check --set '[B]=much' networks/brusselator.mech
try check --set '[B]=-1' networks/brusselator.mech
ls -A "$SCRATCH"
try run networks/demo.mech --until 1 h
try run networks/demo.mech --until 1min --every 1min --quiet | tail -n 1 | cut -c 1-2
try emit networks/brusselator.mech -o "$SCRATCH" --for fortran
