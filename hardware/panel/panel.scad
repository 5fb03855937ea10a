// Front panel and gland wall, seen from outside; lengths in mm, origin at the lower left corner of each face.
//   part "front", "wall": outline and cut-outs alone, 1:1, for SVG or DXF
//   part "drawing": both faces with measures and a table of holes
part = "drawing";
$fn = 48;

// Faces of the enclosure; measure yours.
front_w = 160;
front_h = 100;
wall_w = 160;
wall_h = 60;
edge = 12;               // kept free along every edge: gasket, lid screws, corner radii

// Display window: a little larger than the active area of a 2.42 inch 128 x 64 display (55.0 x 27.5 mm, from memory).
window = [62, 64, 58, 31];   // centre x, y, width, height
pane_lap = 6;                // the pane behind overlaps the cut-out by this much, with its gasket

// Round holes: name, x, y, diameter.
front_holes = [
    ["lamp over, red",      128, 82,  8.2],
    ["lamp right, green",   128, 65,  8.2],
    ["lamp under, amber",   128, 48,  8.2],
    ["knob left, material",  32, 26,  7.2],
    ["knob right, diameter", 92, 26,  7.2],
    ["buzzer, sealed",      128, 26, 12.2],
];
wall_holes = [
    ["gland M12, sensor",    35, 28, 12.5],
    ["gland M16, supply",    80, 28, 16.5],
    ["gland M12, relay",    125, 28, 12.5],
];
knob_d = 26;             // outer diameter of the knobs
gland_d = 24;            // across the corners of a gland's nut

module keep(ok, words) { assert(ok, words); }
for (h = front_holes) keep(h[1] >= edge && h[1] <= front_w - edge && h[2] >= edge && h[2] <= front_h - edge, str(h[0], ": too near the edge"));
for (h = wall_holes) keep(h[1] - gland_d / 2 >= edge && h[1] + gland_d / 2 <= wall_w - edge, str(h[0], ": too near the edge"));
for (i = [0 : len(wall_holes) - 2]) keep(wall_holes[i + 1][1] - wall_holes[i][1] >= gland_d + 4, "glands: nuts would touch");
keep(window[1] - window[3] / 2 - pane_lap >= front_holes[3][2] + knob_d / 2 + 2, "window: the pane meets the knobs");
keep(window[0] + window[2] / 2 + pane_lap <= front_holes[0][1] - 12, "window: the pane meets the lamps");
keep(front_holes[4][1] - front_holes[3][1] >= knob_d + 30, "knobs: no room for gloved fingers between them");

module face(w, h, r = 4) { offset(r) offset(-r) square([w, h]); }
module holes(list) { for (h = list) translate([h[1], h[2]]) circle(d = h[3]); }
module opening(grow = 0) { translate([window[0], window[1]]) offset(2) square([window[2] - 4 + 2 * grow, window[3] - 4 + 2 * grow], center = true); }
module front() { difference() { face(front_w, front_h); opening(); holes(front_holes); } }
module wall() { difference() { face(wall_w, wall_h); holes(wall_holes); } }

// Drawing: everything is a thin filled shape.
line = 0.35;
module stroke() { difference() { children(); offset(-line) children(); } }
module seg(a, b) { hull() { translate(a) circle(d = line, $fn = 6); translate(b) circle(d = line, $fn = 6); } }
module words(x, y, t, size = 3.2, align = "left") { translate([x, y]) text(t, size = size, font = "DejaVu Sans", halign = align, valign = "center", $fn = 6); }
module arrow(p, angle) { translate(p) rotate(angle) polygon([[0, 0], [2.4, 0.6], [2.4, -0.6]]); }
module across(x1, x2, y, from_y) {
    for (x = [x1, x2]) seg([x, from_y], [x, y - 1]);
    seg([x1, y], [x2, y]);
    arrow([x1, y], 0);
    arrow([x2, y], 180);
    words((x1 + x2) / 2, y + 2.6, str(x2 - x1), align = "center");
}
module up(y1, y2, x, from_x) {
    for (y = [y1, y2]) seg([from_x, y], [x - 1, y]);
    seg([x, y1], [x, y2]);
    arrow([x, y1], 90);
    arrow([x, y2], -90);
    translate([x - 2.6, (y1 + y2) / 2]) rotate(90) text(str(y2 - y1), size = 3.2, font = "DejaVu Sans", halign = "center", valign = "center", $fn = 6);
}
module marks(list, first) {
    for (i = [0 : len(list) - 1]) {
        h = list[i];
        translate([h[1], h[2]]) stroke() circle(d = h[3]);
        seg([h[1] - h[3] / 2 - 2, h[2]], [h[1] + h[3] / 2 + 2, h[2]]);
        seg([h[1], h[2] - h[3] / 2 - 2], [h[1], h[2] + h[3] / 2 + 2]);
        words(h[1] + h[3] / 2 + 2.5, h[2] + 3, chr(first + i), 3.6);
    }
}
module table(x, y, list, first) {
    words(x, y, "hole"); words(x + 14, y, "x"); words(x + 30, y, "y"); words(x + 44, y, "dia."); words(x + 60, y, "for");
    seg([x, y - 3], [x + 112, y - 3]);
    for (i = [0 : len(list) - 1]) {
        row = y - 7 - 6 * i;
        h = list[i];
        words(x, row, chr(first + i)); words(x + 14, row, str(h[1])); words(x + 30, row, str(h[2]));
        words(x + 44, row, str(h[3])); words(x + 60, row, h[0]);
    }
}
module dashed_circle(p, d) { translate(p) for (a = [0 : 20 : 340]) rotate(a) intersection() { stroke() circle(d = d); polygon([[0, 0], [d, 0], [d * cos(10), d * sin(10)]]); } }

module drawing() {
    words(0, front_h + 22, "Front, seen from outside; mm", 4.5);
    stroke() face(front_w, front_h);
    stroke() opening();
    words(window[0], window[1] + 4, str("window ", window[2], " x ", window[3]), align = "center");
    words(window[0], window[1] - 4, str("centre ", window[0], ", ", window[1]), align = "center");
    marks(front_holes, 65);
    for (i = [3, 4]) dashed_circle([front_holes[i][1], front_holes[i][2]], knob_d);
    across(0, front_w, front_h + 10, front_h + 1);
    across(0, front_holes[3][1], -10, -1);
    across(front_holes[3][1], front_holes[4][1], -10, -1);
    across(front_holes[4][1], front_holes[0][1], -10, -1);
    up(0, front_h, -18, -1);
    up(0, front_holes[3][2], -8, -1);
    up(front_holes[3][2], window[1], -8, -1);
    table(front_w + 14, front_h - 4, front_holes, 65);
    words(front_w + 14, front_h - 58, "Dashed: knobs. Check each hole against the part");
    words(front_w + 14, front_h - 64, "in hand before drilling.");
}
module gland_drawing() {
    words(0, wall_h + 12, "Gland wall (bottom), seen from outside; mm", 4.5);
    stroke() face(wall_w, wall_h);
    marks(wall_holes, 71);
    across(0, wall_holes[0][1], -10, -1);
    across(wall_holes[0][1], wall_holes[1][1], -10, -1);
    across(wall_holes[1][1], wall_holes[2][1], -10, -1);
    up(0, wall_h, -18, -1);
    up(0, wall_holes[0][2], -8, -1);
    table(wall_w + 14, wall_h - 4, wall_holes, 71);
}

if (part == "front") front();
else if (part == "wall") wall();
else if (part == "drawing") { drawing(); translate([0, -115]) gland_drawing(); }
else assert(false, str("part: unknown name ", part));
