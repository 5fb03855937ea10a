//! What the RP2040 and RP2350 boards have in common: parts wired up for the tasks.

use core::cell::UnsafeCell;

use embassy_rp::Peri;
use embassy_rp::gpio::{Flex, Input, Level, Output, Pull};
use embassy_rp::i2c::{Async, I2c};
use embassy_rp::pac;
use embassy_rp::peripherals::{DMA_CH0, DMA_CH1, FLASH};
use embassy_rp::pio::{Config, FifoJoin, Pio, ShiftDirection};
use embassy_rp::pwm::{self, Pwm};
use embassy_rp::watchdog::Watchdog;
use embassy_time::{Duration, Instant, Timer};
use rimrate_core::beacon::Outputs;

use super::{Board, CapturePio, DisplayI2c, DisplayScl, DisplaySda, Irqs, SYS_HZ};

/// Fast-mode I2C (SSD1306 data sheet rev 1.1, table 13-6: cycle time at least 2.5 us).
const I2C_HZ: u32 = 400_000;

/// The board, wired up.
pub(crate) struct Parts {
    /// The sensor's edges.
    pub(crate) capture: Capture,
    /// Left and right knob.
    pub(crate) knobs: [Encoder; 2],
    /// The display's bus.
    pub(crate) display: Display,
    /// Lamps, buzzer, relay.
    pub(crate) signs: Signs,
    /// The watchdog, not yet started.
    pub(crate) watchdog: Watchdog,
    /// Where something may be kept.
    pub(crate) flash: Peri<'static, FLASH>,
}

impl Board {
    /// Wires the parts up: the relay opens first.
    pub(crate) fn wire(self) -> Parts {
        let signs = Signs {
            relay: Output::new(self.relay, Level::Low),
            over: Output::new(self.lamp_over, Level::Low),
            right: Output::new(self.lamp_right, Level::Low),
            under: Output::new(self.lamp_under, Level::Low),
            status: Output::new(self.status, Level::Low),
            tone: Pwm::new_output_b(self.tone, self.buzzer, tone(None)),
            last: Outputs::default(),
        };
        Parts {
            capture: Capture::start(self.capture, self.sensor, self.ring_dma, self.rearm_dma),
            knobs: [
                Encoder {
                    a: Input::new(self.knob_left_a, Pull::Up),
                    b: Input::new(self.knob_left_b, Pull::Up),
                    push: Input::new(self.knob_left_push, Pull::Up),
                },
                Encoder {
                    a: Input::new(self.knob_right_a, Pull::Up),
                    b: Input::new(self.knob_right_b, Pull::Up),
                    push: Input::new(self.knob_right_push, Pull::Up),
                },
            ],
            display: Display {
                i2c: self.display,
                sda: self.display_sda,
                scl: self.display_scl,
            },
            signs,
            watchdog: Watchdog::new(self.watchdog),
            flash: self.flash,
        }
    }
}

/// Lets nothing sound, shine or close. For a panic.
pub(crate) fn outputs_safe() {
    // SAFETY: called with interrupts off, and the caller does not come back.
    let board = unsafe { Board::steal() };
    core::mem::forget((
        Output::new(board.relay, Level::Low),
        Output::new(board.buzzer, Level::Low),
        Output::new(board.lamp_over, Level::Low),
        Output::new(board.lamp_right, Level::Low),
        Output::new(board.lamp_under, Level::Low),
    ));
}

/// Resets the chip through the watchdog (RP2040 data sheet, 4.7).
pub(crate) fn restart() -> ! {
    // SAFETY: called with interrupts off, and the caller does not come back.
    let board = unsafe { Board::steal() };
    Watchdog::new(board.watchdog).trigger_reset();
    loop {
        cortex_m::asm::nop();
    }
}

/// Words in the ring: at the limit of 20,000 pulses/s, two edges each, 4096 words are 102 ms.
const RING_WORDS: usize = 4096;
/// The DMA may be this far into the words that are being read before they count as lost.
const RING_MARGIN: u32 = 64;
/// Words after which the DMA is triggered anew; a power of two, so that counts subtract across it, and within the 28 bits
/// of the RP2350 (RP2350 data sheet, 12.6.2.1). At the limit that happens every 56 minutes.
const BLOCK: u32 = 1 << 27;
/// What the second channel writes into the first one's count. In RAM: the flash may be busy when it is read.
#[unsafe(link_section = ".data.rearm")]
static REARM: u32 = BLOCK;

/// The ring that the DMA fills.
#[repr(C, align(16384))]
struct Ring(UnsafeCell<[u32; RING_WORDS]>);

// SAFETY: written by the DMA alone, read by `Capture` alone, word by word and volatile.
unsafe impl Sync for Ring {}

#[unsafe(link_section = ".ring")]
static RING: Ring = Ring(UnsafeCell::new([0; RING_WORDS]));

/// The sensor's edges, timed by a PIO state machine and carried into a ring by DMA.
///
/// X counts down once every [`Capture::TICK_CYCLES`] cycles, whatever the line does, so it is a clock that neither an edge
/// nor a lost word can shift. At an edge its value is pushed, with the direction as the lowest bit. `push noblock` never
/// stalls the clock; a full FIFO raises a sticky flag instead. Two DMA channels take turns: the first fills the ring, and
/// where its count ends the second one writes the count anew, which triggers the first (RP2040 data sheet, 2.5.3): it never
/// ends, and the FIFO's eight words bridge the turn.
pub(crate) struct Capture {
    pio: Pio<'static, CapturePio>,
    seen: u32,
    started: Instant,
    // Held so that nothing else gets them.
    _dma: (Peri<'static, DMA_CH0>, Peri<'static, DMA_CH1>),
}

/// New words in the ring.
pub(crate) struct Fresh {
    /// How many can be pulled.
    pub(crate) count: u32,
    /// Words were lost since the last time.
    pub(crate) lost: bool,
}

impl Capture {
    /// Cycles of one count of X: both loops of the program below, and every edge path in whole multiples.
    pub(crate) const TICK_CYCLES: u32 = 3;
    /// Nanoseconds of one count.
    pub(crate) const TICK_NS: u64 = {
        let ns = Self::TICK_CYCLES as u64 * 1_000_000_000 / SYS_HZ as u64;
        assert!(ns * SYS_HZ as u64 == Self::TICK_CYCLES as u64 * 1_000_000_000);
        ns
    };
    /// Bits of the count in a word.
    pub(crate) const BITS: u32 = 31;
    /// A fall is seen in the count after the one that sampled it, a rise in the same.
    pub(crate) const FALL_LATE: u32 = 1;

    fn start(
        pio: Peri<'static, CapturePio>,
        pin: Peri<'static, impl embassy_rp::pio::PioPin>,
        ring_dma: Peri<'static, DMA_CH0>,
        rearm_dma: Peri<'static, DMA_CH1>,
    ) -> Self {
        let mut pio = Pio::new(pio, Irqs);
        // `jmp x--` to the next line counts without branching, so X passes through zero like any other value.
        let program = embassy_rp::pio::program::pio_asm!(
            ".wrap_target",
            "low:",
            "    jmp x-- look_low",
            "look_low:",
            "    jmp pin rose",
            "    jmp low",
            "rose:",
            "    mov isr, x",
            "    jmp x-- rise_word",
            "rise_word:",
            "    in null, 1",
            "    push noblock",
            "public high:",
            "    jmp x-- look_high",
            "look_high:",
            "    jmp pin high [1]",
            "    jmp x-- fall_word",
            "fall_word:",
            "    mov isr, x",
            "    in y, 1",
            "    jmp x-- fall_push",
            "fall_push:",
            "    push noblock [1]",
            ".wrap",
        );
        let mut pin = pio.common.make_pio_pin(pin);
        pin.set_pull(Pull::Up);
        pin.set_schmitt(true);
        let mut config = Config::default();
        let loaded = pio.common.load_program(&program.program);
        config.use_program(&loaded, &[]);
        config.set_jmp_pin(&pin);
        config.fifo_join = FifoJoin::RxOnly;
        config.shift_in.direction = ShiftDirection::Left;
        pio.sm0.set_config(&config);
        // SAFETY: the machine stands still and these instructions only set a register.
        unsafe {
            // SET: 111, delay 5 bits, destination 3 bits, data 5 bits (RP2040 data sheet, 3.4.10).
            const SET_X_0: u16 = 0xe020;
            const SET_Y_1: u16 = 0xe041;
            pio.sm0.exec_instr(SET_X_0);
            pio.sm0.exec_instr(SET_Y_1);
            // At rest the line is high; begun as if it were low, the first look would be taken for an edge. A jump's target is
            // its lowest bits.
            pio.sm0
                .exec_instr(u16::from(loaded.origin) + program.public_defines.high as u16);
        }

        let from = pio.sm0.rx_fifo_ptr() as u32;
        let (ring, rearm) = (pac::DMA.ch(0), pac::DMA.ch(1));
        rearm.read_addr().write_value(&raw const REARM as u32);
        rearm
            .write_addr()
            .write_value(ring.al1_trans_count_trig().as_ptr() as u32);
        super::set_count(rearm, 1);
        let mut control = pac::dma::regs::CtrlTrig(0);
        control.set_data_size(pac::dma::vals::DataSize::SIZE_WORD);
        control.set_treq_sel(pac::dma::vals::TreqSel::PERMANENT);
        control.set_chain_to(1);
        control.set_irq_quiet(true);
        control.set_en(true);
        // The alias without a trigger (2.5.2.1).
        rearm.al1_ctrl().write_value(control.0);

        ring.read_addr().write_value(from);
        ring.write_addr().write_value(RING.0.get() as u32);
        super::set_count(ring, BLOCK);
        let mut control = pac::dma::regs::CtrlTrig(0);
        control.set_data_size(pac::dma::vals::DataSize::SIZE_WORD);
        control.set_treq_sel(pio.sm0.rx_treq());
        control.set_incr_write(true);
        control.set_ring_sel(true);
        control.set_ring_size(size_of::<Ring>().trailing_zeros() as u8);
        control.set_chain_to(1);
        control.set_high_priority(true);
        control.set_irq_quiet(true);
        control.set_en(true);
        ring.ctrl_trig().write_value(control);

        // The time is taken before the count starts: an edge never seems later than it was.
        let started = Instant::now();
        let seen = super::count_left(ring);
        pio.sm0.set_enable(true);
        Capture {
            pio,
            seen,
            started,
            _dma: (ring_dma, rearm_dma),
        }
    }

    /// When the count began.
    pub(crate) fn started(&self) -> Instant {
        self.started
    }

    /// Looks how much there is. After a loss everything so far is passed over.
    pub(crate) fn look(&mut self) -> Fresh {
        let left = super::count_left(pac::DMA.ch(0));
        let count = self.seen.wrapping_sub(left) % BLOCK;
        // Dropped by a full FIFO: the DMA did not get the bus for eight words.
        let stalled = self.pio.sm0.rx().stalled();
        let lost = stalled || count > RING_WORDS as u32 - RING_MARGIN;
        if lost {
            self.seen = left;
        }
        Fresh {
            count: if lost { 0 } else { count },
            lost,
        }
    }

    /// The next word: not more often than [`Fresh::count`] says.
    pub(crate) fn pull(&mut self) -> u32 {
        // The DMA's place in the ring follows from its count: it began with `BLOCK` left, at the ring's start.
        let place = BLOCK.wrapping_sub(self.seen) as usize % RING_WORDS;
        self.seen = self.seen.wrapping_sub(1) % BLOCK;
        // SAFETY: within the ring; the DMA may write it at the same time, which `look` has ruled out by its margin.
        unsafe { RING.0.get().cast::<u32>().add(place).read_volatile() }
    }
}

/// The contacts of one knob, all low when closed.
pub(crate) struct Encoder {
    /// First contact.
    pub(crate) a: Input<'static>,
    /// Second contact.
    pub(crate) b: Input<'static>,
    /// Push switch.
    pub(crate) push: Input<'static>,
}

/// The display's bus.
pub(crate) struct Display {
    i2c: Peri<'static, DisplayI2c>,
    sda: Peri<'static, DisplaySda>,
    scl: Peri<'static, DisplayScl>,
}

impl Display {
    /// Sets the controller up anew, whatever state it was in.
    pub(crate) fn open(&mut self) -> I2c<'_, DisplayI2c, Async> {
        let mut config = embassy_rp::i2c::Config::default();
        config.frequency = I2C_HZ;
        I2c::new_async(
            self.i2c.reborrow(),
            self.scl.reborrow(),
            self.sda.reborrow(),
            Irqs,
            config,
        )
    }

    /// Frees a bus whose data line a confused device holds low: nine clocks, then a stop (I2C-bus specification UM10204
    /// rev 7, 3.1.16). Says whether the line is high in the end.
    pub(crate) async fn free(&mut self) -> bool {
        // A quarter of 100 kHz, the slowest mode: any device follows.
        const HALF: Duration = Duration::from_micros(20);
        let mut scl = Flex::new(self.scl.reborrow());
        let mut sda = Flex::new(self.sda.reborrow());
        for line in [&mut scl, &mut sda] {
            // Open drain: the level is low for ever, the direction is the signal.
            line.set_pull(Pull::Up);
            line.set_low();
            line.set_as_input();
        }
        for _ in 0..9 {
            scl.set_as_output();
            Timer::after(HALF).await;
            scl.set_as_input();
            Timer::after(HALF).await;
        }
        scl.set_as_output();
        Timer::after(HALF).await;
        sda.set_as_output();
        Timer::after(HALF).await;
        scl.set_as_input();
        Timer::after(HALF).await;
        sda.set_as_input();
        Timer::after(HALF).await;
        sda.is_high()
    }
}

/// Lamps, buzzer and relay.
pub(crate) struct Signs {
    over: Output<'static>,
    right: Output<'static>,
    under: Output<'static>,
    relay: Output<'static>,
    status: Output<'static>,
    tone: Pwm<'static>,
    last: Outputs,
}

impl Signs {
    /// Shows these outputs.
    pub(crate) fn show(&mut self, now: Outputs) {
        self.over.set_level(now.over.into());
        self.right.set_level(now.right.into());
        self.under.set_level(now.under.into());
        self.relay.set_level(now.relay.into());
        if now.buzzer_hz != self.last.buzzer_hz {
            self.tone.set_config(&tone(now.buzzer_hz));
        }
        self.last = now;
    }

    /// Lights the board's own lamp.
    pub(crate) fn status(&mut self, on: bool) {
        self.status.set_level(on.into());
    }
}

/// A square wave of this pitch, or silence: the PWM counts microseconds (RP2040 data sheet, 4.5.2.6).
fn tone(hz: Option<u16>) -> pwm::Config {
    const COUNT_HZ: u32 = 1_000_000;
    let mut config = pwm::Config::default();
    config.divider = ((SYS_HZ / COUNT_HZ) as u8).into();
    match hz.map(u32::from).filter(|&hz| hz > COUNT_HZ / 0x1_0000) {
        Some(hz) => {
            let period = COUNT_HZ / hz;
            config.top = (period - 1) as u16;
            config.compare_b = (period / 2) as u16;
        }
        None => config.compare_b = 0,
    }
    config
}
