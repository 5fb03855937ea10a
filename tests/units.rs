//! Quantities against the `uom` crate, and what happens to text that is none.

use proptest::prelude::*;
use rimrate_core::units::{Length, Rpm, SurfaceSpeed, UnitError, UnitSystem};
use uom::si::f64::{Length as UomLength, Velocity};
use uom::si::length::{inch, millimeter};
use uom::si::velocity::{foot_per_minute, meter_per_second};

fn near(a: f32, b: f64) -> bool {
    (f64::from(a) - b).abs() <= 1e-6 * b.abs()
}

/// From one to nearly the top, by a step that meets no round numbers.
fn sweep(from: f64, to: f64) -> impl Iterator<Item = f64> {
    std::iter::successors(Some(from), |x| Some(x * 1.0373)).take_while(move |x| *x <= to)
}

#[test]
fn lengths_convert_as_uom_does() {
    let mut count = 0;
    for x in sweep(0.0011, 90_000.0) {
        let mm = Length::from_mm(x as f32).unwrap();
        assert!(
            near(
                mm.inch(),
                UomLength::new::<millimeter>(f64::from(x as f32)).get::<inch>()
            ),
            "{x}"
        );
        if x < 3_900.0 {
            let inches = Length::from_inch(x as f32).unwrap();
            assert!(
                near(
                    inches.mm(),
                    UomLength::new::<inch>(f64::from(x as f32)).get::<millimeter>()
                ),
                "{x}"
            );
        }
        count += 1;
    }
    assert!(count > 400);
}

#[test]
fn speeds_convert_as_uom_does() {
    let mut count = 0;
    for x in sweep(0.04, 9_900.0) {
        let metric = SurfaceSpeed::from_m_min(x as f32).unwrap();
        let v = Velocity::new::<meter_per_second>(f64::from(x as f32) / 60.0);
        assert!(near(metric.ft_min(), v.get::<foot_per_minute>()), "{x}");
        let shop = SurfaceSpeed::from_ft_min(x as f32).unwrap();
        let v = Velocity::new::<foot_per_minute>(f64::from(x as f32));
        assert!(
            near(shop.m_min(), 60.0 * v.get::<meter_per_second>()),
            "{x}"
        );
        // Common practice, no source: ft/min over 3.3 is m/min to 1 %.
        assert!((shop.m_min() / (x as f32 / 3.3) - 1.0).abs() < 0.01);
        count += 1;
    }
    assert!(count > 300);
}

#[test]
fn lengths_read_and_print() {
    for (text, mm, metric, shop) in [
        ("25 mm", 25.0, "25 mm", "0.9843 in"),
        ("25mm", 25.0, "25 mm", "0.9843 in"),
        ("12.5 mm", 12.5, "12.5 mm", "0.4921 in"),
        ("1 in", 25.4, "25.4 mm", "1 in"),
        ("3/8 in", 9.525, "9.525 mm", "0.375 in"),
        ("1 1/2 in", 38.1, "38.1 mm", "1.5 in"),
        ("1-1/2 in", 38.1, "38.1 mm", "1.5 in"),
        ("  1  1/2  in ", 38.1, "38.1 mm", "1.5 in"),
        ("0.001 mm", 0.001, "0.001 mm", "0 in"),
    ] {
        let length: Length = text.parse().unwrap_or_else(|e| panic!("{text}: {e}"));
        assert!(near(length.mm(), mm), "{text}");
        assert_eq!(length.display(UnitSystem::Metric).to_string(), metric);
        assert_eq!(length.display(UnitSystem::Inch).to_string(), shop);
        assert_eq!(metric.parse::<Length>().unwrap().to_string(), metric);
    }
}

#[test]
fn speeds_read_and_print() {
    for (text, m_min, metric, shop) in [
        ("30 m/min", 30.0, "30 m/min", "98.43 ft/min"),
        ("100 ft/min", 30.48, "30.48 m/min", "100 ft/min"),
        ("27.4 m/min", 27.4, "27.4 m/min", "89.9 ft/min"),
    ] {
        let speed: SurfaceSpeed = text.parse().unwrap();
        assert!(near(speed.m_min(), m_min), "{text}");
        assert_eq!(speed.display(UnitSystem::Metric).to_string(), metric);
        assert_eq!(speed.display(UnitSystem::Inch).to_string(), shop);
        assert_eq!(metric.parse::<SurfaceSpeed>().unwrap().to_string(), metric);
    }
    assert_eq!("350 rpm".parse::<Rpm>().unwrap().to_string(), "350 rpm");
    assert_eq!("350".parse::<Rpm>().unwrap().to_string(), "350 rpm");
    assert_eq!("0 rpm".parse::<Rpm>().unwrap(), Rpm::ZERO);
}

#[test]
fn bad_lengths_are_named_for_what_they_are() {
    for (text, error) in [
        ("", UnitError::Empty),
        ("   ", UnitError::Empty),
        ("25", UnitError::NoUnit),
        ("1 1/2", UnitError::NoUnit),
        ("25 furlong", UnitError::UnknownUnit),
        ("25 m/min", UnitError::UnknownUnit),
        ("25 \"", UnitError::UnknownUnit),
        ("0 mm", UnitError::NotPositive),
        ("0/8 in", UnitError::NotPositive),
        ("-3 mm", UnitError::NotPositive),
        ("-0 mm", UnitError::NotPositive),
        ("-3/8 in", UnitError::NotPositive),
        ("-1 1/2 in", UnitError::NotPositive),
        ("3/-8 in", UnitError::NotPositive),
        ("3/0 in", UnitError::ZeroDenominator),
        ("1 1/0 in", UnitError::ZeroDenominator),
        ("NaN mm", UnitError::NotANumber),
        ("nan", UnitError::NotANumber),
        ("inf mm", UnitError::NotANumber),
        ("-inf mm", UnitError::NotANumber),
        ("mm", UnitError::NotANumber),
        ("twelve mm", UnitError::NotANumber),
        ("1,5 mm", UnitError::NotANumber),
        ("1 2 mm", UnitError::NotANumber),
        ("1 -1/2 in", UnitError::NotANumber),
        ("1 - 1/2 in", UnitError::NotANumber),
        ("1/2/3 in", UnitError::NotANumber),
        ("100001 mm", UnitError::OutOfRange),
        ("0.0001 mm", UnitError::OutOfRange),
        (
            "99999999999999999999999999999999999999999999 mm",
            UnitError::OutOfRange,
        ),
    ] {
        assert_eq!(text.parse::<Length>(), Err(error), "{text:?}");
    }
}

#[test]
fn bad_speeds_are_named_for_what_they_are() {
    for (text, error) in [
        ("", UnitError::Empty),
        ("30", UnitError::NoUnit),
        ("30 mm", UnitError::UnknownUnit),
        ("30 m/s", UnitError::UnknownUnit),
        ("0 m/min", UnitError::NotPositive),
        ("-30 m/min", UnitError::NotPositive),
        ("NaN m/min", UnitError::NotANumber),
        ("99999 m/min", UnitError::OutOfRange),
    ] {
        assert_eq!(text.parse::<SurfaceSpeed>(), Err(error), "{text:?}");
    }
    for (text, error) in [
        ("", UnitError::Empty),
        ("-1 rpm", UnitError::NotPositive),
        ("5 m/min", UnitError::UnknownUnit),
        ("rpm", UnitError::NotANumber),
        ("1e9", UnitError::UnknownUnit),
        ("99999999 rpm", UnitError::OutOfRange),
    ] {
        assert_eq!(text.parse::<Rpm>(), Err(error), "{text:?}");
    }
}

#[test]
fn values_that_are_not_finite_or_not_positive_are_refused() {
    for bad in [
        f32::NAN,
        f32::INFINITY,
        f32::NEG_INFINITY,
        0.0,
        -0.0,
        -1.0,
        f32::MAX,
        f32::MIN_POSITIVE,
    ] {
        assert!(Length::from_mm(bad).is_err(), "{bad}");
        assert!(Length::from_inch(bad).is_err(), "{bad}");
        assert!(SurfaceSpeed::from_m_min(bad).is_err(), "{bad}");
        assert!(SurfaceSpeed::from_ft_min(bad).is_err(), "{bad}");
        let scaled = SurfaceSpeed::of_table_m_min(30.0).scaled(bad).m_min();
        assert!((0.01..=10_000.0).contains(&scaled), "{bad} gave {scaled}");
    }
}

proptest! {
    #[test]
    fn any_text_is_read_or_refused(text in ".{0,40}") {
        if let Ok(length) = text.parse::<Length>() {
            prop_assert!((0.001..=100_000.0).contains(&length.mm()));
        }
        if let Ok(speed) = text.parse::<SurfaceSpeed>() {
            prop_assert!((0.01..=10_000.0).contains(&speed.m_min()));
        }
        if let Ok(rpm) = text.parse::<Rpm>() {
            prop_assert!((0.0..=10_000_000.0).contains(&rpm.get()));
        }
    }

    #[test]
    fn text_that_is_nearly_a_quantity_is_read_or_refused(text in "[-+ ]?[0-9.,e /-]{0,12} ?(mm|in|m/min|ft/min|rpm|\u{fc}|\"|%)?") {
        if let Ok(length) = text.parse::<Length>() {
            prop_assert!((0.001..=100_000.0).contains(&length.mm()), "{text} gave {}", length.mm());
        }
        let _ = (text.parse::<SurfaceSpeed>(), text.parse::<Rpm>());
    }

    #[test]
    fn what_is_printed_is_read_again(mm in 0.01f32..90_000.0, v in 0.1f32..9_000.0) {
        let length = Length::from_mm(mm).unwrap();
        let again: Length = length.to_string().parse().unwrap();
        prop_assert!((again.mm() - mm).abs() <= 0.0005 + mm * 1e-6);
        let speed = SurfaceSpeed::from_m_min(v).unwrap();
        let again: SurfaceSpeed = speed.display(UnitSystem::Inch).to_string().parse().unwrap();
        prop_assert!((again.m_min() - v).abs() <= 0.005 + v * 1e-6);
    }

    #[test]
    fn wholes_and_fractions_add_up(whole in 0u32..40, above in 1u32..64, below in 1u32..65) {
        let length: Length = format!("{whole} {above}/{below} in").parse().unwrap();
        let want = UomLength::new::<inch>(f64::from(whole) + f64::from(above) / f64::from(below));
        prop_assert!(near(length.mm(), want.get::<millimeter>()));
    }
}
