//! Rows that a source states for another operation than turning; they override the factors.

use super::source::{
    ARMY, CARVILL_187, DATA_BOOK_9_1, DATA_BOOK_9_9, DATA_BOOK_HARD, EL_HOFY, KALPAKJIAN, NAVY,
    SFPM, Source,
};
use super::{Material, Operation, Row, Tool, ft, m};
use crate::units::SurfaceSpeed;

const fn row(
    operation: Operation,
    material: Material,
    tool: Tool,
    range: (SurfaceSpeed, SurfaceSpeed),
    ours: f32,
    why: &'static str,
    source: Source,
) -> Row {
    Row {
        material,
        tool,
        operation,
        range,
        ours: SurfaceSpeed::of_table_m_min(ours),
        why,
        source,
    }
}

const fn drill(
    material: Material,
    range: (SurfaceSpeed, SurfaceSpeed),
    ours: f32,
    why: &'static str,
    source: Source,
) -> Row {
    row(
        Operation::Drilling,
        material,
        Tool::Hss,
        range,
        ours,
        why,
        source,
    )
}

const fn thread(
    material: Material,
    range: (SurfaceSpeed, SurfaceSpeed),
    ours: f32,
    why: &'static str,
) -> Row {
    row(
        Operation::Threading,
        material,
        Tool::Hss,
        range,
        ours,
        why,
        ARMY,
    )
}

const fn mill(
    material: Material,
    tool: Tool,
    range: (SurfaceSpeed, SurfaceSpeed),
    ours: f32,
    why: &'static str,
    source: Source,
) -> Row {
    row(Operation::Milling, material, tool, range, ours, why, source)
}

/// Finish turning where the ratio to the rough row is published for the very steel.
pub(super) const FINISHING: &[Row] = &[row(
    Operation::FinishTurning,
    Material::FreeMachiningSteel,
    Tool::Hss,
    ft(295.0, 295.0),
    54.5,
    "1213, 1215, 100-150 HB, 0.04 in, 0.008 in/rev; 0.6 of it, as the rough row sits on the leaded grades",
    DATA_BOOK_9_1,
)];

/// Twist drills.
pub(super) const DRILLING: &[Row] = &[
    drill(
        Material::MildSteel,
        ft(80.0, 110.0),
        21.3,
        "low carbon steel; 0.87 of the bottom, because another handbook table says 70 at 175-225 HB",
        NAVY,
    ),
    drill(
        Material::HighCarbonSteel,
        ft(70.0, 85.0),
        16.0,
        "125-225 HB; 0.75 of the bottom, normal stock is harder",
        SFPM,
    ),
    drill(
        Material::LowAlloySteel,
        ft(50.0, 70.0),
        16.0,
        "alloy steel; near the bottom",
        NAVY,
    ),
    drill(
        Material::TemperedSteel,
        ft(40.0, 50.0),
        9.5,
        "275-325 HB; 0.78 of the bottom: corners of plain high-speed steel soften fast",
        SFPM,
    ),
    drill(
        Material::HardSteel,
        ft(25.0, 35.0),
        6.5,
        "325-425 HB; below the bottom: better with cobalt",
        SFPM,
    ),
    drill(
        Material::ToolSteel,
        m(15.0, 15.0),
        9.5,
        "241 HB; 0.63 of it, because the high-chromium grades want less",
        EL_HOFY,
    ),
    drill(
        Material::StainlessAustenitic,
        ft(30.0, 40.0),
        10.0,
        "stainless steel; near the bottom, fast enough not to rub",
        NAVY,
    ),
    drill(
        Material::StainlessFerritic,
        ft(30.0, 40.0),
        11.0,
        "stainless steel; in the middle",
        NAVY,
    ),
    drill(
        Material::GreyCastIron,
        ft(70.0, 150.0),
        18.0,
        "cast iron; 0.84 of the bottom, hard skin and corners",
        NAVY,
    ),
    drill(
        Material::Aluminium,
        m(30.0, 120.0),
        60.0,
        "aluminium alloys; in the lower half",
        KALPAKJIAN,
    ),
    drill(
        Material::FreeCuttingBrass,
        m(15.0, 60.0),
        45.0,
        "copper alloys; the easiest of them",
        KALPAKJIAN,
    ),
    drill(
        Material::Brass,
        m(15.0, 60.0),
        30.0,
        "copper alloys; in the lower half",
        KALPAKJIAN,
    ),
    drill(
        Material::Bronze,
        ft(200.0, 300.0),
        40.0,
        "bronze; 0.66 of the bottom, because another table says 15-60 m/min for copper alloys",
        NAVY,
    ),
    drill(
        Material::Copper,
        m(15.0, 60.0),
        18.0,
        "copper alloys; near the bottom, copper grabs",
        KALPAKJIAN,
    ),
    drill(
        Material::Magnesium,
        m(43.0, 118.0),
        50.0,
        "magnesium alloys; near the bottom, cool chips",
        KALPAKJIAN,
    ),
    drill(
        Material::ZincAlloy,
        m(76.0, 76.0),
        50.0,
        "80-100 HB; 0.66 of it",
        EL_HOFY,
    ),
    drill(
        Material::Thermoset,
        m(20.0, 59.0),
        25.0,
        "near the bottom, fillers wear the corners",
        KALPAKJIAN,
    ),
    drill(
        Material::Thermoplastic,
        m(31.0, 59.0),
        35.0,
        "near the bottom, so that it does not melt",
        KALPAKJIAN,
    ),
    drill(
        Material::NickelCopper,
        ft(40.0, 50.0),
        12.5,
        "monel; at the bottom",
        NAVY,
    ),
    drill(
        Material::TitaniumPure,
        m(30.0, 30.0),
        18.5,
        "110-200 HB; 0.62 of it, chips burn",
        EL_HOFY,
    ),
    drill(
        Material::TitaniumAlloy,
        m(6.0, 20.0),
        6.5,
        "titanium alloys; at the bottom, so that cobalt drills suit beta alloys as well (7.6, El-Hofy)",
        KALPAKJIAN,
    ),
];

/// A single point, half-nut closed.
pub(super) const THREADING: &[Row] = &[
    thread(
        Material::MildSteel,
        ft(35.0, 40.0),
        11.0,
        "low carbon steel; at the bottom",
    ),
    thread(
        Material::HighCarbonSteel,
        ft(15.0, 20.0),
        5.5,
        "high carbon steel; in the middle",
    ),
    thread(
        Material::StainlessAustenitic,
        ft(15.0, 20.0),
        5.0,
        "stainless steel; in the lower half",
    ),
    thread(
        Material::StainlessFerritic,
        ft(15.0, 20.0),
        5.0,
        "stainless steel; in the lower half",
    ),
    thread(
        Material::GreyCastIron,
        ft(20.0, 25.0),
        6.5,
        "cast iron; in the lower half",
    ),
    thread(
        Material::Aluminium,
        ft(50.0, 60.0),
        16.0,
        "aluminium and alloys; in the lower half",
    ),
    thread(
        Material::FreeCuttingBrass,
        ft(40.0, 50.0),
        13.0,
        "ordinary brass and bronze; in the lower half",
    ),
    thread(
        Material::Brass,
        ft(40.0, 50.0),
        13.0,
        "ordinary brass and bronze; in the lower half",
    ),
    thread(
        Material::Bronze,
        ft(40.0, 50.0),
        13.0,
        "ordinary brass and bronze; in the lower half",
    ),
    thread(
        Material::ToughBronze,
        ft(20.0, 25.0),
        6.5,
        "high-tensile bronze; in the lower half",
    ),
    thread(Material::Copper, ft(20.0, 25.0), 6.5, "in the lower half"),
];

/// A cutter in the spindle. Carbide: the tough grade (P40), since small machines shake.
pub(super) const MILLING: &[Row] = &[
    mill(
        Material::MildSteel,
        Tool::Hss,
        m(28.0, 28.0),
        27.4,
        "low carbon steel; as for turning. The Data Book's 160 ft/min for heavy face milling is for stiffer machines",
        CARVILL_187,
    ),
    mill(
        Material::FreeMachiningSteel,
        Tool::Hss,
        ft(130.0, 140.0),
        39.0,
        "100-200 HB; just below the bottom, the leaded grades' figure",
        SFPM,
    ),
    mill(
        Material::MediumCarbonSteel,
        Tool::Hss,
        ft(115.0, 125.0),
        24.5,
        "125-225 HB, face milling, 0.15-0.3 in; 0.7 of the bottom, as for turning: cutters cost more than edges",
        DATA_BOOK_9_9,
    ),
    mill(
        Material::TemperedSteel,
        Tool::CobaltHss,
        ft(90.0, 90.0),
        17.0,
        "275-325 HB, face milling, 0.15 in, T15 or M42; 0.62 of it, cutters cost more than edges",
        DATA_BOOK_HARD,
    ),
    mill(
        Material::HardSteel,
        Tool::Hss,
        ft(25.0, 35.0),
        7.5,
        "325-425 HB; just below the bottom",
        SFPM,
    ),
    mill(
        Material::HardSteel,
        Tool::CobaltHss,
        ft(60.0, 60.0),
        11.5,
        "325-375 HB, face milling, 0.15 in, T15 or M42; 0.63 of it, since ours goes up to 425 HB",
        DATA_BOOK_HARD,
    ),
    mill(
        Material::GreyCastIron,
        Tool::Hss,
        m(20.0, 20.0),
        18.0,
        "cast iron; 0.9 of it",
        CARVILL_187,
    ),
    mill(
        Material::Brass,
        Tool::Hss,
        m(45.0, 45.0),
        40.0,
        "hard brass; 0.9 of it",
        CARVILL_187,
    ),
    mill(
        Material::Copper,
        Tool::Hss,
        m(60.0, 60.0),
        38.0,
        "0.63 of it, because the turning figure is so much lower",
        CARVILL_187,
    ),
    mill(
        Material::MildSteel,
        Tool::Carbide,
        m(100.0, 130.0),
        80.0,
        "P40, 0.2 mm per tooth; 0.8 of the brazed figure",
        CARVILL_187,
    ),
    mill(
        Material::HighCarbonSteel,
        Tool::Carbide,
        m(75.0, 75.0),
        50.0,
        "0.7 % carbon, P40, 0.2 mm per tooth; 0.67 of it, near the turning figure",
        CARVILL_187,
    ),
    mill(
        Material::StainlessAustenitic,
        Tool::Carbide,
        m(100.0, 115.0),
        70.0,
        "stainless steel, P40, 0.2 mm per tooth; 0.7 of the brazed figure, the turning figures are lower",
        CARVILL_187,
    ),
    mill(
        Material::StainlessFerritic,
        Tool::Carbide,
        m(100.0, 115.0),
        70.0,
        "stainless steel, P40, 0.2 mm per tooth; 0.7 of the brazed figure, the turning figures are lower",
        CARVILL_187,
    ),
    mill(
        Material::StainlessFreeMachining,
        Tool::Carbide,
        m(100.0, 115.0),
        75.0,
        "stainless steel, P40, 0.2 mm per tooth; 0.75 of the brazed figure, the turning figures are lower",
        CARVILL_187,
    ),
    mill(
        Material::GreyCastIron,
        Tool::Carbide,
        m(110.0, 110.0),
        70.0,
        "P40, 0.2 mm per tooth; 0.64 of it, the turning figure is lower",
        CARVILL_187,
    ),
    mill(
        Material::Aluminium,
        Tool::Carbide,
        m(600.0, 600.0),
        370.0,
        "K20, 0.2 mm per tooth; 0.62 of it, most machines stop long before",
        CARVILL_187,
    ),
];
