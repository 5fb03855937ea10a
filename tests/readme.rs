//! What the README shows is what the instrument shows.

use std::path::Path;

use rimrate_core::time::Duration;
use rimrate_sim::bench::Bench;
use rimrate_sim::frame::Frame;
use rimrate_sim::rig::{Desk, Rig};
use rimrate_sim::scenario::Scenario;
use rimrate_tests::at;

/// The moment of the demo shift that the README's picture shows, s.
const SHOWN: f64 = 15.0;

fn root() -> &'static Path {
    Path::new(concat!(env!("CARGO_MANIFEST_DIR"), "/.."))
}

fn shift_at(seconds: f64) -> Frame {
    let scenario = Scenario::load(&root().join("sim/scenarios/shift.toml")).unwrap();
    let desk = Desk::new(scenario.machine.clone(), Some(scenario.setup));
    let mut bench = Bench::new(
        scenario.machine.clone(),
        scenario.sensor.clone(),
        scenario.seed,
        desk,
    );
    let mut actions = scenario.actions.iter().peekable();
    loop {
        while let Some((_, action)) = actions.next_if(|(t, _)| at(*t) <= bench.now()) {
            bench.act(action, &scenario.setup);
        }
        if bench.now() >= at(seconds) {
            return *bench.rig.frame();
        }
        // As `rimrate play --frames` goes.
        bench.run(bench.now() + Duration::from_millis(10), |_| {});
    }
}

fn pixels(png: &[u8]) -> (u32, u32, Vec<u8>) {
    let mut reader = png::Decoder::new(std::io::Cursor::new(png))
        .read_info()
        .unwrap();
    let mut pixels = vec![0; reader.output_buffer_size().unwrap()];
    let info = reader.next_frame(&mut pixels).unwrap();
    (info.width, info.height, pixels)
}

/// To make it anew: `rimrate play sim/scenarios/shift.toml --frames DIR`, then copy the frame of 15 s.
#[test]
fn the_picture_is_what_the_panel_shows() {
    let mut expected = Vec::new();
    shift_at(SHOWN).write_png(&mut expected, 4).unwrap();
    let shown = std::fs::read(root().join("sim/pictures/run-page.png")).unwrap();
    assert!(
        pixels(&shown) == pixels(&expected),
        "sim/pictures/run-page.png is not what the panel shows at {SHOWN} s"
    );
}

#[test]
fn every_file_that_a_page_links_to_is_there() {
    for page in ["README.md", "DEVELOPERS.md", "hardware/README.md"] {
        let page = root().join(page);
        let text = std::fs::read_to_string(&page).unwrap();
        let mut links = 0;
        for link in text
            .split("](")
            .skip(1)
            .filter_map(|rest| rest.split(')').next())
        {
            if !link.starts_with('#') {
                links += 1;
                assert!(
                    page.with_file_name(link).exists(),
                    "{}: {link} is not there",
                    page.display()
                );
            }
        }
        assert!(
            links > 0 || page.ends_with("DEVELOPERS.md"),
            "{}: no links found",
            page.display()
        );
    }
}
