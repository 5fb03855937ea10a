//! The verdict's levels, its hysteresis, and what suppresses what.

use rimrate_core::advice::{Advice, Bound, Kind, Pick, Reason, Setting, Side, Window};
use rimrate_core::tacho::{Reading, Signal};
use rimrate_core::trade::{Coolant, Material, Operation, Refusal, Tool, cutting_speed};
use rimrate_core::verdict::{Judge, RUN_UP_GRACE, Verdict};
use rimrate_tests::{at, rpm, turning};

fn bound(n: f32, side: Side, kind: Kind) -> Bound {
    Bound {
        at: rpm(n),
        side,
        kind,
        reason: Reason::CuttingSpeed,
    }
}

/// Hard bound 1000, soft bound 400, advised step 300, and perhaps a lower bound.
fn advice(low: Option<f32>) -> Advice {
    let mut bounds = vec![
        bound(1000.0, Side::Upper, Kind::Hard),
        bound(400.0, Side::Upper, Kind::Soft),
    ];
    bounds.extend(low.map(|n| bound(n, Side::Lower, Kind::Soft)));
    Advice {
        cutting: cutting_speed(
            Material::MildSteel,
            Tool::Hss,
            Operation::RoughTurning,
            Coolant::Flood,
        ),
        window: Window::of(&bounds).unwrap(),
        bounds: bounds.into_iter().collect(),
        pick: Pick::Set(Setting {
            label: "a step".parse().unwrap(),
            rpm: rpm(300.0),
        }),
        cut: Default::default(),
        cautions: Default::default(),
    }
}

/// Judges steady speeds one after the other, long after a start.
fn judged(advice: &Advice, speeds: &[f32]) -> Vec<Verdict> {
    let mut judge = Judge::default();
    // It came up to speed long ago.
    judge.verdict(at(0.0), &turning(300.0), advice, true);
    (1..)
        .zip(speeds)
        .map(|(i, &n)| judge.verdict(at(100.0 + f64::from(i)), &turning(n), advice, true))
        .collect()
}

#[test]
fn fast_begins_above_five_percent_and_is_left_at_the_bound() {
    use Verdict::{Fast, Right};
    // Single precision has 1.05 x 400 as 419.99998.
    let up = judged(&advice(None), &[400.0, 410.0, 419.9, 419.999, 420.001]);
    assert_eq!(up, [Right, Right, Right, Right, Fast]);
    // Once fast, what was right on the way up is fast still.
    let down = judged(
        &advice(None),
        &[420.001, 419.9, 410.0, 400.1, 400.0, 410.0, 419.999, 420.001],
    );
    assert_eq!(down, [Fast, Fast, Fast, Fast, Right, Right, Right, Fast]);
}

#[test]
fn slow_begins_below_nine_tenths_of_the_step() {
    use Verdict::{Right, Slow};
    let seen = judged(&advice(None), &[300.0, 270.1, 270.0, 269.9, 1.0, 270.1]);
    assert_eq!(seen, [Right, Right, Right, Slow, Slow, Right]);
}

#[test]
fn a_lower_bound_above_that_counts_instead_and_one_below_does_not() {
    use Verdict::{Right, Slow};
    assert_eq!(
        judged(&advice(Some(290.0)), &[290.0, 289.9, 270.0]),
        [Right, Slow, Slow]
    );
    assert_eq!(judged(&advice(Some(200.0)), &[270.1, 269.9]), [Right, Slow]);
}

#[test]
fn nothing_below_the_best_speed_is_slow_for_a_lower_bound_above_it() {
    use Verdict::{Fast, Right};
    // The upper bound wins, also where the machine has no setting for it.
    let advice = Advice {
        pick: Pick::TooFast {
            nearest: Setting {
                label: "a step".parse().unwrap(),
                rpm: rpm(450.0),
            },
            over_percent: 12.5,
        },
        ..advice(Some(430.0))
    };
    assert_eq!(
        judged(&advice, &[390.0, 410.0, 450.0]),
        [Right, Right, Fast]
    );
}

#[test]
fn danger_is_above_the_hard_bound_and_nothing_less() {
    use Verdict::{Danger, Fast, Right};
    let seen = judged(
        &advice(None),
        &[1000.0, 1000.1, 5000.0, 1000.0, 401.0, 400.0],
    );
    assert_eq!(seen, [Fast, Danger, Danger, Fast, Fast, Right]);
}

#[test]
fn a_hard_bound_below_the_soft_one_has_no_margin() {
    use Verdict::{Danger, Right};
    let bounds = [
        bound(350.0, Side::Upper, Kind::Hard),
        bound(400.0, Side::Upper, Kind::Soft),
    ];
    let advice = Advice {
        window: Window::of(&bounds).unwrap(),
        ..advice(None)
    };
    assert_eq!(judged(&advice, &[350.0, 350.1]), [Right, Danger]);
}

#[test]
fn an_unconfirmed_setup_suppresses_everything_but_danger() {
    let advice = advice(None);
    let mut judge = Judge::default();
    let readings = [
        Reading::NOTHING,
        turning(100.0),
        turning(300.0),
        turning(500.0),
        Reading {
            signal: Signal::Lost,
            speed: None,
            quick: None,
            ..Reading::NOTHING
        },
        Reading {
            signal: Signal::Doubtful,
            speed: None,
            quick: Some(rpm(300.0)),
            ..Reading::NOTHING
        },
    ];
    for (i, reading) in (0..).zip(readings) {
        let seen = judge.verdict(at(f64::from(i) * 10.0), &reading, &advice, false);
        assert_eq!(seen, Verdict::Unconfirmed, "{reading:?}");
    }
    let seen = judge.verdict(at(100.0), &turning(1000.1), &advice, false);
    assert_eq!(seen, Verdict::Danger);
}

#[test]
fn run_up_suppresses_slow_for_four_seconds_and_nothing_else() {
    let advice = advice(None);
    let grace = RUN_UP_GRACE.nanos() as f64 / 1e9;
    assert_eq!(grace, 4.0);
    let start = || {
        let mut judge = Judge::default();
        judge.verdict(at(10.0), &Reading::NOTHING, &advice, true);
        judge.verdict(at(11.0), &turning(50.0), &advice, true);
        judge
    };
    let mut judge = start();
    assert_eq!(
        judge.verdict(at(11.0 + grace - 0.001), &turning(100.0), &advice, true),
        Verdict::RunUp
    );
    assert_eq!(
        judge.verdict(at(11.0 + grace), &turning(100.0), &advice, true),
        Verdict::Slow
    );
    for (n, want) in [
        (300.0, Verdict::Right),
        (421.0, Verdict::Fast),
        (1001.0, Verdict::Danger),
    ] {
        assert_eq!(start().verdict(at(12.0), &turning(n), &advice, true), want);
    }
    for (signal, want) in [
        (Signal::Lost, Verdict::Lost),
        (Signal::Doubtful, Verdict::Doubtful),
        (Signal::Still, Verdict::NoPulses),
    ] {
        let reading = Reading {
            signal,
            speed: None,
            quick: None,
            ..Reading::NOTHING
        };
        assert_eq!(start().verdict(at(12.0), &reading, &advice, true), want);
    }
}

#[test]
fn grace_ends_when_the_speed_is_first_reached_and_begins_anew_from_rest() {
    let advice = advice(None);
    let mut judge = Judge::default();
    let mut see = |t: f64, reading: Reading| judge.verdict(at(t), &reading, &advice, true);
    assert_eq!(see(0.0, Reading::NOTHING), Verdict::NoPulses);
    assert_eq!(see(1.0, turning(100.0)), Verdict::RunUp);
    assert_eq!(see(1.5, turning(300.0)), Verdict::Right);
    assert_eq!(
        see(2.0, turning(100.0)),
        Verdict::Slow,
        "bogged down, within the four seconds"
    );
    assert_eq!(see(3.0, Reading::NOTHING), Verdict::NoPulses);
    assert_eq!(see(4.0, turning(100.0)), Verdict::RunUp);
}

#[test]
fn no_signal_but_a_speed_is_ever_right() {
    let advice = advice(None);
    for signal in [Signal::Still, Signal::Lost, Signal::Doubtful] {
        for n in [0.0, 100.0, 300.0, 400.0, 410.0, 500.0, 999.0] {
            let reading = Reading {
                signal,
                speed: Some(rpm(n)),
                quick: Some(rpm(n)),
                ..Reading::NOTHING
            };
            let seen = Judge::default().verdict(at(0.0), &reading, &advice, true);
            let want = match signal {
                Signal::Still => Verdict::NoPulses,
                Signal::Lost => Verdict::Lost,
                _ => Verdict::Doubtful,
            };
            assert_eq!(seen, want, "{n}");
        }
    }
    // The highest speed that ambiguous pulses allow is above the hard bound.
    let doubtful = Reading {
        signal: Signal::Doubtful,
        speed: None,
        quick: Some(rpm(1001.0)),
        ..Reading::NOTHING
    };
    assert_eq!(
        Judge::default().verdict(at(0.0), &doubtful, &advice, true),
        Verdict::Danger
    );
}

/// Pulses are overdue: the speed is an upper bound and nothing more.
#[test]
fn overdue_pulses_are_never_right_nor_slow_but_danger_still() {
    let advice = advice(None);
    for (n, want) in [
        (100.0, Verdict::NoPulses),
        (300.0, Verdict::NoPulses),
        (1001.0, Verdict::Danger),
    ] {
        let reading = Reading {
            overdue: true,
            ..turning(n)
        };
        let seen = Judge::default().verdict(at(0.0), &reading, &advice, true);
        assert_eq!(seen, want, "{n}");
    }
}

#[test]
fn without_a_setting_to_advise_nothing_between_the_bounds_is_right() {
    let refusal = Refusal {
        reason: "nobody knows",
    };
    for (pick, want) in [
        (Pick::NeedsCap, Verdict::NeedsCap),
        (Pick::NoBasis(refusal), Verdict::NoAdvice),
    ] {
        let advice = Advice {
            pick,
            ..advice(None)
        };
        for n in [1.0, 200.0, 300.0, 400.0] {
            let seen = Judge::default().verdict(at(0.0), &turning(n), &advice, true);
            assert_eq!(seen, want, "{n}");
        }
        // What is known still warns.
        for (n, want) in [(421.0, Verdict::Fast), (1001.0, Verdict::Danger)] {
            let seen = Judge::default().verdict(at(0.0), &turning(n), &advice, true);
            assert_eq!(seen, want, "{n}");
        }
    }
}

#[test]
fn every_verdict_has_a_word_of_its_own() {
    let words: std::collections::BTreeSet<&str> = Verdict::ALL.map(Verdict::id).into();
    assert_eq!(words.len(), Verdict::ALL.len());
}
