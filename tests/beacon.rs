//! Lamps, buzzer and relay against the table of `rimrate_core::beacon`, tick by tick.

use rimrate_core::beacon::{Outputs, TICK, outputs};
use rimrate_core::time::{Duration, Instant};
use rimrate_core::verdict::Verdict;
use rimrate_tests::at;

/// The outputs of the first eight seconds, one for every eighth of a second.
fn eight_seconds(verdict: Verdict, since: Instant) -> Vec<Outputs> {
    assert_eq!(TICK, Duration::from_millis(125));
    (0..64)
        .map(|i| outputs(verdict, since, since + Duration::from_millis(125 * i)).0)
        .collect()
}

/// How often something comes on in these eight seconds, and for how many eighths it is on.
fn flashes(seen: &[Outputs], on: impl Fn(&Outputs) -> bool) -> (usize, usize) {
    let on: Vec<bool> = seen.iter().map(on).collect();
    let begins = (0..on.len()).filter(|&i| on[i] && (i == 0 || !on[i - 1]));
    (begins.count(), on.iter().filter(|&&on| on).count())
}

const NEVER: (usize, usize) = (0, 0);

#[test]
fn the_table_holds() {
    for since in [at(0.0), at(0.3), at(12_345.678)] {
        for verdict in Verdict::ALL {
            let seen = eight_seconds(verdict, since);
            let over = flashes(&seen, |o| o.over);
            let under = flashes(&seen, |o| o.under);
            let right = flashes(&seen, |o| o.right);
            let buzzer = flashes(&seen, |o| o.buzzer_hz.is_some());
            let relay = flashes(&seen, |o| o.relay);
            let together = seen.iter().all(|o| o.over == o.under);
            let in_turn = seen.iter().all(|o| o.over != o.under);
            match verdict {
                Verdict::Danger => {
                    // Four flashes a second, tone with the flashes, relay closed all along.
                    assert_eq!((over, buzzer), ((32, 32), (32, 32)));
                    assert!(seen.iter().all(|o| o.over == o.buzzer_hz.is_some()));
                    assert_eq!((under, right, relay), (NEVER, NEVER, (1, 64)));
                }
                Verdict::Fast => {
                    // One long flash and one short tone a second.
                    assert_eq!((over, buzzer), ((8, 40), (8, 8)));
                    assert_eq!((under, right, relay), (NEVER, NEVER, NEVER));
                }
                Verdict::Right => {
                    assert_eq!(right, (1, 64));
                    assert_eq!((over, under, buzzer, relay), (NEVER, NEVER, NEVER, NEVER));
                }
                Verdict::Slow => {
                    assert_eq!(under, (8, 40));
                    assert_eq!((over, right, buzzer, relay), (NEVER, NEVER, NEVER, NEVER));
                }
                Verdict::Lost | Verdict::Doubtful => {
                    // Over and under in turn, once a second; one tone every two seconds.
                    assert!(in_turn);
                    assert_eq!((over, under, buzzer), ((8, 32), (8, 32), (4, 4)));
                    assert_eq!((right, relay), (NEVER, NEVER));
                }
                Verdict::Unconfirmed | Verdict::NeedsCap | Verdict::NoAdvice => {
                    // Both together, a short flash every two seconds.
                    assert!(together);
                    assert_eq!((over, under), ((4, 4), (4, 4)));
                    assert_eq!((right, buzzer, relay), (NEVER, NEVER, NEVER));
                }
                Verdict::NoPulses | Verdict::RunUp => {
                    assert!(seen.iter().all(|o| *o == Outputs::default()));
                }
            }
        }
    }
}

#[test]
fn tones_tell_danger_from_fast_from_doubt() {
    let tone = |verdict| {
        let mut tones = eight_seconds(verdict, at(0.0))
            .into_iter()
            .filter_map(|o| o.buzzer_hz);
        let first = tones.next().unwrap();
        assert!(tones.all(|t| t == first));
        first
    };
    assert!(tone(Verdict::Danger) > tone(Verdict::Fast));
    assert!(tone(Verdict::Fast) > tone(Verdict::Lost));
    assert_eq!(tone(Verdict::Lost), tone(Verdict::Doubtful));
}

#[test]
fn the_middle_lamp_is_lit_by_right_alone_and_the_relay_by_danger_alone() {
    for verdict in Verdict::ALL {
        for ms in 0..10_000 {
            let (seen, _) = outputs(verdict, at(1.0), at(1.0 + f64::from(ms) / 1000.0));
            assert_eq!(seen.right, verdict == Verdict::Right);
            assert_eq!(seen.relay, verdict == Verdict::Danger);
        }
    }
}

#[test]
fn outputs_change_exactly_when_they_said() {
    for verdict in Verdict::ALL {
        let since = at(3.217);
        let mut now = since;
        for _ in 0..100 {
            let (seen, next) = outputs(verdict, since, now);
            let Some(next) = next else {
                let later = outputs(verdict, since, now + Duration::from_secs(100));
                assert_eq!(later, (seen, None));
                break;
            };
            assert!(next > now);
            let just_before = next - Duration::from_nanos(1);
            assert_eq!(outputs(verdict, since, just_before).0, seen, "{verdict:?}");
            now = next;
        }
    }
    // A clock that was read before the verdict began does no harm.
    assert_eq!(
        outputs(Verdict::Fast, at(5.0), at(4.0)).0,
        outputs(Verdict::Fast, at(5.0), at(5.0)).0
    );
}
