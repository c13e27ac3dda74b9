# Columns, units, readings; the figures to few digits, since the last ones belong to the tolerance.
round() { awk -F, -v OFS=, 'NR == 1 || !/^[0-9]/ { print; next } { for (i = 1; i <= NF; i++) $i = sprintf("%.5g", $i); print }'; }
try run --quiet networks/demo.mech --until 2 --every 0.5 | round
try run --quiet networks/demo.mech --until '2 min' --every '30 s' | round
try run --quiet networks/brusselator.mech --until=1 --every=0.4 --tolerance=1e-6 | round
limbeck run --quiet networks/brusselator.mech --until 1 | wc -l
