// Measures of the collar, the magnets, the bracket and the cover. Lengths in mm, densities in kg/m3, speeds in rev/min.
// The one source of these numbers: OpenSCAD includes this file, magnets.py reads the same lines.
// Keep one plain number a line.

// The machine
spindle_d = 50;            // where the collar clamps, measured with callipers
top_speed = 3000;          // fastest speed the machine can reach
proof_speed = 6000;        // speed at which every factor in numbers.md must still hold

// Magnets: the same pole outward in every pocket
magnets = 2;               // 1 to 8; 5 and 7 only on larger spindles, where no pocket meets the split
magnet_d = 10;
magnet_t = 5;
magnet_density = 7500;     // sintered NdFeB, from memory
magnet_br = 1.2;           // remanence in tesla of a middling grade, from memory
balance_density = 8500;    // brass slug opposite a single magnet, from memory

// Collar
ring = 15;                 // thickness of the ring from bore to outside
floor_t = 2.5;             // what stays between a magnet and the outside
fit = 0.2;                 // on the diameter of pockets and plugs
split = 1.0;               // gap between the halves before clamping
collar_density = 1270;     // PETG, from memory
collar_strength = 20;      // MPa in the plane of a printed layer, half of the usual figure; from memory

// Clamp screws: M4 cylinder head with hexagon socket, self-locking nut
screw_rows = 2;            // 2: beside the magnets on either side; 1: one side only
screw_d = 4;
screw_washer_d = 8;        // narrow washer under the head
screw_hole_d = 4.5;
nut_flats = 7;
screw_seat = 8;            // from the split plane to the face under the head
screw_band = 12;           // width of collar that a row of screws takes
screw_force = 400;         // N in each screw; limited by what the plastic bears under washer and nut

// Sensor with threaded barrel, bracket, cover
sensor_d = 12;
sensor_gap = 3;            // from the collar to the sensor's face
sensor_depth = 1.5;        // from the sensor's face to the element inside
axis_height = 60;          // from the mounting face to the spindle's axis
cover_gap = 5;             // between collar and cover
cover_from = -25;          // degrees from the sensor; the cover is open below so that chips fall out
cover_to = 135;
