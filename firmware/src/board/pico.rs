//! Raspberry Pi Pico (RP2040).

use embassy_rp::pac;

use super::parts;

/// What the log calls it.
pub(crate) const NAME: &str = "Pico (RP2040)";
/// The system clock that `embassy_rp` sets: PLL_SYS at 125 MHz from the 12 MHz crystal (RP2040 data sheet, 2.18.2).
pub(crate) const SYS_HZ: u32 = 125_000_000;

/// Bytes of flash: the Pico has 2 MiB (Raspberry Pi Pico data sheet, 1).
pub(crate) const FLASH_BYTES: u32 = 2 * 1024 * 1024;

/// The display's I2C.
pub(crate) type DisplayI2c = embassy_rp::peripherals::I2C0;
/// The display's data pin.
pub(crate) type DisplaySda = embassy_rp::peripherals::PIN_4;
/// The display's clock pin.
pub(crate) type DisplayScl = embassy_rp::peripherals::PIN_5;
/// The PIO that times the sensor.
pub(crate) type CapturePio = embassy_rp::peripherals::PIO0;

embassy_rp::bind_interrupts!(pub(crate) struct Irqs {
    I2C0_IRQ => embassy_rp::i2c::InterruptHandler<DisplayI2c>;
    PIO0_IRQ_0 => embassy_rp::pio::InterruptHandler<CapturePio>;
});

// What is outside of the Pico stands in hardware/pins.csv, too, under the same names.
parts! {
    /// Hall sensor, open collector: low while a magnet is near.
    sensor: PIN_2,
    /// Display, I2C data.
    display_sda: PIN_4,
    /// Display, I2C clock.
    display_scl: PIN_5,
    /// Left knob, first contact; closes to ground, as all of a knob's.
    knob_left_a: PIN_6,
    /// Left knob, second contact.
    knob_left_b: PIN_7,
    /// Left knob, push switch.
    knob_left_push: PIN_8,
    /// Right knob, first contact.
    knob_right_a: PIN_9,
    /// Right knob, second contact.
    knob_right_b: PIN_10,
    /// Right knob, push switch.
    knob_right_push: PIN_11,
    /// Upper lamp: over.
    lamp_over: PIN_12,
    /// Middle lamp: right.
    lamp_right: PIN_13,
    /// Lower lamp: under.
    lamp_under: PIN_14,
    /// Relay driver, closed while high; held low by a resistor during reset.
    relay: PIN_16,
    /// Buzzer, piezo, driven by PWM.
    buzzer: PIN_15,
    /// The board's own lamp: a heartbeat, hurried while something is wrong with the box.
    status: PIN_25,
    /// Times the sensor.
    capture: PIO0,
    /// Carries edges into the ring.
    ring_dma: DMA_CH0,
    /// Starts it again when its count has run out.
    rearm_dma: DMA_CH1,
    /// Drives the display.
    display: I2C0,
    /// Sounds the buzzer: GPIO15 is output B of slice 7 (RP2040 data sheet, 4.5.2).
    tone: PWM_SLICE7,
    /// Restarts what hangs.
    watchdog: WATCHDOG,
    /// Holds the program, and what the operator chose last.
    flash: FLASH,
}

/// Transfers that a DMA channel has left (RP2040 data sheet, 2.5.7).
pub(crate) fn count_left(channel: pac::dma::Channel) -> u32 {
    channel.trans_count().read()
}

/// Sets the transfers of a DMA channel.
pub(crate) fn set_count(channel: pac::dma::Channel, count: u32) {
    channel.trans_count().write_value(count);
}
