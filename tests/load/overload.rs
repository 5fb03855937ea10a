//! What the load says of a spindle that is pulled down further than its motor can bear for long.

use super::*;

/// A motor that breaks down at three times its rated torque, so that it turns at 2.5 times.
fn strong() -> LatheSpec {
    let mut spec = LatheSpec::default();
    spec.motor.breakdown_ratio = 3.0;
    spec
}

#[test]
fn an_overload_shows_stalling_and_is_counted_for_as_long_as_it_lasts() {
    let machine = machine("geared-lathe");
    for plate in [112.0, 280.0, 710.0] {
        for share in [2.0, 2.2, 2.5] {
            let at = format!("{plate} rpm, {share}");
            let [seeing, blind] = [loaded(25.0), bar(25.0)].map(|setup| {
                let mut shop = Shop::new(&machine, setup, strong(), 3);
                shop.start(plate);
                shop.run(10.0);
                let before = shop.instrument.view().edge.used();
                let mut seen = Vec::new();
                shop.watch(40.0, share, &mut seen);
                let used = shop.instrument.view().edge.used() - before;
                assert!(shop.lathe.smooth_rpm() > 0.8 * f64::from(plate), "{at}");
                (shop, seen, used)
            });
            let (mut shop, seen, used) = seeing;
            let mut lasting = seen.iter().filter(|s| s.steady > 2.0);
            assert!(lasting.all(|s| s.mark == Some(Mark::Stalling)), "{at}");
            // But for the second until it is told, all of it, as with the load off.
            assert!(used > 0.85 * blind.2, "{at}: {used} {}", blind.2);
            // It ends, and is nothing that was learned.
            assert_eq!(after(&mut shop, 5.0, 0.0), Some(Mark::Free), "{at}");
            // From a cut into an overload and back the bar never goes.
            let mut seen = Vec::new();
            shop.watch(8.0, 0.8, &mut Vec::new());
            shop.watch(20.0, share, &mut seen);
            shop.watch(8.0, 0.8, &mut seen);
            assert!(seen.iter().all(|s| s.mark >= Some(Mark::Heavy)), "{at}");
            assert_eq!(after(&mut shop, 5.0, 0.0), Some(Mark::Free), "{at}");
        }
    }
}

#[test]
fn a_slower_step_is_no_overload_of_the_one_before() {
    let machine = machine("geared-lathe");
    for (from, to) in [(280.0, 180.0), (710.0, 112.0), (1120.0, 710.0)] {
        let mut shop = Shop::new(&machine, loaded(25.0), strong(), 3);
        shop.start(from);
        shop.run(10.0);
        assert_eq!(after(&mut shop, 5.0, 0.8), Some(Mark::Heavy), "{from}");
        // Shifted out of the cut.
        shop.start(to);
        let mut seen = Vec::new();
        shop.watch(10.0, 0.0, &mut seen);
        let mut later = seen.iter().filter(|s| s.steady > 4.0);
        assert!(later.all(|s| s.mark == Some(Mark::Free)), "{from} {to}");
    }
}

#[test]
fn coasting_out_of_a_cut_is_not_counted_to_its_end() {
    let machine = machine("geared-lathe");
    let mut shop = Shop::new(&machine, loaded(25.0), strong(), 3);
    shop.lathe.grip(0.1);
    shop.start(710.0);
    shop.run(10.0);
    assert_eq!(after(&mut shop, 10.0, 0.8), Some(Mark::Heavy));
    shop.lathe.motor(MotorSwitch::Off);
    assert_eq!(after(&mut shop, 2.0, 0.0), None);
    assert!(shop.lathe.smooth_rpm() > 400.0, "it still turns");
    let used = shop.instrument.view().edge.used();
    shop.run(20.0);
    let account = shop.instrument.view().edge;
    assert_eq!(
        (account.used(), account.counted()),
        (used, Counted::Cutting)
    );
}

#[test]
fn a_speed_that_never_settles_is_not_taken_for_slowing_down() {
    let machine = machine("geared-lathe");
    let [seeing, blind] = [loaded(25.0), bar(25.0)].map(|setup| {
        let mut shop = Shop::new(&machine, setup, strong(), 3);
        shop.start(450.0);
        // The tool digs in and lets go twice a second from the start.
        for _ in 0..60 {
            shop.watch(0.3, 1.6, &mut Vec::new());
            shop.watch(0.2, 0.2, &mut Vec::new());
            assert_eq!(shop.instrument.view().load, None);
        }
        shop.instrument.view().edge
    });
    assert_eq!(seeing.counted(), Counted::Turning);
    let (used, all) = (seeing.used(), blind.used());
    assert!(used > 0.85 * all, "{used} {all}");
}
