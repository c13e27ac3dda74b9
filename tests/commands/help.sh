try --version
try --help
for command in check run steady emit oscillate; do
    try help $command
done
limbeck help check >"$SCRATCH/a"
limbeck check --help >"$SCRATCH/b"
cmp "$SCRATCH/a" "$SCRATCH/b"
