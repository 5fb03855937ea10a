// Standing cover over the collar: keeps chips off the magnets and fingers off the edge; open below.
// It is clamped between the sensor's two nuts together with the bracket. It is no machine guard.
include <parameters.scad>
$fn = 96;

shell = 3;
lip = 8;           // how far the side walls reach inward past the collar's edge
outer_r = spindle_d / 2 + ring;
width = magnet_d + 6 + screw_rows * screw_band;
// The sensor sits over the magnets, which are off the middle with one row of screws.
middle = (screw_rows == 2 ? screw_band : 0) + (magnet_d + 6) / 2;
inner = outer_r + cover_gap;
boss_d = sensor_d * 2.4;

assert(cover_to - cover_from < 180, "cover_to: the cover must be less than half round to go on from the side");
assert(cover_from < -20 && cover_to > 20, "cover_from: the cover must reach 20 degrees past the sensor on either side");
assert(boss_d < width + 2 * (cover_gap + shell), "sensor_d: the nut's seat is wider than the cover");
assert(lip < ring, "lip: would reach the spindle");

module section() {
    difference() {
        translate([outer_r - lip, -cover_gap - shell]) square([cover_gap + lip + shell, width + 2 * (cover_gap + shell)]);
        translate([outer_r - lip - 1, -cover_gap]) square([cover_gap + lip + 1, width + 2 * cover_gap]);
    }
}

difference() {
    union() {
        rotate([0, 0, cover_from]) rotate_extrude(angle = cover_to - cover_from) section();
        // Flat seat for the nut; it begins inside the shell, so that both make one body.
        difference() {
            translate([inner - 6, 0, middle]) rotate([0, 90, 0]) cylinder(d = boss_d, h = 6 + shell + 3);
            translate([0, 0, -cover_gap - shell - 1]) cylinder(r = inner + shell / 2, h = width + 2 * (cover_gap + shell) + 2);
        }
    }
    translate([inner - 10, 0, middle]) rotate([0, 90, 0]) cylinder(d = sensor_d + 0.3, h = 40);
}
