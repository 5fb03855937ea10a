//! The emulated board as a box on the bench.

use std::collections::BTreeMap;
use std::io::{BufRead, BufReader, Write};
use std::path::Path;
use std::process::{Child, ChildStdin, ChildStdout, Command, Stdio};

use base64::Engine;
use base64::engine::general_purpose::STANDARD as BASE64;
use defmt_decoder::{DecodeError, StreamDecoder};
use rimrate_core::beacon::Outputs;
use rimrate_core::machine::MachineSpec;
use rimrate_core::panel::Knob;
use rimrate_core::setup::Setup;
use rimrate_core::tacho::{Reading, Signal};
use rimrate_core::time::{Edge, EdgeKind, Instant};
use rimrate_core::units::Rpm;
use rimrate_core::verdict::Verdict;
use rimrate_sim::frame::Frame;
use rimrate_sim::rig::{Rig, Touch};
use serde_json::{Value, json};

use crate::image::{IMAGE, IMAGE_SH1106, Image, pins, wires};

/// From one contact change of a turned knob to the next, ns: faster than any hand, so that the board is not long behind a
/// desk on which turns take no time.
pub(crate) const CONTACT: u64 = 2_000_000;

/// A line of the firmware's log.
#[derive(Clone, Debug)]
pub(crate) struct Line {
    /// When it was fetched, ns since the first power-up: at most 1 ms after it was written.
    pub(crate) at: u64,
    /// After how many resets and power cuts it was written.
    pub(crate) boot: u64,
    /// Its text.
    pub(crate) text: String,
}

/// A change of an output.
#[derive(Clone, Debug)]
pub(crate) struct Change {
    /// When, ns since power-up.
    pub(crate) at: u64,
    /// Which: `over`, `right`, `under`, `relay`, `status`, or `buzzer`.
    pub(crate) what: String,
    /// Its level, the buzzer's pitch in Hz.
    pub(crate) value: u64,
}

/// Something that happens from outside: a level on a pin, a fault of the display, or the power off and on.
#[derive(Clone, Debug)]
enum Stimulus {
    Pin(u8, bool),
    Display(&'static str),
    Power,
}

/// How the board is started.
#[derive(Default)]
pub(crate) struct Start {
    /// The machine, where not the one that was built in.
    pub(crate) machine: Option<(MachineSpec, Option<Setup>)>,
    /// Reading of the chip's timer at power-up, us.
    pub(crate) timer_us: u64,
    /// Transfers after which the capture's DMA is triggered anew for the first time; 0 leaves it as it is.
    pub(crate) first_count: u32,
    /// An SH1106 instead of an SSD1306, and the image for it.
    pub sh1106: bool,
    /// Without a display.
    pub(crate) no_display: bool,
    /// The flash takes as long as it ever may.
    pub(crate) slow_flash: bool,
}

/// The emulated board.
pub(crate) struct Emulator {
    process: Child,
    to: ChildStdin,
    from: BufReader<ChildStdout>,
    pins: BTreeMap<String, u8>,
    image: &'static Image,
    // Before the log that it reads, in the order of dropping.
    decoder: Box<dyn StreamDecoder + Send + Sync>,
    boot: u64,
    now: u64,
    waiting: Vec<(u64, Stimulus)>,
    /// Cycles in which the core was not asleep, since power-up.
    pub(crate) awake: u64,
    /// The log so far.
    pub(crate) log: Vec<Line>,
    /// Changes of the outputs so far.
    pub(crate) changes: Vec<Change>,
    /// Resets so far: when, and whether the watchdog's `timer` ran out or the reset was `forced`.
    pub(crate) resets: Vec<(u64, String)>,
    /// Calls of watched functions so far: name, cycles, when they returned.
    pub(crate) calls: Vec<(String, u64, u64)>,
    /// Bytes sent to the display so far.
    pub(crate) display_bytes: u64,
    /// How often the watchdog was fed since power-up, each time because every task had checked in.
    pub(crate) feeds: u64,
    /// The longest time between two feeds, ns.
    pub(crate) longest_unfed: u64,
    outputs: Outputs,
    frame: Frame,
    verdict: Verdict,
    reading: Reading,
}

impl Emulator {
    /// Switches the board on. Panics with what is missing where the emulator or the image is.
    pub(crate) fn start(start: Start) -> Self {
        let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("emulator");
        assert!(
            folder.join("node_modules/rp2040js/package.json").exists(),
            "the emulator is not installed: run `npm ci` in {}",
            folder.display()
        );
        let mut process = Command::new("node")
            .arg(folder.join("main.mjs"))
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .spawn()
            .unwrap_or_else(|e| {
                panic!("Node.js cannot be run ({e}): the board checks need version 20 or later")
            });
        let to = process.stdin.take().expect("is piped");
        let from = BufReader::new(process.stdout.take().expect("is piped"));
        let image: &Image = if start.sh1106 { &IMAGE_SH1106 } else { &IMAGE };
        let mut emulator = Emulator {
            process,
            to,
            from,
            pins: pins(),
            image,
            decoder: image.table.new_stream_decoder(),
            boot: 0,
            now: 0,
            waiting: Vec::new(),
            awake: 0,
            log: Vec::new(),
            changes: Vec::new(),
            resets: Vec::new(),
            calls: Vec::new(),
            display_bytes: 0,
            feeds: 0,
            longest_unfed: 0,
            outputs: Outputs::default(),
            frame: Frame::new(),
            verdict: Verdict::Unconfirmed,
            reading: Reading::NOTHING,
        };
        let flash = match &start.machine {
            None => image.flash.clone(),
            Some((machine, setup)) => image.flash_for(machine, setup.as_ref()),
        };
        emulator.ask(&json!({
            "do": "start",
            "flash": BASE64.encode(flash),
            "pins": wires(),
            "log": image.symbol("_SEGGER_RTT").0,
            "display": if start.sh1106 { "sh1106" } else { "ssd1306" },
            "timerUs": start.timer_us,
            "firstCount": start.first_count,
            "programNs": if start.slow_flash { 3_000_000 } else { 400_000 },
            "eraseNs": if start.slow_flash { 400_000_000 } else { 45_000_000 },
        }));
        if start.no_display {
            emulator.display("unplugged");
        }
        emulator
    }

    fn ask(&mut self, request: &Value) -> Value {
        writeln!(self.to, "{request}").expect("the emulator listens");
        let mut line = String::new();
        self.from
            .read_line(&mut line)
            .expect("the emulator answers");
        let answer: Value = serde_json::from_str(&line)
            .unwrap_or_else(|e| panic!("the emulator ended or speaks gibberish ({e}): {line}"));
        if let Some(error) = answer.get("error") {
            panic!("the emulator: {error}");
        }
        answer
    }

    /// Time since power-up, ns.
    pub(crate) fn now(&self) -> u64 {
        self.now
    }

    /// Lets time pass up to `until`, ns since power-up.
    pub(crate) fn run_until(&mut self, until: u64) {
        let (mut due, later): (Vec<_>, Vec<_>) = std::mem::take(&mut self.waiting)
            .into_iter()
            .partition(|(at, _)| *at < until);
        self.waiting = later;
        due.sort_by_key(|(at, _)| *at);
        let now = self.now;
        let stimuli: Vec<Value> = due
            .iter()
            .map(|(at, what)| {
                let at = at.saturating_sub(now);
                match what {
                    Stimulus::Pin(pin, level) => json!([at, pin, u8::from(*level)]),
                    Stimulus::Display(fault) => json!([at, "display", fault]),
                    Stimulus::Power => json!([at, "power", 0]),
                }
            })
            .collect();
        let answer = self.ask(&json!({ "do": "run", "ns": until - now, "stimuli": stimuli }));
        self.take(&answer);
        self.now = until;
    }

    /// Lets some time pass, ms.
    pub(crate) fn run_ms(&mut self, ms: u64) {
        self.run_until(self.now + ms * 1_000_000);
    }

    fn take(&mut self, answer: &Value) {
        let problems = answer["problems"].as_array().expect("is a list");
        for problem in problems.iter().filter_map(Value::as_str) {
            assert!(is_harmless(problem), "the emulator: {problem}");
        }
        self.awake = number(&answer["awake"]);
        for piece in answer["log"].as_array().expect("is a list") {
            let (at, boot) = (number(&piece[0]), number(&piece[1]));
            if boot != self.boot {
                self.boot = boot;
                self.decoder = self.image.table.new_stream_decoder();
                self.verdict = Verdict::Unconfirmed;
                self.reading = Reading::NOTHING;
            }
            let bytes = BASE64.decode(word(&piece[2])).expect("is base64");
            self.decoder.received(&bytes);
            self.read_log(at);
        }
        for event in answer["events"].as_array().expect("is a list") {
            let change = Change {
                at: number(&event[0]),
                what: word(&event[1]).to_owned(),
                value: number(&event[2]),
            };
            let on = change.value != 0;
            match change.what.as_str() {
                "over" => self.outputs.over = on,
                "right" => self.outputs.right = on,
                "under" => self.outputs.under = on,
                "relay" => self.outputs.relay = on,
                "buzzer" => self.outputs.buzzer_hz = on.then_some(change.value as u16),
                _ => {}
            }
            self.changes.push(change);
        }
        for reset in answer["resets"].as_array().expect("is a list") {
            self.resets
                .push((number(&reset[0]), word(&reset[1]).to_owned()));
        }
        for call in answer["calls"].as_array().expect("is a list") {
            self.calls.push((
                word(&call[0]).to_owned(),
                number(&call[1]),
                number(&call[2]),
            ));
        }
        self.display_bytes = number(&answer["displayBytes"]);
        self.feeds = number(&answer["feeds"]);
        self.longest_unfed = number(&answer["longestUnfed"]);
        let Some(picture) = answer["picture"].as_str() else {
            return;
        };
        let bytes = BASE64.decode(picture).expect("is base64");
        for (i, byte) in bytes.iter().enumerate() {
            let (page, x) = (i as u32 / 128, i as u32 % 128);
            for bit in 0..8 {
                self.frame.set(x, page * 8 + bit, byte & (1 << bit) != 0);
            }
        }
    }

    fn read_log(&mut self, at: u64) {
        loop {
            match self.decoder.decode() {
                Ok(frame) => {
                    let text = frame.display_message().to_string();
                    if let Some(verdict) = text.strip_prefix("verdict ") {
                        self.verdict = verdict_named(verdict);
                    } else if let Some(reading) = text.strip_prefix("reading ") {
                        self.reading = reading_of(reading);
                    }
                    if std::env::var_os("RIMRATE_LOG").is_some() {
                        println!("{:10.3} ms  {text}", at as f64 / 1e6);
                    }
                    let boot = self.boot;
                    self.log.push(Line { at, boot, text });
                }
                Err(DecodeError::UnexpectedEof) => break,
                Err(DecodeError::Malformed) => panic!("the log is malformed"),
            }
        }
    }

    /// The lines of the log that begin like this.
    pub(crate) fn lines<'a>(&'a self, start: &'a str) -> impl DoubleEndedIterator<Item = &'a Line> {
        self.log.iter().filter(move |l| l.text.starts_with(start))
    }

    /// A number of the last `counts` line before each reset or power cut, and of the last one.
    pub(crate) fn count(&self, name: &str) -> u64 {
        let last_of = |boot| self.lines("counts ").rfind(|l| l.boot == boot);
        let number = |line: &Line| {
            let mut words = line.text.split_whitespace().skip_while(|w| *w != name);
            words.nth(1).and_then(|n| n.parse::<u64>().ok())
        };
        (0..=self.boot)
            .filter_map(|boot| number(last_of(boot)?))
            .sum()
    }

    /// Sets a pin, `ns` from now.
    pub(crate) fn pin_in(&mut self, ns: u64, name: &str, level: bool) {
        let pin = self.pins[name];
        self.waiting
            .push((self.now + ns, Stimulus::Pin(pin, level)));
    }

    /// The sensor's line changes at these times.
    pub(crate) fn edges(&mut self, edges: &[Edge]) {
        let pin = self.pins["sensor"];
        self.waiting.extend(
            edges
                .iter()
                .map(|e| (e.at.nanos(), Stimulus::Pin(pin, e.kind == EdgeKind::Rise))),
        );
    }

    /// The display from now on: `none` for no fault, `unplugged`, `silent`, `stuck` (holds the data line until it gets
    /// nine clocks), or `corrupt` (once, and nobody is told).
    pub(crate) fn display(&mut self, fault: &'static str) {
        self.waiting.push((self.now, Stimulus::Display(fault)));
    }

    /// The power goes off and on, `ns` from now.
    pub(crate) fn cut_power(&mut self, ns: u64) {
        self.waiting.push((self.now + ns, Stimulus::Power));
    }

    /// Presses a knob now, for 0.1 s.
    pub(crate) fn press(&mut self, knob: Knob) {
        let pin = contact(knob, "push");
        self.pin_in(0, pin, false);
        self.pin_in(100_000_000, pin, true);
    }

    /// Counts cycles of these functions from now on.
    pub(crate) fn watch(&mut self, functions: &[(&str, &str)]) {
        let functions: serde_json::Map<String, Value> = functions
            .iter()
            .map(|(name, symbol)| ((*name).to_owned(), Value::from(self.image.symbol(symbol).0)))
            .collect();
        self.ask(&json!({ "do": "watch", "functions": functions }));
    }

    /// Bytes of flash or RAM.
    pub(crate) fn peek(&mut self, address: u64, length: u64) -> Vec<u8> {
        let answer = self.ask(&json!({ "do": "peek", "address": address, "length": length }));
        BASE64.decode(word(&answer["bytes"])).expect("is base64")
    }

    /// Changes bytes of flash or RAM behind the firmware's back.
    pub(crate) fn poke(&mut self, address: u64, bytes: &[u8]) {
        self.ask(&json!({ "do": "poke", "address": address, "bytes": BASE64.encode(bytes) }));
    }

    /// Bytes of stack used at most since the last reset: how far the paint is gone.
    pub(crate) fn stack_used(&mut self) -> u64 {
        let (end, _) = self.image.symbol("_stack_end");
        let (start, _) = self.image.symbol("_stack_start");
        let stack = self.peek(end, start - end);
        let untouched = stack.iter().take_while(|&&b| b == 0xcc).count() as u64;
        start - end - untouched
    }
}

impl Drop for Emulator {
    fn drop(&mut self) {
        // It ends by itself with its input; a failed check must not wait for that.
        let _ = self.process.kill();
        let _ = self.process.wait();
    }
}

impl Rig for Emulator {
    fn run(&mut self, edges: &[Edge], now: Instant) {
        self.edges(edges);
        if now.nanos() > self.now {
            self.run_until(now.nanos());
        }
    }

    fn touch(&mut self, touch: Touch) {
        match touch {
            Touch::Turn(knob, detents) => {
                // Clockwise the first contact closes first.
                let (first, second) = if detents > 0 { ("a", "b") } else { ("b", "a") };
                let steps = [
                    (first, false),
                    (second, false),
                    (first, true),
                    (second, true),
                ];
                for i in 0..u64::from(detents.unsigned_abs()) {
                    for (j, (name, level)) in (0..).zip(steps) {
                        self.pin_in((4 * i + j) * CONTACT, contact(knob, name), level);
                    }
                }
            }
            Touch::Press(knob) => self.pin_in(0, contact(knob, "push"), false),
            Touch::Release(knob) => self.pin_in(0, contact(knob, "push"), true),
        }
    }

    fn power_cycle(&mut self) {
        self.cut_power(0);
    }
    fn frame(&self) -> &Frame {
        &self.frame
    }
    fn outputs(&self) -> Outputs {
        self.outputs
    }
    fn verdict(&self) -> Verdict {
        self.verdict
    }
    fn reading(&self) -> Reading {
        self.reading
    }
}

fn contact(knob: Knob, name: &str) -> &'static str {
    match (knob, name) {
        (Knob::Left, "a") => "knob_left_a",
        (Knob::Left, "b") => "knob_left_b",
        (Knob::Left, _) => "knob_left_push",
        (Knob::Right, "a") => "knob_right_a",
        (Knob::Right, "b") => "knob_right_b",
        (Knob::Right, _) => "knob_right_push",
    }
}

/// Registers that the emulator does not know and that only set up what it does not model: ring oscillator, core voltage,
/// hold time of the I2C data line, waking from dormant mode. Everything else that it does not know fails the check.
fn is_harmless(problem: &str) -> bool {
    problem.starts_with("ROSC_BASE: Unimplemented peripheral write")
        || problem.starts_with("VREG_AND_CHIP_RESET_BASE: Unimplemented peripheral")
        || problem == "I2C0: Unimplemented write to IC_SDA_HOLD"
        || problem.starts_with("SSI: Unimplemented")
        || problem.starts_with("IO_BANK0_BASE: Unimplemented peripheral read from 0x16")
        || problem.starts_with("IO_BANK0_BASE: Unimplemented peripheral write to 0x16")
}

fn number(value: &Value) -> u64 {
    value.as_f64().expect("is a number").round() as u64
}

fn word(value: &Value) -> &str {
    value.as_str().expect("is a text")
}

fn verdict_named(name: &str) -> Verdict {
    use Verdict::*;
    let all = [
        Danger,
        Unconfirmed,
        Lost,
        Doubtful,
        NoPulses,
        Fast,
        NoAdvice,
        NeedsCap,
        RunUp,
        Slow,
        Right,
    ];
    all.into_iter()
        .find(|v| format!("{v:?}") == name)
        .unwrap_or_else(|| panic!("the log speaks of a verdict `{name}`"))
}

/// From `Turning calm 640.0 quick 640.0 overdue false uncertainty 0.00003`.
fn reading_of(text: &str) -> Reading {
    let words: Vec<&str> = text.split_whitespace().collect();
    let signal = match words[0] {
        "Still" => Signal::Still,
        "Turning" => Signal::Turning,
        "Lost" => Signal::Lost,
        "Doubtful" => Signal::Doubtful,
        other => panic!("the log speaks of a signal `{other}`"),
    };
    let speed = |word: &str| word.parse::<f32>().ok().and_then(|n| Rpm::new(n).ok());
    Reading {
        signal,
        speed: speed(words[2]),
        quick: speed(words[4]),
        overdue: words[6] == "true",
        uncertainty: words[8].parse().expect("a number"),
        ..Reading::NOTHING
    }
}
