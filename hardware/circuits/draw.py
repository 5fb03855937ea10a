"""Draws the circuits as SVG with schemdraw; the values come from electric.py.

    python draw.py OUTPUT_FOLDER

Coordinates are absolute, x to the right and y up; one unit is about the height of a short resistor.
"""

import re
import sys
from pathlib import Path

import schemdraw
import schemdraw.elements as e
import schemdraw.logic as logic

import electric as v
from electric import ohms

schemdraw.use("svg")
schemdraw.config(fontsize=11, font="DejaVu Sans", lw=1.4, bgcolor="white")


class Sheet:
    """A drawing with the few strokes that these circuits need."""

    def __init__(self):
        self.d = schemdraw.Drawing(show=False)

    def text(self, x, y, words, align="left", size=10):
        self.d += e.Label().at((x, y)).theta(0).label(words, loc="center", ofst=0, halign=align, valign="center", fontsize=size)

    def wire(self, *points, dots=(), style="-"):
        for a, b in zip(points, points[1:]):
            self.d += e.Line().endpoints(a, b).linestyle(style)
        for p in dots:
            self.d += e.Dot().at(p)

    def part(self, kind, a, b, words="", dx=0.5, dy=0.0, align="left"):
        """A two-terminal part from a to b; its text beside its middle."""
        self.d += kind().endpoints(a, b)
        if words:
            self.text((a[0] + b[0]) / 2 + dx, (a[1] + b[1]) / 2 + dy, words, align)

    def over(self, kind, a, b, words):
        """A level part with its text above it."""
        self.part(kind, a, b, words, dx=0, dy=0.5, align="center")

    def ground(self, x, y):
        self.d += e.Ground().at((x, y))

    def rail(self, x, y, words):
        self.d += e.Vdd().at((x, y)).label(words)

    def terminal(self, x, y, words, align="right"):
        self.d += e.Dot(open=True).at((x, y))
        self.text(x + (-0.25 if align == "right" else 0.25), y - 0.12, words, align)

    def box(self, x0, y0, x1, y1, words="", style="-"):
        self.d += e.Rect(corner1=(x0, y0), corner2=(x1, y1)).at((0, 0)).theta(0).linestyle(style)
        if words:
            self.text((x0 + x1) / 2, (y0 + y1) / 2, words, "center")

    def save(self, path):
        """Writes the drawing with a margin and a painted background, which not every viewer takes from a style."""
        svg = self.d.get_imagedata("svg").decode()
        pad = 14
        x, y, w, h = (float(n) for n in re.search(r'viewBox="([^"]+)"', svg)[1].split())
        x, y, w, h = x - pad, y - pad, w + 2 * pad, h + 2 * pad
        svg = re.sub(r' height="[^"]+" width="[^"]+" viewBox="[^"]+"', f' height="{h:.1f}pt" width="{w:.1f}pt" viewBox="{x:.1f} {y:.1f} {w:.1f} {h:.1f}"', svg, count=1)
        svg = svg.replace(">", f'><rect x="{x:.1f}" y="{y:.1f}" width="{w:.1f}" height="{h:.1f}" fill="white"/>', 1)
        path.write_text(svg + "\n")


def conditioner(s, x, y):
    """From a pulled-up line at (x, y) through RC, clamp and Schmitt buffer to GP2."""
    s.part(e.Resistor, (x, y), (x, y + 2), f"{ohms(v.R_PULL)}\npull-up")
    s.rail(x, y + 2, "+3.3 V")
    s.over(e.Resistor, (x, y), (x + 2.4, y), ohms(v.R_SERIES))
    s.part(e.Capacitor, (x + 2.4, y), (x + 2.4, y - 2), f"{v.C_FILTER * 1e9:g} nF\nC0G", dx=0.45)
    s.ground(x + 2.4, y - 2)
    s.part(e.Schottky, (x + 4.4, y), (x + 4.4, y + 2), "clamp\npair")
    s.rail(x + 4.4, y + 2, "+3.3 V")
    s.part(e.Schottky, (x + 4.4, y - 2), (x + 4.4, y))
    s.ground(x + 4.4, y - 2)
    s.wire((x + 2.4, y), (x + 5.6, y), dots=[(x, y), (x + 2.4, y), (x + 4.4, y)])
    s.d += logic.Schmitt().at((x + 5.6, y)).theta(0)
    s.text(x + 6.4, y - 1.2, "Schmitt buffer\nat 3.3 V, 100 nF", "center", 9)
    s.wire((x + 7.4, y), (x + 8.6, y))
    s.terminal(x + 8.6, y, "GP2, pin 4", "left")


def sensor(path):
    """Open-collector sensor."""
    s = Sheet()
    s.text(-2.6, 4.6, "Sensor input, open collector: hall switch, or gear-tooth sensor with its own magnet", size=12)
    s.box(-2.6, -1.2, 0, 3.2, "hall switch\nunipolar\nopen\ncollector")
    # Cable.
    for y, pin, name in ((2.6, "1", "+5 V"), (1.0, "2", "signal"), (-0.6, "3", "0 V")):
        s.wire((0, y), (4.6, y))
        s.text(2.0, y + 0.25, name, "center", 9)
        s.d += e.Dot(open=True).at((4.6, y))
        s.text(4.6, y + 0.4, pin, "center", 9)
    s.box(0.7, -1.3, 3.3, 3.4, style="--")
    s.text(2.0, 3.7, "shielded cable", "center", 9)
    s.wire((3.3, -1.3), (3.3, -2.0), (4.6, -2.0), style="--")
    s.d += e.Dot(open=True).at((4.6, -2.0))
    s.text(4.6, -1.6, "4", "center", 9)
    s.text(4.6, 3.7, "J1", "center", 11)
    s.wire((4.6, -0.6), (5.6, -0.6), (5.6, -2.0))
    s.wire((4.6, -2.0), (5.6, -2.0), (5.6, -2.3), dots=[(5.6, -2.0)])
    s.ground(5.6, -2.3)
    s.text(3.6, -2.75, "shield joined to 0 V here\nonly, open at the sensor", "center", 9)
    # Supply of the sensor.
    s.over(e.Fuse, (4.6, 2.6), (7.4, 2.6), f"PTC {v.PTC_SENSOR * 1000:g} mA")
    s.wire((7.4, 2.6), (8.6, 2.6), dots=[(7.4, 2.6)])
    s.rail(8.6, 2.6, "+5 V")
    s.part(e.Capacitor, (7.4, 2.6), (7.4, 1.4), "100 nF", dx=0.4)
    s.ground(7.4, 1.4)
    # Signal: down to its own row.
    s.wire((4.6, 1.0), (6.2, 1.0), (6.2, -0.2), (10.2, -0.2), dots=[(7.4, -0.2)])
    s.part(e.DiodeTVS, (7.4, -0.2), (7.4, -2.2), "TVS\n5 V", dx=0.4)
    s.ground(7.4, -2.2)
    conditioner(s, 10.2, -0.2)
    s.save(path)


def isolated(path):
    """24 V industrial sensor."""
    s = Sheet()
    s.text(-3.2, 4.4, "Isolated input for a 24 V industrial sensor (fit this instead of the open-collector input)", size=12)
    y, low = 2.0, -1.0
    s.terminal(0, y, "J2.1  in +")
    s.terminal(0, low, "J2.2  in -")
    s.over(e.Resistor, (0, y), (2.6, y), f"{ohms(v.R_ISO)}, 0.5 W")
    s.part(e.Resistor, (2.6, y), (2.6, low), f"{ohms(v.R_BLEED)}")
    s.part(e.Diode, (4.3, low), (4.3, y), "100 V\nsmall\nsignal", dx=0.35)
    s.wire((2.6, y), (6.6, y), dots=[(2.6, y), (4.3, y)])
    s.wire((0, low), (6.6, low), dots=[(2.6, low), (4.3, low)])
    s.part(e.LED, (6.6, y), (6.6, low))
    s.box(6.0, -1.6, 9.6, 3.0, style="--")
    s.text(7.7, 3.5, "coupler with Schmitt\noutput", "center", 9)
    # Logic side: open collector, low while the LED is lit.
    s.box(7.6, -0.4, 9.2, 1.4, "Schmitt,\nopen\ncollector")
    s.wire((8.4, 1.4), (8.4, 2.3), (10.2, 2.3))
    s.part(e.Capacitor, (10.2, 2.3), (10.2, 1.1), "100 nF", dx=0.4)
    s.ground(10.2, 1.1)
    s.wire((10.2, 2.3), (10.2, 2.7), dots=[(10.2, 2.3)])
    s.rail(10.2, 2.7, "+3.3 V")
    s.wire((8.4, -0.4), (8.4, -2.0))
    s.ground(8.4, -2.0)
    s.wire((9.2, 0), (12.2, 0), dots=[(12.2, 0)])
    s.part(e.Resistor, (12.2, 0), (12.2, 2.0), ohms(v.R_ISO_PULL))
    s.rail(12.2, 2.0, "+3.3 V")
    s.wire((12.2, 0), (13.8, 0))
    s.terminal(13.8, 0, "GP2, pin 4", "left")
    s.text(-3.2, -2.9, "Sensor with PNP output: output to in +, 0 V of the 24 V supply to in -.\n"
                       "Sensor with NPN output: +24 V to in +, output to in -.", size=10)
    s.text(-3.2, -3.8, "Low at GP2 while the sensor is on. No wire of the 24 V side touches the 0 V of the box.", size=10)
    s.save(path)


def outputs(path):
    """Lamp, relay and buzzer."""
    s = Sheet()
    s.text(-2.6, 5.9, "Outputs: each a logic-level N-MOSFET to 0 V; three lamps, one relay, one buzzer", size=12)

    def switch(x, pins):
        fet = e.AnalogNFet().at((x, 0.6)).theta(0).reverse().anchor("drain")
        s.d += fet
        gate, source = fet.absanchors["gate"], fet.absanchors["source"]
        s.wire((source.x, source.y), (source.x, -1.9))
        s.ground(source.x, -1.9)
        gx, gy = gate.x, gate.y
        s.wire((gx, gy), (gx - 0.5, gy), dots=[(gx - 0.5, gy)])
        s.part(e.Resistor, (gx - 0.5, gy), (gx - 0.5, -1.9), ohms(v.R_DOWN), dx=0.3, dy=-0.3)
        s.ground(gx - 0.5, -1.9)
        s.over(e.Resistor, (gx - 2.5, gy), (gx - 0.5, gy), ohms(v.R_GATE))
        s.d += e.Dot(open=True).at((gx - 2.5, gy))
        s.text(gx - 2.6, gy - 0.7, pins, "center", 9)

    # Lamp.
    x = 1.4
    s.part(e.LED, (x, 4.4), (x, 2.4), "lamp", dx=0.8)
    s.part(e.Resistor, (x, 2.4), (x, 0.6), f"{ohms(v.R_RED)} red, amber\n{ohms(v.R_GREEN)} green")
    s.rail(x, 4.4, "+5 V")
    switch(x, "GP12 over\nGP13 right\nGP14 under")
    # Buzzer.
    x = 8.0
    s.part(e.Inductor2, (x, 4.0), (x, 2.2), f"buzzer\n{v.R_BUZZ} Ω")
    s.part(e.Resistor, (x, 2.2), (x, 0.6), ohms(v.R_BUZZ_SERIES))
    s.rail(x, 4.4, "+5 V")
    s.wire((x, 4.4), (x, 4.0), (x + 2.2, 4.0), dots=[(x, 4.0)])
    s.part(e.Diode, (x + 2.2, 0.6), (x + 2.2, 4.0), "1 A\nflyback")
    s.wire((x, 0.6), (x + 2.2, 0.6), dots=[(x, 0.6)])
    switch(x, "GP15\nPWM")
    # Relay.
    x = 15.0
    s.part(e.Inductor2, (x, 3.4), (x, 0.6), f"coil\n5 V\n{v.R_COIL} Ω", dx=0.35)
    s.rail(x, 4.4, "+5 V")
    s.wire((x, 4.4), (x, 3.4), (x + 2.0, 3.4), dots=[(x, 3.4)])
    s.part(e.Diode, (x + 2.0, 0.6), (x + 2.0, 3.4), "1 A\nflyback")
    s.wire((x, 0.6), (x + 2.0, 0.6), dots=[(x, 0.6)])
    switch(x, "GP16")
    # Contact, drawn open: the coil is off at reset.
    cx = 19.2
    s.part(e.Switch, (cx, 1.2), (cx, 3.2), "")
    s.wire((cx, 3.2), (cx + 1.6, 3.2))
    s.wire((cx, 1.2), (cx + 1.6, 1.2))
    s.terminal(cx + 1.6, 3.2, "J4.1", "left")
    s.terminal(cx + 1.6, 1.2, "J4.2", "left")
    s.text(cx - 0.6, -0.6, "contact, open at rest:\nlamp or siren up to 24 V,\nwith its own 1 A fuse;\nnever a start, stop or\ninterlock circuit", "left", 9)
    s.save(path)


def supply(path):
    """Supply, display bus, one knob."""
    s = Sheet()
    s.text(-2.4, 2.6, "Supply", size=12)
    s.box(-2.4, -1.2, 1.4, 1.6, f"certified plug-in\nsupply, 5 V {v.SUPPLY_A:g} A\n(mains stays\ninside it)")
    s.wire((1.4, 1.0), (3.0, 1.0))
    s.wire((1.4, -0.6), (12.6, -0.6))
    s.text(2.2, 1.4, "J3.1", "center", 9)
    s.text(2.2, -0.2, "J3.2", "center", 9)
    s.over(e.Fuse, (3.0, 1.0), (5.4, 1.0), f"PTC {v.PTC_HOLD:g} A")
    s.wire((5.4, 1.0), (9.6, 1.0), dots=[(6.2, 1.0), (8.2, 1.0)])
    s.part(e.DiodeTVS, (6.2, 1.0), (6.2, -0.6), "TVS\n5 V", dx=0.4)
    s.part(e.Capacitor2, (8.2, 1.0), (8.2, -0.6), "220 µF\n10 V", dx=0.45)
    s.wire((9.6, 1.0), (9.6, 1.6), dots=[(9.6, 1.0)])
    s.rail(9.6, 1.6, "+5 V")
    s.over(e.Schottky, (9.6, 1.0), (12.6, 1.0), "1 A Schottky")
    s.terminal(12.6, 1.0, "VSYS, pin 39", "left")
    s.terminal(12.6, -0.6, "GND, pin 38", "left")
    s.d += e.Dot().at((6.2, -0.6))
    s.d += e.Dot().at((8.2, -0.6))
    s.d += e.Dot().at((9.6, -0.6))
    s.wire((9.6, -0.6), (9.6, -0.9))
    s.ground(9.6, -0.9)
    s.text(10.6, -1.6, "The Schottky diode lets a USB cable be plugged in\nat the same time. +3.3 V comes from pin 36.", size=9)

    s.text(-2.4, -3.6, "Display bus", size=12)
    for x, name, pin in ((0.6, "SDA", "GP4, pin 6"), (3.4, "SCL", "GP5, pin 7")):
        y = -7.2 if name == "SDA" else -8.2
        s.part(e.Resistor, (x, -5.4), (x, -7.0), ohms(v.R_I2C))
        s.rail(x, -5.4, "+3.3 V")
        s.wire((x, -7.0), (x, y))
        s.wire((-0.6, y), (5.6, y), dots=[(x, y)])
        s.terminal(-0.6, y, pin)
        s.terminal(5.6, y, f"display {name}", "left")

    s.text(9.6, -3.6, "Knob: A, B and push alike, six times", size=12)
    s.part(e.Resistor, (13.0, -5.4), (13.0, -7.2), ohms(v.R_KNOB))
    s.rail(13.0, -5.4, "+3.3 V")
    s.wire((11.4, -7.2), (16.6, -7.2), dots=[(13.0, -7.2), (15.0, -7.2)])
    s.terminal(11.4, -7.2, "pin")
    s.part(e.Capacitor, (15.0, -7.2), (15.0, -9.0), f"{v.C_KNOB * 1e9:g} nF", dx=0.45)
    s.ground(15.0, -9.0)
    s.part(e.Switch, (16.6, -7.2), (16.6, -9.0), "contact", dx=0.6)
    s.ground(16.6, -9.0)
    s.save(path)


if __name__ == "__main__":
    out = Path(sys.argv[1])
    out.mkdir(parents=True, exist_ok=True)
    for name, draw in (("sensor", sensor), ("isolated", isolated), ("outputs", outputs), ("supply", supply)):
        draw(out / f"{name}.svg")
