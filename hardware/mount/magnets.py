"""Will the magnets stay, and will the sensor see them? The arithmetic behind the collar, from parameters.scad.

Every function states its law; every limit is a `demand` that stops the build when it does not hold.
"""

import math
import re
from pathlib import Path

HERE = Path(__file__).parent
# Least factor between what holds and what pulls, at the proof speed. Common practice, no source: a printed part of
# unknown quality that must never let go deserves more than the 2 to 4 of sound metal parts.
MAGNET_FACTOR = 10
RING_FACTOR = 10
JOINT_FACTOR = 2
BEARING_FACTOR = 1.2
# Flux density that switches any usual unipolar switch (operate point at most 20 mT), with a margin of 2 for
# warm magnets, tolerance and misalignment.
FIELD_MT = 40
# Friction of plastic on a degreased steel spindle, low guess, from memory; spin-up in one second, a harsh start.
FRICTION = 0.15
# Torque T = K F d of a dry steel screw, K from memory.
TORQUE_K = 0.2
SPIN_UP_S = 1.0


def parameters():
    """Names and numbers of parameters.scad."""
    line = re.compile(r"^(\w+) = (-?[\d.]+);")
    found = (line.match(text) for text in (HERE / "parameters.scad").read_text().splitlines())
    return {m[1]: float(m[2]) for m in found if m}


def demand(holds, text):
    """Stops the build when a limit does not hold."""
    if not holds:
        raise SystemExit(f"hardware/mount: {text}")


def omega(rpm):
    """Angular speed in rad/s."""
    return 2 * math.pi * rpm / 60


def cylinder_kg(d, length, density):
    """Mass in kg of a cylinder measured in mm."""
    return math.pi / 4 * d**2 * length * density * 1e-9


def pull(mass, radius, rpm):
    """Pull of rotation F = m r w^2 in N; mass in kg, radius in mm."""
    return mass * radius * 1e-3 * omega(rpm) ** 2


def field_mt(br, d, t, z):
    """Flux density in mT on the axis of a disc magnet, z mm from its face (field of a uniformly magnetised cylinder)."""
    r = d / 2
    return 500 * br * ((z + t) / math.hypot(r, z + t) - z / math.hypot(r, z))


def balance_length(p, pocket_r):
    """Length of the slug that balances one magnet: both columns, plug included, have one static moment."""
    k = (p["magnet_density"] - p["collar_density"]) / (p["balance_density"] - p["collar_density"])
    k *= pocket_r * p["magnet_t"] - p["magnet_t"] ** 2 / 2
    return pocket_r - math.sqrt(pocket_r**2 - 2 * k)


def half_ring(p, bore_r, outer_r, width):
    """Mass in kg and radius of the centre of mass in mm of one half, taken as solid: too heavy is the safe side."""
    area = math.pi / 2 * (outer_r**2 - bore_r**2)
    centre = 4 / (3 * math.pi) * (outer_r**3 - bore_r**3) / (outer_r**2 - bore_r**2)
    return area * width * p["collar_density"] * 1e-9, centre


def report():
    """The tables as Markdown; stops when a demand fails."""
    p = parameters()
    top, proof = p["top_speed"], p["proof_speed"]
    demand(proof >= 1.5 * top, f"proof_speed: {proof:g}, must be at least 1.5 x top_speed {top:g}")
    bore_r = p["spindle_d"] / 2
    outer_r = bore_r + p["ring"]
    pocket_r = outer_r - p["floor_t"]
    width = p["magnet_d"] + 6 + p["screw_rows"] * p["screw_band"]

    magnet = cylinder_kg(p["magnet_d"], p["magnet_t"], p["magnet_density"])
    magnet_r = pocket_r - p["magnet_t"] / 2
    plug_l = pocket_r - p["magnet_t"] - bore_r
    plug = cylinder_kg(p["magnet_d"], plug_l, p["collar_density"])
    plug_r = bore_r + plug_l / 2

    out = ["## Magnet retention", ""]
    out += [
        f"Disc magnet {p['magnet_d']:g} x {p['magnet_t']:g} mm, density {p['magnet_density']:g} kg/m3: "
        f"mass pi/4 d^2 t rho = {magnet * 1e3:.2f} g. Pull F = m r w^2, w = 2 pi n / 60.",
        "",
        "| case | radius mm | n rev/min | w rad/s | rim speed m/s | pull N | pull / weight |",
        "|---|---|---|---|---|---|---|",
    ]
    cases = [("worked example", 60.0, 3000), ("worked example", 60.0, 6000)]
    cases += [("this collar, top speed", magnet_r, top), ("this collar, proof speed", magnet_r, proof)]
    for name, radius, rpm in cases:
        f = pull(magnet, radius, rpm)
        out.append(
            f"| {name} | {radius:.1f} | {rpm:g} | {omega(rpm):.1f} | {omega(rpm) * radius / 1e3:.1f} "
            f"| {f:.1f} | {f / (magnet * 9.81):.0f} |"
        )

    # The pocket's floor carries magnet and plug; it would fail by punching out a disc: shear area pi d t.
    # Shear strength is taken as half of the tensile figure.
    area = math.pi * p["magnet_d"] * p["floor_t"]
    holds = area * p["collar_strength"] / 2
    load = pull(magnet, magnet_r, proof) + pull(plug, plug_r, proof)
    factor = holds / load
    demand(factor >= MAGNET_FACTOR, f"floor_t: factor {factor:.1f} at proof speed, must be at least {MAGNET_FACTOR}")
    # Hoop stress of a thin spinning ring at the outer rim, rho v^2; a thick ring stays below it for any bore.
    hoop = p["collar_density"] * (omega(proof) * outer_r * 1e-3) ** 2 * 1e-6
    ring_factor = p["collar_strength"] / hoop
    demand(ring_factor >= RING_FACTOR, f"ring: factor {ring_factor:.1f}, must be at least {RING_FACTOR}")
    # The joint: both halves fly apart unless the screws hold; the magnets of one half pull with it.
    mass, centre = half_ring(p, bore_r, outer_r, width)
    in_half = max(1, math.ceil(p["magnets"] / 2))
    apart = pull(mass, centre, proof) + in_half * load
    screws = 2 * p["screw_rows"]
    clamp = screws * p["screw_force"]
    joint = clamp / apart
    demand(joint >= JOINT_FACTOR, f"screw_force: factor {joint:.1f}, must be at least {JOINT_FACTOR}")
    # The plastic under washer and nut; collar_strength is already half of the usual figure.
    hole = math.pi / 4 * p["screw_hole_d"] ** 2
    under = {
        "washers": math.pi / 4 * p["screw_washer_d"] ** 2 - hole,
        "nuts": math.sqrt(3) / 2 * p["nut_flats"] ** 2 - hole,
    }
    bearing = []
    for name, seat in under.items():
        stress = p["screw_force"] / seat
        demand(stress * BEARING_FACTOR <= p["collar_strength"], f"screw_force: {stress:.1f} MPa under the {name}")
        bearing.append(
            f"| plastic under the {name} | {seat:.1f} mm2 at {p['collar_strength']:g} MPa | {p['screw_force']:g} N, {stress:.1f} MPa "
            f"| {p['collar_strength']:g} MPa | {p['collar_strength'] / stress:.1f} | {BEARING_FACTOR:g} |"
        )
    torque = TORQUE_K * p["screw_force"] * p["screw_d"] * 1e-3
    # What clamp remains grips the spindle on both sides; it must turn the collar along when the machine starts.
    grip = 2 * FRICTION * (clamp - apart) * bore_r * 1e-3
    inertia = math.pi / 2 * p["collar_density"] * width * 1e-3 * ((outer_r * 1e-3) ** 4 - (bore_r * 1e-3) ** 4)
    inertia += p["magnets"] * magnet * (magnet_r * 1e-3) ** 2
    start = inertia * omega(proof) / SPIN_UP_S
    slip = grip / start
    demand(slip >= JOINT_FACTOR, f"screw_force: grip factor {slip:.1f}, must be at least {JOINT_FACTOR}")
    out += [
        "",
        f"At the proof speed of {proof:g} rev/min ({proof / top:g} x top speed, {(proof / top) ** 2:g} x its pull):",
        "",
        "| part | what holds | pulls | holds | factor | demanded |",
        "|---|---|---|---|---|---|",
        f"| pocket floor, {p['floor_t']:g} mm | shear area pi d t = {area:.1f} mm2 at {p['collar_strength'] / 2:g} MPa "
        f"| magnet and plug, {load:.1f} N | {holds:.0f} N | {factor:.1f} | {MAGNET_FACTOR} |",
        f"| ring | {p['collar_strength']:g} MPa | hoop stress rho v^2 = {hoop:.2f} MPa | {p['collar_strength']:g} MPa "
        f"| {ring_factor:.0f} | {RING_FACTOR} |",
        f"| joint | {screws:g} screws at {p['screw_force']:g} N | half of {mass * 1e3:.0f} g at {centre:.1f} mm, with magnets, "
        f"{apart:.0f} N | {clamp:.0f} N | {joint:.1f} | {JOINT_FACTOR} |",
        f"| grip on the spindle | friction {FRICTION:g} x what clamp is left | start in {SPIN_UP_S:g} s, {start:.2f} N m "
        f"| {grip:.1f} N m | {slip:.0f} | {JOINT_FACTOR} |",
        *bearing,
        "",
        f"Tightening torque K F d = {TORQUE_K:g} x {p['screw_force']:g} N x {p['screw_d']:g} mm = {torque:.2f} N m, on top of what the locking nut takes by itself.",
        "",
        "The glue counts for nothing in these figures, and neither does the magnet's own grip on a steel spindle.",
    ]

    slug = balance_length(p, pocket_r)
    moment = magnet * 1e3 * magnet_r
    out += [
        "",
        "## Balance of a single magnet",
        "",
        f"Left alone, one magnet is an unbalance of m r = {moment:.0f} g mm and shakes the spindle with "
        f"{pull(magnet, magnet_r, top):.1f} N at {top:g} rev/min. Opposite it goes a brass slug of the same diameter, "
        f"{slug:.2f} mm long ({cylinder_kg(p['magnet_d'], slug, p['balance_density']) * 1e3:.2f} g), with its own longer plug; "
        "cut 0.05 mm off for every 0.03 g that your magnet weighs less. "
        "Two magnets or more, evenly spaced, balance each other.",
    ]

    out += ["", "## Field at the sensor", ""]
    out += [
        f"Remanence {p['magnet_br']:g} T. On the axis, z from the magnet's face: "
        "B = Br/2 [(z+t)/sqrt(R^2+(z+t)^2) - z/sqrt(R^2+z^2)]. "
        f"z = floor {p['floor_t']:g} + gap + depth of the element in the sensor {p['sensor_depth']:g} mm. "
        f"At the gap to be set the field must be at least {FIELD_MT} mT, twice the weakest operate point in the bill.",
        "",
        "| gap mm | z mm | B mT |",
        "|---|---|---|",
    ]
    for gap in sorted({1.0, 2.0, p["sensor_gap"], 4.0, 5.0, 7.0}):
        z = p["floor_t"] + gap + p["sensor_depth"]
        b = field_mt(p["magnet_br"], p["magnet_d"], p["magnet_t"], z)
        mark = " (set this)" if gap == p["sensor_gap"] else ""
        out.append(f"| {gap:g}{mark} | {z:g} | {b:.0f} |")
        if gap == p["sensor_gap"]:
            demand(b >= FIELD_MT, f"sensor_gap: field {b:.0f} mT, must be at least {FIELD_MT} mT")
    return out, slug
