// Angle bracket for a sensor with threaded barrel; slots set the gap, gussets keep it from ringing.
// Print it upright or copy it in aluminium; nothing near the sensor's face may be steel.
include <parameters.scad>
$fn = 64;

wall = 8;
base_l = 60;
base_w = 54;
gusset = 6;
slot_w = 6.6;      // M6
slot_l = 26;
top = axis_height + sensor_d / 2 + 12;

assert(axis_height >= wall + sensor_d + 8, "axis_height: no room for the sensor's nuts above the base");

module slot(y) {
    hull() for (x = [wall + 14, wall + 14 + slot_l - slot_w]) translate([x, y, -1]) cylinder(d = slot_w, h = wall + 2);
}

difference() {
    union() {
        translate([0, -base_w / 2, 0]) cube([base_l, base_w, wall]);
        translate([0, -base_w / 2, 0]) cube([wall, base_w, top]);
        for (y = [-base_w / 2, base_w / 2 - gusset]) translate([0, y + gusset, 0]) rotate([90, 0, 0])
            linear_extrude(gusset) polygon([[0, 0], [base_l, 0], [base_l, wall], [wall + 6, top - 6], [0, top]]);
    }
    for (y = [-11, 11]) slot(y);
    translate([-1, 0, axis_height]) rotate([0, 90, 0]) cylinder(d = sensor_d + 0.3, h = wall + 2);
    // Two holes for a cable tie: strain relief for the sensor's cable.
    for (y = [-4, 4]) translate([base_l - 7, y, -1]) cylinder(d = 4, h = wall + 2);
}
