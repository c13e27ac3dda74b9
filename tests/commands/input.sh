# Standard input, options on both sides, `--`, and a file that is called like a command.
echo '$ limbeck check - < networks/schloegl-1.mech'
limbeck check - <networks/schloegl-1.mech
try --quiet check --set '[A]=2' networks/schloegl-1.mech
try --set '[A]=2' --quiet check -- networks/schloegl-1.mech
cp networks/schloegl-1.mech "$SCRATCH/check"
cp networks/schloegl-1.mech "$SCRATCH/-odd.mech"
cd "$SCRATCH"
echo '$ limbeck check ./check'
limbeck check ./check | head -n 2
echo '$ limbeck check -- -odd.mech'
limbeck check -- -odd.mech | head -n 2
