"""Component values and the arithmetic behind them.

The drawings (draw.py) and the tables (numbers.md) both read the values here, so a value is changed in one place.
Ohms, farads, volts, amperes, seconds. Every limit is a `demand` that stops the build when it does not hold.
Part figures are for the part class, from memory, unless a source is named: check the data sheet of the part you buy.
"""

import math

# --- values -------------------------------------------------------------------------------------------------------
V5, V3 = 5.0, 3.3
V5_MAX = 5.25
PULSES = 20_000  # per second: the electrical limit of the input, as in core's tacho

R_PULL, R_SERIES, C_FILTER = 1_000, 1_000, 1e-9  # sensor input
HALL_LOW = 0.4  # V at its rated sink current
R_ISO, R_BLEED, R_ISO_PULL = 2_200, 1_000, 2_200  # isolated input
ISO_VF = 1.2  # V, infrared LED of the coupler
ISO_ON, ISO_MAX = 1.6e-3, 30e-3  # A, largest turn-on threshold, largest steady current
ISO_DELAY = 4e-6  # s, longest turn-on or turn-off of a Schmitt-output coupler
R_GATE, R_DOWN = 330, 4_700
R_RED, R_GREEN, R_AMBER = 220, 150, 220
VF_RED, VF_GREEN, VF_AMBER = 2.0, 3.0, 2.0
R_COIL = 70  # relay coil, 5 V, the 360 mW class
R_BUZZ, R_BUZZ_SERIES = 42, 22
R_I2C, C_BUS = 2_200, 100e-12
R_KNOB, C_KNOB = 10_000, 10e-9
PTC_HOLD, PTC_SENSOR = 0.75, 0.10
SUPPLY_A = 2.0

# What each part draws from the 5 V rail, A; generous.
LOADS = {
    "Pico with its regulator": 0.100,
    "display": 0.040,
    "three lamps": 3 * 0.015,
    "relay coil": V5_MAX / R_COIL,
    "buzzer, mean at half duty": 0.5 * V5_MAX / (R_BUZZ + R_BUZZ_SERIES),
    "sensor and its pull-up": 0.015,
    "knobs, pull-ups": 0.005,
}


def demand(holds, text):
    """Stops the build when a limit does not hold."""
    if not holds:
        raise SystemExit(f"hardware/circuits: {text}")


def ohms(r):
    """A resistor as it is printed in drawings."""
    return f"{r / 1000:g} kΩ" if r >= 1000 else f"{r:g} Ω"


def sensor_input():
    """Open-collector sensor: pull-up, RC, Schmitt buffer."""
    pull = V3 / R_PULL
    rise, fall = (R_PULL + R_SERIES) * C_FILTER, R_SERIES * C_FILTER
    corner = 1 / (2 * math.pi * rise)
    demand(corner >= 3 * PULSES, f"RC corner {corner:.0f} Hz, must be at least 3 x {PULSES}")
    shortest = 1 / PULSES / 6  # a wheel may be high for only a sixth of its pitch
    settled = 1 - math.exp(-shortest / rise)
    demand(settled >= 0.95, f"shortest level settles to {settled:.2f}, must be 0.95")
    # Buffer thresholds anywhere from 0.3 to 0.7 of its supply.
    delay_fall = fall * math.log((V3 - HALL_LOW) / (0.3 * V3 - HALL_LOW))
    delay_rise = rise * math.log(1 / 0.3)
    reject = fall * math.log(1 / 0.7)
    clamp = (V5_MAX - V3 - 0.3) / R_SERIES
    demand(clamp < 0.01, f"clamp current {clamp:.4f} A, must be under 10 mA")
    return [
        ("pull-up current", f"3.3 V / {ohms(R_PULL)} = {pull * 1e3:.1f} mA", "wets the contacts; a hall switch sinks 20 mA or more"),
        ("time constants", f"rise ({ohms(R_PULL)} + {ohms(R_SERIES)}) x 1 nF = {rise * 1e6:.1f} µs; fall {fall * 1e6:.1f} µs", ""),
        ("RC corner", f"1 / (2 pi {rise * 1e6:.1f} µs) = {corner / 1e3:.0f} kHz", f"{corner / PULSES:.1f} x the limit of {PULSES} pulses/s; at least 3 demanded"),
        ("shortest level", f"{shortest * 1e6:.1f} µs, a sixth of the shortest period", f"settles to {settled * 100:.0f} %; 95 % demanded"),
        ("delay of the falling edge", f"at most {delay_fall * 1e6:.1f} µs (rising {delay_rise * 1e6:.1f} µs)", "the same for every pulse, so it drops out of the speed"),
        ("spikes ignored", f"shorter than {reject * 1e6:.2f} µs, even down to 0 V", "longer ones are the tacho's business"),
        ("signal wire on 5 V by mistake", f"({V5_MAX} - 3.3 - 0.3) V / {ohms(R_SERIES)} = {clamp * 1e3:.2f} mA in the clamp", "survives; on 24 V it does not: use the isolated input"),
    ]


def isolated_input():
    """24 V sensor through a coupler with Schmitt-trigger output."""
    rows = []
    for volts in (19.2, 24.0, 30.0):
        total = (volts - ISO_VF) / R_ISO
        led = total - ISO_VF / R_BLEED
        power = total**2 * R_ISO
        demand(led >= 2 * ISO_ON, f"coupler LED {led * 1e3:.1f} mA at {volts} V, must be twice the threshold")
        demand(led <= ISO_MAX / 2, f"coupler LED {led * 1e3:.1f} mA at {volts} V, must be half of the largest")
        demand(power <= 0.4, f"resistor dissipates {power:.2f} W, must stay under 0.4 of its 0.5 W")
        rows.append((f"LED current at {volts:g} V", f"({volts:g} - {ISO_VF}) V / {ohms(R_ISO)} - {ISO_VF} V / {ohms(R_BLEED)} = {led * 1e3:.1f} mA",
                     f"threshold {ISO_ON * 1e3:g} mA at most; resistor {power:.2f} W, fit 0.5 W"))
    bleed = 0.9 / R_BLEED
    share = 2 * ISO_DELAY * PULSES
    demand(share <= 0.25, f"coupler delays take {share:.2f} of the shortest period, must be at most a quarter")
    return rows + [
        ("leakage ignored", f"0.9 V / {ohms(R_BLEED)} = {bleed * 1e3:.1f} mA", "an off-state leakage below this does not light the LED"),
        ("speed of the coupler", f"2 x {ISO_DELAY * 1e6:g} µs x {PULSES} /s = {share * 100:.0f} % of the shortest period",
         "at most 25 % demanded; a plain phototransistor coupler is too slow"),
    ]


def outputs():
    """Lamps, relay and buzzer: low-side switches."""
    gate_v = V3 * R_DOWN / (R_DOWN + R_GATE)
    gate_i = V3 / R_GATE
    demand(gate_v >= 2.9, f"gate voltage {gate_v:.2f} V, must be at least 2.9")
    demand(gate_i <= 0.012, f"gate current {gate_i * 1e3:.1f} mA, must be within the pin's 12 mA")
    demand(R_DOWN + R_GATE <= 8_200, "pull-down path must be at most 8.2 kΩ")
    rows = [
        ("gate current at switching", f"3.3 V / {ohms(R_GATE)} = {gate_i * 1e3:.0f} mA at most", "the pin's strongest setting is 12 mA"),
        ("gate voltage", f"3.3 V x {ohms(R_DOWN)} / ({ohms(R_DOWN)} + {ohms(R_GATE)}) = {gate_v:.2f} V", "MOSFET specified on at 2.5 V"),
        ("pull-down", f"{ohms(R_DOWN)} + {ohms(R_GATE)} = {ohms(R_DOWN + R_GATE)} from pin to 0 V",
         "off while the chip is in reset; under the 8.2 kΩ that the first RP2350 needs (its erratum E9)"),
    ]
    for name, vf, r in (("red lamp, over", VF_RED, R_RED), ("green lamp, right", VF_GREEN, R_GREEN), ("amber lamp, under", VF_AMBER, R_AMBER)):
        i = (V5 - vf) / r
        demand(0.010 <= i <= 0.016, f"{name}: {i * 1e3:.1f} mA, must be 10 to 16")
        rows.append((name, f"(5 - {vf:g}) V / {ohms(r)} = {i * 1e3:.1f} mA", f"{i * i * r * 1e3:.0f} mW in the resistor"))
    coil = V5_MAX / R_COIL
    rows += [
        ("relay coil and flyback diode", f"{V5_MAX} V / {ohms(R_COIL)} = {coil * 1e3:.0f} mA", "at switch-off the diode takes over this very current; a 1 A diode has plenty"),
        ("buzzer", f"5 V / ({ohms(R_BUZZ)} + {ohms(R_BUZZ_SERIES)}) = {V5 / (R_BUZZ + R_BUZZ_SERIES) * 1e3:.0f} mA peak, half of it mean",
         "900 to 2700 Hz by PWM; flyback diode as for the relay"),
    ]
    return rows


def others():
    """Display bus, knobs, supply."""
    tr = 0.8473 * R_I2C * C_BUS
    demand(tr <= 300e-9, f"I2C rise time {tr * 1e9:.0f} ns, must be at most 300")
    parallel = R_I2C * 4_700 / (R_I2C + 4_700)
    sink = (V3 - 0.4) / parallel
    demand(sink <= 3e-3, f"I2C sink {sink * 1e3:.1f} mA, must be at most 3")
    knob = R_KNOB * C_KNOB
    step = 1 / (5 * 24 * 4)
    demand(knob <= step / 10, "knob filter too slow")
    total = sum(LOADS.values())
    demand(PTC_HOLD * 0.7 >= total, f"fuse holds {PTC_HOLD * 0.7:.2f} A in a warm box, load {total:.2f} A")
    demand(SUPPLY_A >= 2.5 * PTC_HOLD, "supply must be able to trip the fuse")
    rows = [
        ("I2C rise time", f"0.8473 x {ohms(R_I2C)} x {C_BUS * 1e12:g} pF = {tr * 1e9:.0f} ns",
         "at most 300 ns at 400 kHz (UM10204); the 10 kΩ on many display modules alone would give 847 ns"),
        ("I2C sink current", f"(3.3 - 0.4) V / ({ohms(R_I2C)} beside 4.7 kΩ on the module) = {sink * 1e3:.1f} mA", "at most 3 mA (UM10204)"),
        ("knob filter", f"{ohms(R_KNOB)} x {C_KNOB * 1e9:g} nF = {knob * 1e6:.0f} µs", f"a hand at 5 turns a second on 24 detents steps every {step * 1e3:.1f} ms"),
    ]
    rows += [(f"load: {name}", f"{amps * 1e3:.0f} mA", "") for name, amps in LOADS.items()]
    return rows + [
        ("load, all at once", f"{total * 1e3:.0f} mA", f"fuse holds {PTC_HOLD:g} A at 20 °C, about 70 % of it in a warm box; supply {SUPPLY_A:g} A, so that it can trip the fuse"),
    ]


def gear_teeth():
    """Pulses a second of a toothed wheel on the spindle, against the limit."""
    rows = ["| teeth on the spindle | highest speed at 20,000 pulses/s, rev/min | pulses/s at 3000 rev/min |", "|---|---|---|"]
    rows += [f"| {n} | {60 * PULSES // n} | {n * 3000 // 60} |" for n in (1, 2, 6, 24, 40, 60, 120, 200, 240)]
    return rows


def report():
    """The tables as Markdown."""
    out = []
    for title, rows in (("Sensor input", sensor_input()), ("Isolated input", isolated_input()),
                        ("Lamps, relay, buzzer", outputs()), ("Display bus, knobs, supply", others())):
        out += [f"## {title}", "", "| what | arithmetic | remark |", "|---|---|---|"]
        out += [f"| {a} | {b} | {c} |" for a, b, c in rows] + [""]
    return out + ["## Teeth and speed", ""] + gear_teeth() + [""]
