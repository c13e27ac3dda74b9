try check tests/commands/everything.mech
try check --quiet networks/demo.mech
try check --quiet networks/goldbeter-per.mech
try check --quiet networks/brusselator.mech --set '[B]=1.7' --json
