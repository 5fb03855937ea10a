#!/bin/sh
# Builds everything of this folder into hardware/out/ and checks that the pages agree.
#   hardware/build.sh              build and check; fails on any warning of OpenSCAD and on stale drawings
#   hardware/build.sh --update     the same, and renews the drawings and tables that are committed
#   hardware/build.sh --pictures   the same as the first, and PNG views of the printed parts (needs xvfb-run)
# Made with OpenSCAD 2021.01 and Graphviz 2.43 of Debian 12; the Python tools are pinned in requirements.txt.
set -eu
cd "$(dirname "$0")"
out=$PWD/out
mode=${1:-check}
case $mode in
check | --update | --pictures) ;;
*) echo "hardware/build.sh: unknown option $mode, must be --update or --pictures" >&2; exit 2 ;;
esac

# Tools: command, Debian package. As root on Debian what is missing is installed, and said so; else it is named.
packages=
need() { command -v "$1" >/dev/null 2>&1 || packages="$packages $2"; }
need openscad openscad
need dot graphviz
need python3 python3
need fc-list fontconfig
python3 -c 'import ensurepip, venv' 2>/dev/null || packages="$packages python3-venv"
fc-list 2>/dev/null | grep -q 'DejaVuSans\.ttf' || packages="$packages fonts-dejavu-core"
[ "$mode" != --pictures ] || { need xvfb-run xvfb; need xauth xauth; }
if [ -n "$packages" ]; then
    if [ "$(id -u)" = 0 ] && command -v apt-get >/dev/null 2>&1; then
        echo "hardware: installing$packages"
        apt-get update -qq
        # shellcheck disable=SC2086
        DEBIAN_FRONTEND=noninteractive apt-get install -y -qq --no-install-recommends $packages >/dev/null
    else
        echo "hardware/build.sh: missing; install these Debian packages:$packages" >&2
        exit 1
    fi
fi

mkdir -p "$out"
venv=$out/venv
if ! cmp -s requirements.txt "$venv/installed.txt"; then
    echo "hardware: installing the Python tools of requirements.txt into hardware/out/venv"
    rm -rf "$venv"
    python3 -m venv "$venv"
    "$venv/bin/pip" install --quiet --disable-pip-version-check --requirement requirements.txt
    cp requirements.txt "$venv/installed.txt"
fi
python=$venv/bin/python
export PYTHONDONTWRITEBYTECODE=1

# OpenSCAD reports many faults as mere warnings: any of them ends the build, as does a part that is no proper solid.
scad() { # SOURCE TARGET [OPTIONS...]
    source=$1 target=$2
    shift 2
    if ! openscad --hardwarnings "$@" -o "$target" "$source" >"$out/openscad.log" 2>&1 || grep -Eq 'WARNING|ERROR|Simple: +no' "$out/openscad.log"; then
        echo "hardware: $source $* failed:" >&2
        cat "$out/openscad.log" >&2
        exit 1
    fi
}

echo "hardware: tables"
"$python" check.py pins
"$python" check.py bill
"$python" check.py numbers "$out/numbers.md"

echo "hardware: printed parts"
# The asserts for other numbers of magnets, without the slow solid geometry, and two that must be refused.
for n in 1 2 3 4 6 8; do
    scad mount/collar.scad "$out/try.csg" -D "magnets=$n"
done
for n in 5 9; do
    # The exit status of OpenSCAD 2021.01 does not tell: it is 0 after a failed assert.
    if ! openscad -D "magnets=$n" -o "$out/try.csg" mount/collar.scad 2>&1 | grep -q 'ERROR: Assertion'; then
        echo "hardware: collar.scad took $n magnets on this spindle, must refuse" >&2
        exit 1
    fi
done
scad mount/collar.scad "$out/try.csg" -D magnets=1
"$python" check.py slug "$(sed -n 's/.*balance_t = \([0-9.]*\).*/\1/p' "$out/openscad.log")"
# One magnet with its slug takes the same two halves as two magnets.
for part in half_a half_b plug balance_plug; do
    scad mount/collar.scad "$out/collar_$part.stl" -D "part=\"$part\""
done
scad mount/bracket.scad "$out/bracket.stl"
scad mount/cover.scad "$out/cover.stl"

echo "hardware: panel"
for part in front wall; do
    scad panel/panel.scad "$out/panel_$part.svg" -D "part=\"$part\""
    scad panel/panel.scad "$out/panel_$part.dxf" -D "part=\"$part\""
done
scad panel/panel.scad "$out/panel_drawing.svg" -D 'part="drawing"'

echo "hardware: wiring and circuits"
PATH="$venv/bin:$PATH" wireviz wiring.yml -f sp -o "$out" -O wiring >"$out/wireviz.log" 2>&1 || { cat "$out/wireviz.log" >&2; exit 1; }
"$python" circuits/draw.py "$out/circuits"

# Committed drawings: made, target, sources.
drawings() {
    "$1" "$out/wiring.svg" wiring.svg wiring.yml
    "$1" "$out/panel_drawing.svg" panel/panel.svg panel/panel.scad
    for name in sensor isolated outputs supply; do
        "$1" "$out/circuits/$name.svg" "circuits/$name.svg" circuits/electric.py circuits/draw.py
    done
}
publish() { "$python" check.py publish "$@"; }
fresh() { shift; "$python" check.py fresh "$@"; }
if [ "$mode" = --update ]; then
    drawings publish
    cp "$out/numbers.md" numbers.md
fi
drawings fresh
cmp -s "$out/numbers.md" numbers.md || { echo "hardware: numbers.md is old: run hardware/build.sh --update and commit it" >&2; exit 1; }

if [ "$mode" = --pictures ]; then
    picture() { # SOURCE TARGET [OPTIONS...]
        source=$1 target=$2
        shift 2
        xvfb-run -a openscad "$@" --render --imgsize=1000,800 --autocenter --viewall -o "$target" "$source" >"$out/openscad.log" 2>&1 ||
            { echo "hardware: no picture of $source:" >&2; cat "$out/openscad.log" >&2; exit 1; }
    }
    picture mount/collar.scad "$out/collar_half_a.png" -D 'part="half_a"'
    picture mount/collar.scad "$out/collar_half_b.png" -D 'part="half_b"'
    picture mount/collar.scad "$out/collar_plug.png" -D 'part="plug"'
    picture mount/bracket.scad "$out/bracket.png"
    picture mount/cover.scad "$out/cover.png"
fi
echo "hardware: built into hardware/out, all pages agree"
