mask() { sed -E 's/[0-9]+ starts, [0-9]+ conv/# starts, # conv/; s/(Closed to|balanced to|path to) [0-9]+([.][0-9]+)?(e-?[0-9]+)?/\1 #/g'; }
try oscillate --quiet networks/brusselator.mech --scope given | mask
try oscillate --quiet networks/brusselator.mech --set '[B]=1.7' -o "$SCRATCH/witness.mech" | mask
grep -c . "$SCRATCH/witness.mech"
try oscillate --quiet "$SCRATCH/witness.mech" --scope given | mask | grep witnessed
try oscillate networks/michaelis-menten.mech -o "$SCRATCH/none.mech" 2>&1 | tail -n 1
ls "$SCRATCH"
