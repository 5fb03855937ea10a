// Two-half clamp collar with magnets in pockets that open towards the bore.
// The pull of rotation presses each magnet against closed material; the spindle blocks the only way out.
//   openscad -D 'part="half_a"' -o half_a.stl collar.scad
// part: half_a (screw heads), half_b (nuts), plug, balance_plug, assembly (to look at)
include <parameters.scad>
part = "assembly";
$fn = 96;

bore_r = spindle_d / 2;
outer_r = bore_r + ring;
magnet_band = magnet_d + 6;
width = magnet_band + screw_rows * screw_band;
magnet_z = (screw_rows == 2 ? screw_band : 0) + magnet_band / 2;
pocket_r = outer_r - floor_t;                 // radius of the pocket's floor
screw_r = bore_r + ring / 2;
sink_d = screw_washer_d + 0.6;
nut_corners = (nut_flats + fit) / cos(30);
// Farthest from the split plane: at a quarter of the magnets' angle modulo half a turn.
first_angle = magnets % 2 == 1 ? 90 / magnets : 180 / magnets;
// Slug of the same diameter that balances one magnet: both columns, plug included, have the same static moment.
balance_k = (magnet_density - collar_density) / (balance_density - collar_density)
    * (pocket_r * magnet_t - magnet_t * magnet_t / 2);
balance_t = pocket_r - sqrt(pocket_r * pocket_r - 2 * balance_k);

assert(magnets >= 1 && magnets <= 8 && magnets == floor(magnets), "magnets: a whole number from 1 to 8");
assert(screw_rows == 1 || screw_rows == 2, "screw_rows: 1 or 2");
assert(pocket_r - magnet_t - bore_r >= 2, "ring: too thin for the magnet and a plug of 2 mm");
assert(2 * bore_r * sin(min(90, 180 / magnets)) >= magnet_d + 3, "magnets: pockets would meet at the bore");
assert(bore_r * sin(min(first_angle, 90)) >= magnet_d / 2 + 3, "magnets: a pocket would meet the split");
assert(screw_r + sink_d / 2 + 2 <= outer_r && screw_r - sink_d / 2 - 2 >= bore_r, "ring: too thin for the screw heads");
assert(screw_band / 2 - max(sink_d, nut_corners) / 2 >= 1.5, "screw_band: too narrow for heads and nuts");
echo(balance_t = balance_t, width = width, outer_d = 2 * outer_r);

module pocket(angle) {
    // Starts inside the bore so that it opens cleanly.
    rotate([0, 0, angle]) translate([bore_r - 3, 0, magnet_z]) rotate([0, 90, 0])
        cylinder(d = magnet_d + fit, h = pocket_r - bore_r + 3);
}

module screw_hole(side, z) {
    translate([side * screw_r, 0, z]) {
        rotate([90, 0, 0]) cylinder(d = screw_hole_d, h = 2 * outer_r, center = true);
        translate([0, screw_seat, 0]) rotate([-90, 0, 0]) cylinder(d = sink_d, h = outer_r);
        // Hexagon with its flats towards bore and outside, so that walls stay thickest.
        translate([0, -screw_seat, 0]) rotate([90, 0, 0])
            rotate([0, 0, 30]) cylinder(d = nut_corners, h = outer_r, $fn = 6);
    }
}

module collar() {
    difference() {
        cylinder(r = outer_r, h = width);
        translate([0, 0, -1]) cylinder(r = bore_r, h = width + 2);
        translate([-outer_r - 1, -split / 2, -1]) cube([2 * outer_r + 2, split, width + 2]);
        for (i = [0 : magnets - 1]) pocket(first_angle + i * 360 / magnets);
        if (magnets == 1) pocket(first_angle + 180);
        for (side = [-1, 1]) {
            screw_hole(side, width - screw_band / 2);
            if (screw_rows == 2) screw_hole(side, screw_band / 2);
        }
        // A line to see whether the collar creeps on the spindle: continue it there with paint.
        translate([0, outer_r + 1, width]) rotate([90, 0, 0]) cylinder(d = 1.2, h = ring + 3, $fn = 12);
    }
}

module half(sign) {
    intersection() {
        collar();
        translate([-outer_r - 1, sign > 0 ? 0 : -outer_r - 1, -1]) cube([2 * outer_r + 2, outer_r + 1, width + 2]);
    }
}

// Fills the pocket between magnet and spindle; its inner end is hollowed to the bore's radius.
module plug(stack) {
    difference() {
        cylinder(d = magnet_d - fit, h = pocket_r - stack - bore_r + 1);
        translate([0, 0, pocket_r - stack]) rotate([90, 0, 0]) cylinder(r = bore_r, h = 2 * magnet_d, center = true);
    }
}

module magnet_at(angle, length, tint) {
    color(tint) rotate([0, 0, angle]) translate([pocket_r - length, 0, magnet_z]) rotate([0, 90, 0])
        cylinder(d = magnet_d, h = length);
}

if (part == "half_a") half(1);
else if (part == "half_b") half(-1);
else if (part == "plug") plug(magnet_t);
else if (part == "balance_plug") plug(balance_t);
else if (part == "assembly") {
    color("silver") half(-1);
    %half(1);
    for (i = [0 : magnets - 1]) magnet_at(first_angle + i * 360 / magnets, magnet_t, "firebrick");
    if (magnets == 1) magnet_at(first_angle + 180, balance_t, "goldenrod");
} else assert(false, str("part: unknown name ", part));
