# The page; figures that are rounding noise are masked.
mask() { sed -E 's/[0-9]+ starts, [0-9]+ conv/# starts, # conv/; s/(Closed to|balanced to|path to) [0-9]+([.][0-9]+)?(e-?[0-9]+)?/\1 #/g'; }
page() { try "$@" --quiet | mask; }
page networks/demo.mech
page networks/brusselator.mech --set '[B]=1.7'
page networks/lotka-volterra.mech
page networks/wilhelm.mech
page networks/michaelis-menten.mech
try networks/michaelis-menten.mech | tail -n 3
