//! The laws of core's physics against published worked examples, published constants and the same laws in f64.
//!
//! `data/physics-examples.csv` has every worked example on time, removal, power, drilling, life, finish, bars and slip that
//! was collected: the law that it tries, its numbers, the printed answer and how close we must come. A row whose law is
//! `none` says why no law of ours covers it.

use std::collections::BTreeMap;
use std::f64::consts::PI;

use rimrate_core::physics::*;
use rimrate_core::trade::{IsoGroup, Material, Tool, edge, stock};

mod data {
    pub(crate) fn rows(name: &str) -> Vec<std::collections::BTreeMap<String, String>> {
        let path = format!("{}/data/{name}", env!("CARGO_MANIFEST_DIR"));
        let mut reader = csv::Reader::from_path(path).expect("the data file is there");
        reader
            .deserialize()
            .collect::<Result<_, _>>()
            .expect("the data file is sound")
    }
}

const MM: f32 = 25.4;
/// A mechanical horsepower, kW (550 ft lbf/s).
const HP: f32 = 0.745_7;

fn law(name: &str, of: &dyn Fn(&str) -> f32) -> f32 {
    let kgf = 9.806_65;
    let milling = |scale: f32| {
        let v_f = of("f_z") * scale * of("z") * of("n");
        removal_rate::milling(of("a_e") * scale, of("a_p") * scale, v_f)
    };
    let cantilever_to_clamped = [
        whirl::CLAMPED_FREE,
        whirl::CLAMPED_PINNED,
        whirl::CLAMPED_CLAMPED,
    ];
    let beta = || cantilever_to_clamped[of("support") as usize];
    let rpm = |d: f32| 1000.0 * of("v") / (std::f32::consts::PI * d);
    let drill = || removal_rate::drilling(of("d"), of("f"), of("n"));
    // Speed at a diameter, from the table feed: v a_p f with f = v_f / n, so n falls out.
    let turned = |scale: f32| {
        std::f32::consts::PI * of("d") * scale * of("a_p") * scale * of("v_f") * scale / 1000.0
    };
    match name {
        "life_at_speed" => tool_life::life_at_speed(of("v1"), of("t1"), of("v2"), of("n")),
        "speed_for_life" => tool_life::speed_for_life(of("v1"), of("t1"), of("t2"), of("n")),
        "exponent" => tool_life::exponent(of("v1"), of("t1"), of("v2"), of("t2")),
        "constant" => tool_life::constant(of("v"), of("t"), of("n")),
        "life_multiple" => tool_life::life_at_speed(1.0, 1.0, of("ratio"), of("n")),
        "economic_speed" => {
            let life = tool_life::economic_life(of("n"), of("change"), of("edge_cost"));
            tool_life::speed_for_life(of("c"), 1.0, life, of("n"))
        }
        "specific_of_force" => {
            // Back from a force to the constant at h = 1, and again to the thickness asked for.
            let k = cutting_force::Kienzle {
                kc11: of("force") / (of("b") * of("h")),
                mc: 0.0,
            };
            k.force(of("b"), of("h"), 1.0) / (of("b") * of("h"))
        }
        "power_of_force_at" => {
            let n = of("n");
            let by_torque = power::of_torque(power::torque(of("force"), of("d")), n);
            let by_speed =
                power::of_force(of("force"), std::f32::consts::PI * of("d") * n / 1000.0);
            assert!(
                (by_torque / by_speed - 1.0).abs() < 1e-5,
                "both ways to the power"
            );
            by_torque
        }
        "energy_of_force" => {
            // Power over removal, at any speed.
            let q = removal_rate::turning(10.0, of("a_p"), of("f"));
            power::of_force(of("force"), 10.0) / power::of_removal(1.0, q)
        }
        "mill_removal_cm" => milling(10.0),
        "mill_removal_mm3" => removal_rate::milling(of("a_e"), of("a_p"), of("v_f")) * 1000.0,
        "mill_removal_inch" => milling(MM) / (MM / 10.0).powi(3),
        "mill_power_inch_hp" => {
            // hp min/in3 as W s/mm3.
            let u = of("hp") * HP * 1000.0 * 60.0 / MM.powi(3);
            power::of_removal(u, milling(MM)) / HP
        }
        "mill_power_energy_w" => {
            1000.0
                * power::of_removal(
                    of("u"),
                    removal_rate::milling(of("a_e"), of("a_p"), of("v_f")),
                )
        }
        "mill_power_energy_kw" => power::of_removal(
            of("u"),
            removal_rate::milling(of("a_e"), of("a_p"), of("v_f")),
        ),
        "torque_hp_lbf_ft" => power::torque_of(of("hp") * HP, of("n")) / (4.448_222 * 0.304_8),
        "drill_torque_hardness" => {
            drilling::torque_by_hardness(of("hb"), of("d"), of("f")) / kgf * 1000.0
        }
        "drill_thrust" => drilling::thrust(of("k"), of("d"), of("f")) / kgf,
        "drill_removal_mm3_s" => drill() * 1000.0 / 60.0,
        "drill_power_energy" => 1000.0 * power::of_removal(of("u"), drill()),
        "drill_torque_energy" => power::torque_of(power::of_removal(of("u"), drill()), of("n")),
        "turn_time" => machining_time::of_pass(of("l"), of("f"), rpm(of("d"))),
        "turn_time_two" => {
            machining_time::of_pass(of("l1"), of("f"), rpm(of("d1")))
                + machining_time::of_pass(of("l2"), of("f"), rpm(of("d2")))
        }
        // The example counts the point twice, once before the work and once behind it.
        "drill_time" => {
            let travel = of("l") + 2.0 * machining_time::drill_point(of("d"));
            machining_time::of_pass(travel, of("f"), rpm(of("d")))
        }
        "thread_time" => of("passes") * machining_time::of_pass(of("l"), of("lead"), rpm(of("d"))),
        "feed_time" => machining_time::of_pass(of("l"), of("v_f") / of("n"), of("n")),
        "slab_time_s" => {
            let travel = of("l") + machining_time::slab_approach(of("d"), of("a_p"));
            60.0 * machining_time::of_pass(travel, of("f_z") * of("z"), of("n"))
        }
        "face_time" => {
            let travel = of("l") + 2.0 * machining_time::face_approach(of("d"));
            machining_time::of_pass(travel, of("v_f"), 1.0)
        }
        "turn_removal_inch" => turned(MM) / (MM / 10.0).powi(3),
        "turn_removal_mm3" => turned(1.0) * 1000.0,
        "turn_removal_v_mm3_s" => {
            removal_rate::turning(of("v"), of("a_p"), of("f")) * 1000.0 / 60.0
        }
        "turn_power_inch_hp" => power::of_removal(of("u"), turned(MM)) / HP,
        "turn_power_w" => 1000.0 * power::of_removal(of("u"), turned(1.0)),
        "energy_power_shaping" => {
            // U = u t^-exponent is Kienzle's law with another name.
            let k = cutting_force::Kienzle {
                kc11: of("u") * 1000.0,
                mc: of("exponent"),
            };
            1000.0 * power::of_force(k.force(of("d"), of("f"), of("cos")), of("mm_min") / 1000.0)
        }
        "rt" => roughness::rt(of("f"), of("r")),
        "rt_sharp" => roughness::rt_sharp(of("f"), of("tan"), of("cot")),
        "rt_slab_feed" => roughness::rt_slab(of("v_f") / (of("n") * of("z")), of("d")),
        "ra_coefficient" => roughness::ra(1.0, 1.0),
        "slip" => slip::slip(of("n_s"), of("n")).unwrap(),
        // The laws are straight lines: from what one rev/min makes to the speed of a slip, or of a load.
        "speed_of_slip" => of("n_s") - of("slip") / slip::slip(of("n_s"), of("n_s") - 1.0).unwrap(),
        "speed_of_load" => {
            let rated = slip::slip(of("n_s"), of("n_rated")).unwrap();
            of("n_s") - of("load") / slip::load(of("n_s"), of("n_s") - 1.0, rated, 0.0).unwrap()
        }
        "power_of_load_w" => {
            let rated = slip::rated(of("n_rated")).unwrap();
            let load = slip::load(of("n_s"), of("n"), rated, 0.0).unwrap();
            let torque = load * power::torque_of(of("kw"), of("n_rated"));
            1000.0 * power::of_torque(torque, of("n"))
        }
        "beta" => beta(),
        "beta_squared" => beta() * beta(),
        // omega = C sqrt(E I / (w L^4)), w the weight of a length: sqrt(g) is in C, g = 32.2 ft/s2.
        "hicks" => {
            let bar = whirl::Bar {
                length: 1000.0,
                diameter: 40.0,
                bore: 0.0,
                e_gpa: 200.0,
                rho: 7850.0,
            };
            let ei_over_ra = (200e9_f32 / 7850.0).sqrt() * 0.04 / 4.0;
            2.0 * std::f32::consts::PI * whirl::first_hz(&bar, beta()) / ei_over_ra
                * 32.2_f32.sqrt()
        }
        other => panic!("no law {other}"),
    }
}

#[test]
fn worked_examples_come_out_as_printed() {
    let (mut tried, mut left) = (0, 0);
    for row in data::rows("physics-examples.csv") {
        let (id, name) = (&row["id"], row["law"].as_str());
        if name == "none" {
            assert!(row["note"].len() > 30, "{id} says why no law covers it");
            left += 1;
            continue;
        }
        let arguments: BTreeMap<&str, f32> = row["arguments"]
            .split(';')
            .filter_map(|a| a.split_once('='))
            .map(|(k, v)| (k, v.parse().unwrap_or_else(|e| panic!("{id}: {v}: {e}"))))
            .collect();
        let got = law(name, &|k| {
            *arguments.get(k).unwrap_or_else(|| panic!("{id}: no {k}"))
        });
        let printed: f32 = row["printed"].parse().expect("a number");
        let tolerance: f32 = row["tolerance_percent"].parse().expect("a number");
        let off = (got / printed - 1.0).abs() * 100.0;
        assert!(
            off <= tolerance,
            "{id} {name}: {got} against printed {printed}: {off:.3} %, allowed {tolerance} %"
        );
        assert!(
            tolerance <= 0.6 || !row["note"].is_empty(),
            "{id}: a wide tolerance says why"
        );
        tried += 1;
    }
    // Nothing may drop out silently: the collection has 83 rows less its header.
    assert_eq!((tried, left), (59, 23));
}

/// Steels, hardness for hardness, and the rest, at the thickness for which each source speaks; sharp edges.
/// (row, our material, thickness mm, what to say where they lie more than 30 % apart)
const FORCE_PAIRS: &[(&str, Material, f32, &str)] = &[
    // Machinery's Handbook, power constants Kp, kW per cm3/s at 0.012 in (0.3 mm), where their feed factor is 1.
    ("PV0290", Material::MildSteel, 0.3, ""),
    ("PV0294", Material::MediumCarbonSteel, 0.3, ""),
    ("PV0296", Material::HighCarbonSteel, 0.3, ""),
    ("PV0300", Material::TemperedSteel, 0.3, ""),
    ("PV0304", Material::HardSteel, 0.3, ""),
    (
        "PV0306",
        Material::FreeMachiningSteel,
        0.3,
        "the groups do not tell free-machining steel from mild steel; ours asks for more power, never less",
    ),
    ("PV0308", Material::FreeMachiningSteel, 0.3, "as PV0306"),
    ("PV0310", Material::ResulphurisedSteel, 0.3, ""),
    ("PV0312", Material::ResulphurisedSteel, 0.3, ""),
    ("PV0316", Material::LowAlloySteel, 0.3, ""),
    ("PV0318", Material::LowAlloySteel, 0.3, ""),
    ("PV0320", Material::TemperedSteel, 0.3, ""),
    ("PV0322", Material::HardSteel, 0.3, ""),
    ("PV0326", Material::LowAlloySteel, 0.3, ""),
    ("PV0328", Material::TemperedSteel, 0.3, ""),
    // Groover, unit power at 0.25 mm (from memory).
    ("PV0278", Material::MediumCarbonSteel, 0.25, ""),
    ("PV0279", Material::TemperedSteel, 0.25, ""),
    ("PV0280", Material::LowAlloySteel, 0.25, ""),
    (
        "PV0281",
        Material::HardSteel,
        0.25,
        "from memory, and a quarter above the handbook's Kp for the same hardness, which was read; our worn-edge factor of 1.3 reaches it",
    ),
    (
        "PV0282",
        Material::GreyCastIron,
        0.25,
        "softer iron than ours of 160 HB and more; ours asks for more power",
    ),
    ("PV0283", Material::StainlessAustenitic, 0.25, ""),
    (
        "PV0284",
        Material::Aluminium,
        0.25,
        "soft alloys of 50 HB; ours are the cured alloys of 100 HB and ask for more power",
    ),
    ("PV0285", Material::Brass, 0.25, ""),
    ("PV0286", Material::Bronze, 0.25, ""),
    // Carvill, turning constant k, N/mm2, without a thickness: taken at 0.3 mm.
    (
        "PV0329",
        Material::Aluminium,
        0.3,
        "k knows no thickness of chip, and lies below every other source; ours asks for more power",
    ),
    ("PV0332", Material::GreyCastIron, 0.3, "as PV0329"),
    ("PV0335", Material::MildSteel, 0.3, "as PV0329"),
    // Kienzle's and Victor's own constants (from memory), each with its exponent in the next row.
    ("PV0338", Material::MediumCarbonSteel, 0.3, ""),
    (
        "PV0340",
        Material::HighCarbonSteel,
        0.3,
        "by a hair: 30.02 %; tests with little rake, and our worn-edge factor covers it",
    ),
    ("PV0342", Material::MediumCarbonSteel, 0.3, ""),
    ("PV0344", Material::LowAlloySteel, 0.3, ""),
    ("PV0346", Material::LowAlloySteel, 0.3, ""),
    (
        "PV0348",
        Material::LowAlloySteel,
        0.3,
        "heat-treated steel in tests with little rake; our worn-edge factor of 1.3 covers most of it",
    ),
    ("PV0350", Material::LowAlloySteel, 0.3, ""),
];

#[test]
fn force_constants_of_several_sources_agree_within_30_percent_or_say_why() {
    let rows: BTreeMap<String, BTreeMap<String, String>> = data::rows("force-constants.csv")
        .into_iter()
        .map(|r| (r["id"].clone(), r))
        .collect();
    let value = |id: &str| -> f32 { rows[id]["value"].parse().expect("a number") };
    for &(id, material, h, exception) in FORCE_PAIRS {
        let row = &rows[id];
        let theirs = match row["kind"].as_str() {
            "power_constant_Kp" => {
                assert_eq!(row["unit"], "kW/(cm3/s)");
                1000.0 * value(id)
            }
            "specific_energy" => 1000.0 * value(id),
            "specific_cutting_force_k" => value(id),
            "kienzle_kc11" => {
                let next = format!("PV{:04}", id[2..].parse::<u32>().expect("a number") + 1);
                assert_eq!(rows[&next]["kind"], "kienzle_mc");
                assert_eq!(rows[&next]["work"], row["work"]);
                value(id) * h.powf(-value(&next))
            }
            kind => panic!("{id}: {kind}"),
        };
        let ours = stock::force(material).expect("covered").kienzle.specific(h);
        let apart = ours / theirs - 1.0;
        assert_eq!(
            apart.abs() > 0.30,
            !exception.is_empty(),
            "{id} {material}: ours {ours:.0}, theirs {theirs:.0}, {:.1} %",
            apart * 100.0
        );
        // Where ours is the lower one, a worn edge of high-speed steel still covers the published figure.
        let covered = ours * cutting_force::WORN_EDGE * cutting_force::HIGH_SPEED_STEEL;
        assert!(
            covered >= theirs,
            "{id} {material}: {covered:.0} against {theirs:.0}"
        );
    }
    // Both unit systems of the handbook's table say the same: 1 hp/(in3/min) is 2.7303 kW/(cm3/s).
    let mut pairs = 0;
    for (id, row) in rows.iter().filter(|(_, r)| r["unit"] == "hp/(in3/min)") {
        let metric = format!("PV{:04}", id[2..].parse::<u32>().expect("a number") + 1);
        let factor = HP * 60.0 / (MM / 10.0).powi(3);
        assert!(
            (value(id) * factor / value(&metric) - 1.0).abs() < 0.006,
            "{id}, {}",
            row["work"]
        );
        pairs += 1;
    }
    assert_eq!(pairs, 21);
}

/// Carvill's drill torque, T = kD f^0.75 D^1.8 (formula from memory), with his kD for mild steel.
#[test]
fn drill_torque_agrees_with_the_published_fit_and_covers_it_when_worn() {
    let steel = stock::force(Material::MildSteel).expect("covered").kienzle;
    let factors = cutting_force::WORN_EDGE * cutting_force::HIGH_SPEED_STEEL;
    for (d, f) in [(5.0_f32, 0.1_f32), (10.0, 0.2), (12.5, 0.3), (20.0, 0.3)] {
        let carvill = 0.36 * f.powf(0.75) * d.powf(1.8);
        let ours = steel.drill_torque(d, f);
        assert!(
            (ours / carvill - 1.0).abs() < 0.3,
            "{d} mm, {f} mm: {ours:.2} against {carvill:.2} N m"
        );
        assert!(
            ours * factors > carvill,
            "{d} mm, {f} mm: {ours:.2} against {carvill:.2} N m"
        );
    }
    // Sharma's law with the hardness for the specific force, at his own example.
    let by_hardness = drilling::torque_by_hardness(200.0, 12.7, 0.254);
    assert!((by_hardness / steel.drill_torque(12.7, 0.254) - 1.0).abs() < 0.3);
}

#[test]
fn taylor_exponents_and_elastic_constants_lie_in_the_published_ranges() {
    let rows = data::rows("wear-constants.csv");
    let range = |text: &str| -> (f32, f32) {
        let mut ends = text.split('-').map(|x| x.parse::<f32>().expect("a number"));
        let low = ends.next().expect("one number");
        (low, ends.next().unwrap_or(low))
    };
    let (mut exponents, mut bars) = (0, 0);
    for row in &rows {
        let (low, high) = range(&row["value"]);
        let what = row["conditions"].as_str();
        match row["kind"].as_str() {
            "taylor_n" => {
                let tool = match what {
                    w if w.contains("tool=HSS") => Tool::Hss,
                    w if w.contains("tool=coated") => Tool::CoatedCarbide,
                    w if w.contains("cemented carbide") || w.contains("tool=carbides") => {
                        Tool::Carbide
                    }
                    // Carbon steel, cermet and ceramic are not among our tools.
                    _ => continue,
                };
                let ours = edge::taylor(tool).n;
                assert!(
                    ours.0 <= low && high <= ours.1,
                    "{}: {low} to {high} in {ours:?}",
                    row["id"]
                );
                exponents += 1;
            }
            kind => {
                let of: Vec<Material> = Material::ALL
                    .into_iter()
                    .filter(|m| match what {
                        "aluminum alloys" => *m == Material::Aluminium,
                        "brass" => matches!(m, Material::Brass | Material::FreeCuttingBrass),
                        "bronze" => matches!(m, Material::Bronze | Material::ToughBronze),
                        "copper and alloys" => *m == Material::Copper,
                        "magnesium alloys" => *m == Material::Magnesium,
                        "titanium alloys" => {
                            matches!(m, Material::TitaniumPure | Material::TitaniumAlloy)
                        }
                        "nylon" => *m == Material::Thermoplastic,
                        w if w.starts_with("steel") => m.group() == IsoGroup::P,
                        other => panic!("{other}"),
                    })
                    .collect();
                for m in of {
                    let e = stock::elastic(m);
                    // The end that bends sooner.
                    let (ours, cautious) = if kind == "youngs_modulus" {
                        (e.e_gpa, low)
                    } else {
                        (e.rho, high)
                    };
                    assert_eq!(ours, cautious, "{}: {m}", row["id"]);
                    bars += 1;
                }
            }
        }
    }
    assert!(
        exponents >= 6 && bars >= 28,
        "{exponents} exponents, {bars} constants"
    );
}

/// Numbers spread evenly over the logarithm of a range, the same on every run.
struct Spread(u64);

impl Spread {
    fn next(&mut self, (low, high): (f64, f64)) -> f32 {
        // A linear congruential generator with Knuth's MMIX constants.
        self.0 = self
            .0
            .wrapping_mul(6364136223846793005)
            .wrapping_add(1442695040888963407);
        let u = (self.0 >> 11) as f64 / (1u64 << 53) as f64;
        (low.ln() + u * (high.ln() - low.ln())).exp() as f32
    }
}

/// The worst relative error of a law in f32 against the same law in f64, over its whole input range.
fn worst<const N: usize>(
    ranges: [(f64, f64); N],
    f: impl Fn([f32; N]) -> f32,
    exact: impl Fn([f64; N]) -> f64,
) -> f64 {
    let mut spread = Spread(42);
    let mut worst: f64 = 0.0;
    for _ in 0..20_000 {
        let x = ranges.map(|r| spread.next(r));
        let got = f(x);
        assert!(got.is_finite() && got >= 0.0, "{x:?}: {got}");
        let exact = exact(x.map(f64::from));
        worst = worst.max((f64::from(got) / exact - 1.0).abs());
    }
    worst
}

#[test]
fn f32_is_good_to_a_few_millionths_over_the_whole_input_range() {
    const SPEED: (f64, f64) = (0.5, 2000.0);
    const LIFE: (f64, f64) = (1.0, 1000.0);
    const D: (f64, f64) = (0.1, 2000.0);
    const FEED: (f64, f64) = (0.001, 10.0);
    const DEPTH: (f64, f64) = (0.001, 100.0);
    const N: (f64, f64) = (1.0, 100_000.0);
    let check = |law: &str, error: f64, allowed: f64| {
        println!("{law}: {error:.1e}");
        assert!(error <= allowed, "{law}: {error:e}, allowed {allowed:e}");
    };
    check(
        "speed for life",
        worst(
            [SPEED, LIFE, LIFE, (0.08, 0.6)],
            |[v, a, b, n]| tool_life::speed_for_life(v, a, b, n),
            |[v, a, b, n]| v * (a / b).powf(n),
        ),
        6e-7,
    );
    // 1/n up to 12.5 magnifies the rounding of the ratio.
    check(
        "life at speed",
        worst(
            [(20.0, 200.0), LIFE, (20.0, 200.0), (0.08, 0.6)],
            |[v, t, w, n]| tool_life::life_at_speed(v, t, w, n),
            |[v, t, w, n]| t * (v / w).powf(1.0 / n),
        ),
        5e-6,
    );
    check(
        "Kienzle",
        worst(
            [(300.0, 5000.0), (0.1, 0.4), DEPTH, FEED, (0.5, 1.0)],
            |[kc11, mc, a, f, s]| cutting_force::Kienzle { kc11, mc }.force(a, f, s),
            |[k, m, a, f, s]| k * a / s * (f * s).powf(1.0 - m),
        ),
        1e-6,
    );
    check(
        "drill torque",
        worst(
            [(300.0, 5000.0), (0.1, 0.4), D, FEED],
            |[kc11, mc, d, f]| cutting_force::Kienzle { kc11, mc }.drill_torque(d, f),
            |[k, m, d, f]| {
                k * (f / 2.0 * 59.0_f64.to_radians().sin()).powf(-m) * f * d * d / 8000.0
            },
        ),
        1e-6,
    );
    check(
        "power",
        worst(
            [(0.01, 1e6), SPEED],
            |[f, v]| power::of_force(f, v),
            |[f, v]| f * v / 60_000.0,
        ),
        3e-7,
    );
    check(
        "speed of power",
        worst(
            [(0.01, 100.0), (1e-3, 1e4)],
            |[p, m]| power::speed_of(p, m),
            |[p, m]| 60_000.0 * p / (2.0 * PI * m),
        ),
        5e-7,
    );
    check(
        "Ra",
        worst(
            [FEED, (0.01, 20.0)],
            |[f, r]| roughness::ra(f, r),
            |[f, r]| f * f / (18.0 * 3f64.sqrt() * r),
        ),
        1e-6,
    );
    check(
        "feed for Ra",
        worst(
            [(1e-5, 0.1), (0.01, 20.0)],
            |[ra, r]| roughness::feed_for_ra(ra, r),
            |[ra, r]| (ra * r * 18.0 * 3f64.sqrt()).sqrt(),
        ),
        1e-6,
    );
    check(
        "whirl",
        worst(
            [
                (1.0, 100_000.0),
                D,
                (0.1, 2000.0),
                (2.0, 210.0),
                (1000.0, 9000.0),
            ],
            |[length, diameter, bore, e_gpa, rho]| {
                whirl::first_hz(
                    &whirl::Bar {
                        length,
                        diameter,
                        bore,
                        e_gpa,
                        rho,
                    },
                    whirl::CLAMPED_FREE,
                )
            },
            |[l, d, b, e, rho]| {
                let (l, d, b) = (l / 1000.0, d / 1000.0, b / 1000.0);
                f64::from(whirl::CLAMPED_FREE).powi(2) / (2.0 * PI * l * l)
                    * (e * 1e9 * (d * d + b * b) / 16.0 / rho).sqrt()
            },
        ),
        1e-6,
    );
    check(
        "half-nut",
        worst(
            [(0.1, 100.0), (0.1, 50.0), (0.1, 60.0)],
            |[l, p, t]| threading::half_nut_closed(l, p, t),
            |[l, p, t]| 120.0 * l / (p * t),
        ),
        3e-7,
    );
    check(
        "time",
        worst(
            [(0.1, 10_000.0), FEED, N],
            |[l, f, n]| machining_time::of_pass(l, f, n),
            |[l, f, n]| l / (f * n),
        ),
        3e-7,
    );
    check(
        "grip",
        worst(
            [(2.0, 6.0), (0.01, 50.0), (1.0, 1000.0), N],
            |[j, m, r, n]| workholding::grip_loss(j, m, r, n),
            |[j, m, r, n]| j * m * r / 1000.0 * (2.0 * PI * n / 60.0).powi(2),
        ),
        1e-6,
    );
    check(
        "grip back",
        worst(
            [(2.0, 6.0), (0.01, 50.0), (1.0, 1000.0), (1.0, 1e6)],
            |[j, m, r, f]| workholding::speed_at_loss(j, m, r, f),
            |[j, m, r, f]| (f * 1000.0 / (j * m * r)).sqrt() * 60.0 / (2.0 * PI),
        ),
        1e-6,
    );
    check(
        "chip thinning",
        worst(
            [(0.1, 2000.0), (0.001, 0.5)],
            |[d, s]| chip::thinning(s * d, d),
            |[_, s]| 2.0 * (s * (1.0 - s)).sqrt(),
        ),
        1e-6,
    );
    check(
        "thrust",
        worst(
            [(0.5, 3.0), D, FEED],
            |[k, d, f]| drilling::thrust(k, d, f),
            |[k, d, f]| 1.16 * k * d * (100.0 * f).powf(0.85) * 9.80665,
        ),
        1e-6,
    );
    assert!((f64::from(roughness::RT_PER_RA) - 18.0 * 3f64.sqrt() / 8.0).abs() < 1e-3);
    assert!((f64::from(cutting_force::SIN_KAPPA) - 75f64.to_radians().sin()).abs() < 1e-6);
    assert!(
        (whirl::CLAMPED_PINNED.tan() - whirl::CLAMPED_PINNED.tanh()).abs() < 1e-3,
        "tan x = tanh x"
    );
}

/// The fast approximations of `micromath` are a few percent off in a root, and a power or a logarithm more: not good enough to
/// compute with, and its logarithm not even to place a pointer on the Run page's scale. Core takes `libm` everywhere.
#[test]
fn micromath_is_too_coarse_and_libm_is_not() {
    use micromath::F32Ext;
    let power = |v: f32, n: f32| F32Ext::powf(v, n);
    let speeds = worst(
        [(0.0625, 16.0), (0.08, 0.6)],
        |[v, n]| power(v, n),
        |[v, n]| v.powf(n),
    );
    let lives = worst(
        [(0.25, 4.0), (2.0, 12.5)],
        |[v, n]| power(v, n),
        |[v, n]| v.powf(n),
    );
    let root = worst([(1e-4, 1e4)], |[x]| F32Ext::sqrt(x), |[x]| x.sqrt());
    // The Run page's scale spans two octaves in 128 pixels.
    let pixels = |log2: &dyn Fn(f32) -> f32| {
        let mut spread = Spread(7);
        (0..20_000)
            .map(|_| spread.next((0.5, 2.0)))
            .map(|x| 64.0 * (f64::from(log2(x)) - f64::from(x).log2()).abs())
            .fold(0.0, f64::max)
    };
    let (coarse, fine) = (pixels(&|x| F32Ext::log2(x)), pixels(&|x| libm::log2f(x)));
    println!(
        "micromath: powf {:.1} % in speeds, {:.0} % in lives; sqrt {:.1} %; pointer {coarse:.1} pixels, libm's {fine:.1e}",
        speeds * 100.0,
        lives * 100.0,
        root * 100.0
    );
    assert!(
        speeds > 0.05 && lives > 0.5 && root > 0.02 && coarse > 2.0,
        "it has become better"
    );
    assert!(fine < 0.01);
}
