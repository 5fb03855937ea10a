"""Keeps the pages of this folder in step with one another.

    python check.py numbers OUT      write the tables of arithmetic to OUT
    python check.py pins             pins.csv is sound and wiring.yml agrees with it
    python check.py bill             bom.csv is sound and holds every component value
    python check.py slug LENGTH      the balance slug that OpenSCAD computed is the one of magnets.py
    python check.py publish FROM TO SOURCE...   copy a drawing, stamped with its sources
    python check.py fresh DRAWING SOURCE...     that stamp still fits the sources
"""

import csv
import hashlib
import re
import sys
from pathlib import Path

HERE = Path(__file__).parent
sys.path[:0] = [str(HERE / "circuits"), str(HERE / "mount")]

import electric  # noqa: E402
import magnets  # noqa: E402

PIN_COLUMNS = ["signal", "gpio", "pin", "direction", "pull", "note"]
BILL_COLUMNS = ["group", "qty", "kind", "value", "rating", "note"]
# GPIO of each pin on the Pico's two rows (Raspberry Pi Pico data sheet, pinout).
GPIO_OF_PIN = dict(zip((1, 2, 4, 5, 6, 7, 9, 10, 11, 12, 14, 15, 16, 17, 19, 20, 21, 22, 24, 25, 26, 27, 29, 31, 32, 34), [*range(23), 26, 27, 28]))


def fail(text):
    """Ends with one line."""
    raise SystemExit(f"hardware: {text}")


def rows(name, columns):
    """Rows of a CSV file whose header must be exactly `columns`."""
    with open(HERE / name, newline="", encoding="utf-8") as file:
        reader = csv.DictReader(file)
        if reader.fieldnames != columns:
            fail(f"{name}: header {reader.fieldnames}, must be {columns}")
        found = list(reader)
    for number, row in enumerate(found, 2):
        if None in row or None in row.values():
            fail(f"{name}, line {number}: must have {len(columns)} fields")
    return found


def numbers(out):
    """All arithmetic as one page."""
    retention, _ = magnets.report()
    page = ["# Numbers", "", "Made by `hardware/build.sh` from circuits/electric.py, mount/magnets.py and mount/parameters.scad; change those.",
            "Figures of parts are for their class, from memory: the data sheet of the part in hand decides.", ""]
    Path(out).write_text("\n".join(page + retention + [""] + electric.report()).rstrip() + "\n", encoding="utf-8")


def pins():
    """The pin table against the Pico's pinout and against the wiring diagram."""
    import yaml

    table = rows("pins.csv", PIN_COLUMNS)
    for column in ("signal", "gpio", "pin"):
        values = [row[column] for row in table]
        twice = {x for x in values if values.count(x) > 1}
        if twice:
            fail(f"pins.csv: {column} {', '.join(sorted(twice))} is there twice")
    for row in table:
        if GPIO_OF_PIN.get(int(row["pin"])) != int(row["gpio"]):
            fail(f"pins.csv: {row['signal']}: GP{row['gpio']} is not on pin {row['pin']} of a Pico")
        if row["direction"] not in ("input", "output", "bidirectional"):
            fail(f"pins.csv: {row['signal']}: direction {row['direction']!r}, must be input, output or bidirectional")
        if row["direction"] == "output" and row["pull"] != "external-down":
            fail(f"pins.csv: {row['signal']}: an output must be held off by an external pull-down while the chip is in reset")
    drawn = wired(yaml.safe_load((HERE / "wiring.yml").read_text(encoding="utf-8")))
    wanted = {(int(row["pin"]), f"GP{row['gpio']}", row["signal"]) for row in table}
    for pin, label, signal in sorted(wanted ^ drawn):
        where = "pins.csv only" if (pin, label, signal) in wanted else "wiring.yml only"
        fail(f"pin {pin}, {label}, {signal}: in {where}")
    print(f"pins: {len(table)} signals agree with the wiring")


def expand(listed):
    """Pin numbers of a WireViz list, whose items may be ranges."""
    for item in listed:
        first, _, last = str(item).partition("-")
        yield from range(int(first), int(last or first) + 1)


def wired(wiring):
    """(pin, GPIO label, signal at the other end) of every GPIO that the diagram connects."""
    parts = wiring["connectors"]
    pico = dict(zip(parts["PICO"]["pins"], parts["PICO"]["pinlabels"]))
    found = set()
    for chain in wiring["connections"]:
        if "PICO" not in chain[0]:
            continue
        (name, ends), = chain[2].items()
        here, there = list(expand(chain[0]["PICO"])), list(expand(ends))
        if len(here) != len(there):
            fail(f"wiring.yml: PICO to {name}: {len(here)} pins on one side, {len(there)} on the other")
        found |= {(pin, pico[pin], parts[name]["pinlabels"][end - 1]) for pin, end in zip(here, there) if pico[pin].startswith("GP") }
    return found


def bill():
    """The bill has sound quantities and every component value that the circuits use, as often as they do."""
    table = rows("bom.csv", BILL_COLUMNS)
    for number, row in enumerate(table, 2):
        if not row["qty"].isdecimal() or int(row["qty"]) < 1:
            fail(f"bom.csv, line {number}: qty {row['qty']!r}, must be a whole number from 1")
        if not row["kind"]:
            fail(f"bom.csv, line {number}: no kind")
    e = electric
    used = {}
    for ohms, times in ((e.R_PULL, 1), (e.R_SERIES, 1), (e.R_ISO, 1), (e.R_BLEED, 1), (e.R_ISO_PULL, 1), (e.R_GATE, 5), (e.R_DOWN, 5),
                        (e.R_RED, 1), (e.R_AMBER, 1), (e.R_GREEN, 1), (e.R_BUZZ_SERIES, 1), (e.R_I2C, 2), (e.R_KNOB, 6)):
        used[e.ohms(ohms)] = used.get(e.ohms(ohms), 0) + times
    listed = {}
    for row in table:
        if row["kind"] == "resistor":
            listed[row["value"]] = listed.get(row["value"], 0) + int(row["qty"])
    if used != listed:
        fail(f"bom.csv: resistors {listed}, the circuits use {used}")
    p = magnets.parameters()
    kinds = {row["kind"]: row for row in table}
    magnet = kinds.get("disc magnet", {})
    wanted = (f"{p['magnet_d']:g} x {p['magnet_t']:g} mm", f"{p['magnets']:g}")
    if (magnet.get("value"), magnet.get("qty")) != wanted:
        fail(f"bom.csv: disc magnet must be {wanted[0]}, {wanted[1]} pieces, as in mount/parameters.scad")
    print(f"bill: {len(table)} rows, resistors and magnets as drawn")


def slug(length):
    """One formula in two languages."""
    _, ours = magnets.report()
    if abs(float(length) - ours) > 1e-3:
        fail(f"balance slug {length} mm in collar.scad, {ours:.4f} mm in magnets.py")


def digest(sources):
    """One SHA-256 over the sources, line ends aside."""
    total = hashlib.sha256()
    for name in sources:
        total.update((HERE / name).read_text(encoding="utf-8").encode() + b"\0")
    return total.hexdigest()


def publish(source, target, *sources):
    """Copies an SVG, with a painted background where it has none, and the stamp of its sources."""
    svg = Path(source).read_text(encoding="utf-8").rstrip()
    if "<title>OpenSCAD" in svg:
        svg = svg.replace('stroke="black" fill="lightgray" stroke-width="0.5"', 'fill="black"')
        x, y, w, h = (float(n) for n in re.search(r'viewBox="([^"]+)"', svg)[1].split())
        x, y, w, h = x - 4, y - 4, w + 8, h + 8
        svg = re.sub(r'width="[^"]+" height="[^"]+" viewBox="[^"]+"', f'width="{w:g}mm" height="{h:g}mm" viewBox="{x:g} {y:g} {w:g} {h:g}"', svg, count=1)
        svg = svg.replace("<title>OpenSCAD Model</title>", f'<rect x="{x:g}" y="{y:g}" width="{w:g}" height="{h:g}" fill="white"/>')
    stamp = f"<!-- made by hardware/build.sh; sources {' '.join(sources)} sha256 {digest(sources)} -->"
    Path(target).write_text(f"{svg}\n{stamp}\n", encoding="utf-8")


def fresh(drawing, *sources):
    """The committed drawing was made from the sources as they are."""
    if not Path(drawing).is_file() or digest(sources) not in Path(drawing).read_text(encoding="utf-8"):
        fail(f"{drawing} is missing or older than {' '.join(sources)}: run hardware/build.sh --update and commit it")


COMMANDS = {f.__name__: f for f in (numbers, pins, bill, slug, publish, fresh)}

if __name__ == "__main__":
    if len(sys.argv) < 2 or sys.argv[1] not in COMMANDS:
        fail(f"check.py: command must be one of {', '.join(COMMANDS)}")
    COMMANDS[sys.argv[1]](*sys.argv[2:])
