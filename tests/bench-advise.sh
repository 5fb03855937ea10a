#!/bin/sh
# Counts the instructions of one `advise` on this computer, for three setups: callgrind's total of 101 runs less that of 1,
# over 100. Needs valgrind. At most 60,000 are allowed; exit status 1 above.
#
#   tests/bench-advise.sh
set -eu
cd "$(dirname "$0")/.."
target="${CARGO_TARGET_DIR:-target}"
cargo build --quiet --release -p rimrate-tests --example advise_often
program="$target/release/examples/advise_often"

count() {
    valgrind --tool=callgrind --callgrind-out-file=/dev/null "$program" "$1" "$2" 2>&1 |
        sed -n 's/.*Collected : \([0-9]*\).*/\1/p'
}

status=0
"$program" | while read -r which name; do
    each=$((($(count "$which" 101) - $(count "$which" 1)) / 100))
    echo "$each instructions: $name"
    if [ "$each" -gt 60000 ]; then
        echo "more than 60000" >&2
        exit 1
    fi
done || status=1
exit "$status"
