#!/bin/sh
# Fuzz the reading of mechanisms: run.sh SECONDS [TARGET ...]
#
# Builds each target of this folder (parse, network) with clang's libFuzzer,
# AddressSanitizer and UndefinedBehaviorSanitizer, and runs them one after the
# other, sharing the time.  The corpus grows in build-fuzz/; what broke a
# target stays there as crash-*, leak-*, timeout-*.
set -eu
seconds=${1:-600}
[ $# -gt 0 ] && shift
targets=${*:-parse network}
cd "$(dirname "$0")/../.."
work=build-fuzz
libs=$(make --no-print-directory libs)

if ! echo 'int LLVMFuzzerTestOneInput(void) { return 0; }' |
        clang -fsanitize=fuzzer -x c - -o /dev/null 2>/dev/null; then
    echo "fuzzing needs clang with libFuzzer: apt-get install clang" >&2
    exit 1
fi
make --no-print-directory BUILD=$work CC=clang WARN= \
    CFLAGS="-O1 -g -fno-omit-frame-pointer -fsanitize=fuzzer-no-link,address,undefined -fno-sanitize-recover=undefined" \
    $work/liblimbeck.a

share=$((seconds / $(echo $targets | wc -w)))
for target in $targets; do
    clang -std=c11 -D_POSIX_C_SOURCE=200809L -O1 -g -Iinclude -Isrc -fsanitize=fuzzer,address,undefined \
        -fno-sanitize-recover=undefined -o $work/fuzz_$target tests/fuzz/fuzz_$target.c $work/liblimbeck.a \
        $libs
    mkdir -p $work/corpus-$target
    cp networks/*.mech $work/corpus-$target/
    [ -d tests/faults ] && find tests/faults -name '*.mech' -size -8k -exec cp {} $work/corpus-$target/ \;
    echo "fuzzing $target for $share s"
    $work/fuzz_$target -dict=tests/fuzz/mechanism.dict -max_len=4096 -timeout=20 -rss_limit_mb=4096 \
        -max_total_time=$share -print_final_stats=1 -verbosity=0 -artifact_prefix=$work/ $work/corpus-$target
done
