# The page is as wide as COLUMNS says, and no terminal means no colour.
for COLUMNS in 44 132; do
    export COLUMNS
    try check --quiet networks/demo.mech
    limbeck --quiet networks/wilhelm.mech | awk -v most="$COLUMNS" 'length > most { print length ": " $0 }'
done
