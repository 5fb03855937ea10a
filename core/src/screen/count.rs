//! The two pages on which the pulses in a revolution are found: ten turns by hand, and the plate's speed. Each says what has
//! been found, and what the right knob does next, reversed.
//!
//! ```text
//!  Count: ten turns by hand             Count: by plate speed
//!  CAUTION: lock out the supply, or     CAUTION: chuck key out first.
//!  motor off, out of gear. Key out.     turn right: plate 280 rpm
//!  passages: 13                         37.33 pulses/s: 8 a turn
//!  One way, back to the mark            8 a turn, in use 2
//! [press right: turns done        ]     or is it step 1120 rpm?
//!                                       turn left back: by hand
//!  press left: give up                  press left: back to speed
//! ```

use core::fmt;

use embedded_graphics::mono_font::ascii::FONT_5X8;
use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::*;
use embedded_graphics::primitives::{PrimitiveStyle, Rectangle};
use embedded_graphics::text::Alignment;
use heapless::String;

use super::{View, WIDTH, line, write};
use crate::error::text;
use crate::sensor_setup::{ALLOWED, Doubt, Fit, Hand, Miscount, Offer, PULSES_SEEN, TURNS};
use crate::setup::Pulses;
use crate::units::Decimal;

/// Rows of the lines, eight pixels each.
const ROW: i32 = 8;
/// The line that says what a press does.
const OFFER: i32 = 5;

/// Before anybody turns the spindle by hand.
const LOCK_OUT: &str = "CAUTION: lock out the supply, or";
const OR_OUT_OF_GEAR: &str = "motor off, out of gear. Key out.";

pub(super) fn ten_turns<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    let (setup, used) = (view.sensor_setup, view.setup.pulses_on(view.machine));
    let mut page = Page { target };
    page.words(0, "Count: ten turns by hand")?;
    if matches!(setup.hand(), Hand::Waiting | Hand::Counting(_)) {
        page.words(1, LOCK_OUT)?;
        page.words(2, OR_OUT_OF_GEAR)?;
    }
    match setup.hand() {
        Hand::Driven => {
            page.words(1, "No hand turns like that:")?;
            page.words(2, "motor runs: switch it off")?;
            page.words(3, LOCK_OUT)?;
            page.words(4, OR_OUT_OF_GEAR)?;
        }
        Hand::Waiting => {
            page.words(3, "Mark chuck and headstock.")?;
            page.words(4, "Ten whole turns, one way.")?;
        }
        Hand::Counting(_) => {
            page.line(3, format_args!("passages: {}", setup.passages()))?;
            page.words(4, "One way, back to the mark")?;
        }
        Hand::Counted(passages, found) => {
            page.line(1, format_args!("{passages} passages in {TURNS} turns"))?;
            match (found, setup.contradiction()) {
                (Ok(_), Some(both)) => page.contradiction(2, both)?,
                (Ok(found), None) => {
                    page.found(2, *found, used)?;
                    page.line(3, format_args!("{}", Timing(setup.fit())))?;
                }
                (Err(why), _) => page.miscount(2, *why)?,
            }
        }
        Hand::Lost => {
            page.words(1, "Pulses were lost while")?;
            page.words(2, "counting: nothing known.")?;
        }
    }
    match setup.hand_offer(used) {
        Offer::Start => page.offer(format_args!("start"))?,
        Offer::End => page.offer(format_args!("turns done"))?,
        Offer::Again => page.offer(format_args!("count again"))?,
        Offer::Use(pulses) => page.offer(format_args!("use {pulses}"))?,
        Offer::Nothing => {}
    }
    if let Hand::Counting(_) = setup.hand() {
        return page.words(7, "press left: give up");
    }
    page.words(6, "turn left: by plate speed")?;
    page.words(7, "press left: back to speed")
}

pub(super) fn plate_speed<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    let (setup, used) = (view.sensor_setup, view.setup.pulses_on(view.machine));
    let mut page = Page { target };
    page.words(0, "Count: by plate speed")?;
    page.words(1, "CAUTION: chuck key out first.")?;
    match setup.plate() {
        None => page.words(2, "turn right: plate's speed")?,
        Some(plate) => page.line(2, format_args!("turn right: plate {plate}"))?,
    }
    match (setup.rate(), setup.plate()) {
        (None, _) => page.line(
            3,
            format_args!(
                "not steady yet: {} of {PULSES_SEEN}",
                setup.seen().min(PULSES_SEEN)
            ),
        )?,
        (Some(rate), None) => page.line(3, format_args!("steady, {} pulses/s", Few(rate)))?,
        (Some(rate), Some(plate)) => page.line(
            3,
            format_args!(
                "{} pulses/s: {} a turn",
                Few(rate),
                Few(60.0 * rate / plate.get())
            ),
        )?,
    }
    match (setup.contradiction(), setup.fit()) {
        (Some(both), _) => page.contradiction(4, both)?,
        (None, None) => page.words(4, "Run in one step, without a cut.")?,
        (None, Some(Fit::One(found))) => page.found(4, found, used)?,
        (None, Some(fit @ Fit::Several(..))) => {
            page.line(4, format_args!("{}: count by hand", Fitting(fit)))?;
        }
        (None, Some(Fit::Nothing(_))) => page.words(4, "no whole number: which step?")?,
    }
    match setup.doubt(used, view.machine) {
        Some(Doubt::Step(rpm)) => page.line(OFFER, format_args!("or is it step {rpm}?"))?,
        Some(Doubt::InUse) => page.line(OFFER, format_args!("{used} fits, too: count by hand"))?,
        Some(Doubt::Several) => page.words(OFFER, "several fit: count by hand")?,
        None => {}
    }
    if let Offer::Use(pulses) = setup.plate_offer(used, view.machine) {
        page.offer(format_args!("use {pulses}"))?;
    }
    page.words(6, "turn left back: by hand")?;
    page.words(7, "press left: back to speed")
}

/// Lines on a target.
struct Page<'a, D> {
    target: &'a mut D,
}

impl<D: DrawTarget<Color = BinaryColor>> Page<'_, D> {
    /// What is not inlined here has many callers: flash is short.
    #[inline(never)]
    fn line(&mut self, row: i32, words: fmt::Arguments<'_>) -> Result<(), D::Error> {
        line(words, ROW * row, self.target)
    }

    #[inline(never)]
    fn words(&mut self, row: i32, words: &str) -> Result<(), D::Error> {
        self.line(row, format_args!("{words}"))
    }

    /// What a press of the right knob does.
    #[inline(never)]
    fn offer(&mut self, what: fmt::Arguments<'_>) -> Result<(), D::Error> {
        let y = ROW * OFFER;
        let words: String<32> = text(format_args!("press right: {what}"));
        Rectangle::new(Point::new(0, y), Size::new(WIDTH, ROW as u32))
            .into_styled(PrimitiveStyle::with_fill(BinaryColor::On))
            .draw(self.target)?;
        let at = Point::new(1, y);
        write(
            &words,
            &FONT_5X8,
            at,
            Alignment::Left,
            BinaryColor::Off,
            self.target,
        )
    }

    #[inline(never)]
    fn found(&mut self, row: i32, found: Pulses, used: Pulses) -> Result<(), D::Error> {
        if found == used {
            self.line(row, format_args!("{found} a turn, as in use"))
        } else {
            self.line(row, format_args!("{found} a turn, in use {used}"))
        }
    }

    #[inline(never)]
    fn contradiction(&mut self, row: i32, both: (Pulses, Fit)) -> Result<(), D::Error> {
        let (hand, plate) = both;
        self.line(row, format_args!("by hand {hand} a turn, but"))?;
        self.line(row + 1, format_args!("by plate {}", Fitting(plate)))
    }

    fn miscount(&mut self, row: i32, why: Miscount) -> Result<(), D::Error> {
        match why {
            Miscount::Nothing => {
                self.words(row, "No magnet passed: look")?;
                self.words(row + 1, "at sensor and magnets.")
            }
            Miscount::TooMany => {
                self.words(row, "More than a sensor may")?;
                self.words(row + 1, "give: 240 in a turn.")
            }
            Miscount::Chatter => {
                self.words(row, "The line chatters: look")?;
                self.words(row + 1, "at sensor and gap.")
            }
            Miscount::Between(0, to) => {
                self.words(row, "no whole number a turn;")?;
                self.line(row + 1, format_args!("allowed: {to} +-{ALLOWED} or more"))
            }
            Miscount::Between(from, to) => {
                self.words(row, "no whole number a turn;")?;
                self.line(
                    row + 1,
                    format_args!("allowed: {from} or {to}, +-{ALLOWED}"),
                )
            }
        }
    }
}

/// What timing says beside a count that it allows.
struct Timing(Option<Fit>);

impl fmt::Display for Timing {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.0 {
            Some(fit) => write!(f, "by plate {}: agrees", Fitting(fit)),
            None => f.write_str("not confirmed by plate"),
        }
    }
}

/// The numbers that a plate's speed can mean.
struct Fitting(Fit);

impl fmt::Display for Fitting {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.0 {
            Fit::One(pulses) => pulses.fmt(f),
            Fit::Several(from, to) if from == to => from.fmt(f),
            Fit::Several(from, to) => write!(f, "{from} to {to}"),
            Fit::Nothing(a_turn) => Few(a_turn).fmt(f),
        }
    }
}

/// A number with as many decimals as leave it at four or five characters.
struct Few(f32);

impl fmt::Display for Few {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let decimals = match self.0 {
            x if x < 99.95 => 2,
            x if x < 999.95 => 1,
            _ => 0,
        };
        Decimal {
            value: self.0,
            decimals,
        }
        .fmt(f)
    }
}
