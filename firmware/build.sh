#!/bin/sh
# Builds the image where only Debian's packages are at hand: the same sources, options and lock file as `cargo build
# --release` with rustup, and core built from Debian's sources of it.
#
#   ./build.sh                   leaves rimrate-firmware.elf and .uf2 in target/image, and the same with -sh1106 in their
#                                names for a display with that controller
#   BOARD=pico2 ./build.sh       checks that the sources compile for the Pico 2
#   UF2=no ./build.sh            leaves the .elf only
#
# CARGO_TARGET_DIR moves everything. As root it installs the packages that are missing, else it names them.
set -eu
cd "$(dirname "$0")"
board=${BOARD:-pico}
target_dir=${CARGO_TARGET_DIR:-$PWD/target}
image=$target_dir/image

say() { echo "build.sh: $*"; }
fail() { say "$*" >&2; exit 1; }

rust_source() { [ -d "$(/usr/bin/rustc --print sysroot)/lib/rustlib/src/rust/library/core" ]; }
missing=
[ -x /usr/bin/rustc ] || missing="$missing rustc-web"
[ -x /usr/bin/cargo ] || missing="$missing cargo-web"
[ -x /usr/bin/ld.lld ] || missing="$missing lld"
if [ ! -x /usr/bin/rustc ] || ! rust_source; then missing="$missing rust-web-src"; fi
if [ -n "$missing" ]; then
    [ "$(id -u)" = 0 ] || fail "Debian packages are missing; install them as root: apt-get install$missing"
    say "installing$missing"
    apt-get update -q
    # shellcheck disable=SC2086
    apt-get install -q -y --no-install-recommends $missing
fi

# By their full path: a rustup toolchain may stand before them.
export RUSTC=/usr/bin/rustc RUSTDOC=/usr/bin/rustdoc CARGO_TARGET_DIR="$target_dir"
unset RUSTC_WRAPPER RUSTFLAGS RUSTUP_TOOLCHAIN
# Debian has no precompiled core for the chip: -Zbuild-std builds it, which a stable compiler does only with this.
export RUSTC_BOOTSTRAP=1
export CARGO_TARGET_THUMBV6M_NONE_EABI_LINKER=/usr/bin/ld.lld
export CARGO_TARGET_THUMBV8M_MAIN_NONE_EABIHF_LINKER=/usr/bin/ld.lld

case $board in
pico)
    mkdir -p "$image"
    # The plain image last: it stays where cargo leaves it.
    for display in -sh1106 ""; do
        /usr/bin/cargo build --locked --release -Zbuild-std=core ${display:+--features sh1106}
        cp "$target_dir/thumbv6m-none-eabi/release/rimrate-firmware" "$image/rimrate-firmware$display.elf"
    done
    ;;
pico2)
    /usr/bin/cargo build --locked --release -Zbuild-std=core \
        --target thumbv8m.main-none-eabihf --no-default-features --features pico2
    say "it compiles for the Pico 2"
    exit
    ;;
*) fail "BOARD is \"$board\"; it can be pico or pico2" ;;
esac

if [ "${UF2:-yes}" = yes ]; then
    tools=$target_dir/tools
    if [ ! -x "$tools/bin/elf2uf2-rs" ]; then
        # A program for this computer: none of the settings for the chip.
        (unset RUSTC_BOOTSTRAP && cd / && /usr/bin/cargo install --quiet --locked --no-default-features \
            --root "$tools" --version 2.2.0 elf2uf2-rs)
    fi
    for elf in "$image"/*.elf; do
        "$tools/bin/elf2uf2-rs" "$elf" "${elf%.elf}.uf2"
    done
fi
ls -l "$image"
