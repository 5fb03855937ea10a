//! Advises as often as its argument says, for `tests/bench-advise.sh`, which counts the instructions.
//!
//! Three setups in turn, from the plainest to one with every detail that weighs.

use std::hint::black_box;

use rimrate_core::advice::advise;
use rimrate_core::setup::{Bar, Details, Diameter, InsertBox, Life, Setup, Support};
use rimrate_core::trade::{Material, Operation, Tool};
use rimrate_core::units::{Length, SurfaceSpeed};
use rimrate_tests::{bar, machine};

fn setups() -> [(&'static str, Setup); 3] {
    let mm = |x: f32| Length::from_mm(x).ok();
    let full = Setup {
        material: Material::LowAlloySteel,
        tool: Tool::CoatedCarbide,
        details: Details {
            depth: mm(2.0),
            nose_radius: mm(0.8),
            length: mm(100.0),
            life: Life::new("life", 120.0).ok(),
            insert_box: SurfaceSpeed::from_m_min(250.0).ok().map(|speed| InsertBox {
                speed,
                life: Life::OF_BOX,
            }),
            bar: mm(150.0).map(|length| Bar {
                length,
                support: Support::Tailstock,
                stock: None,
                bore: None,
            }),
            ..Details::NONE
        },
        ..bar(50.0)
    };
    let drill = Setup {
        material: Material::UnknownSteel,
        tool: Tool::CobaltHss,
        operation: Operation::Reaming,
        diameter: Diameter::nearest(8.0),
        ..bar(8.0)
    };
    [
        ("a bar of mild steel", bar(25.0)),
        ("a reamer in unknown steel", drill),
        ("a cut with every detail", full),
    ]
}

fn main() {
    let mut arguments = std::env::args().skip(1);
    let (Some(which), Some(times)) = (
        arguments.next().and_then(|a| a.parse::<usize>().ok()),
        arguments.next().and_then(|a| a.parse::<u32>().ok()),
    ) else {
        for (i, (name, _)) in setups().iter().enumerate() {
            println!("{i} {name}");
        }
        return;
    };
    let machine = machine("geared-lathe");
    let (_, setup) = setups()[which % 3];
    for _ in 0..times {
        black_box(advise(black_box(&setup), black_box(&machine)));
    }
}
