//! Displays of the SSD1306, SSD1309 and SH1106 class on I2C, 128 x 64.
//!
//! Only page addressing is used, the one mode that all three have (SSD1306 data sheet rev 1.1, 10.1.3; SH1106 data sheet
//! rev 2.3, page 19), and only writes, since many modules do not answer reads.

use embedded_hal_async::i2c::I2c;

use crate::frame::{COLUMNS, PAGES};

/// Address with SA0 low (SSD1306 data sheet rev 1.1, 8.1.5.1).
const ADDRESS: u8 = 0x3c;
/// The SH1106 has 132 columns and shows the middle ones.
const FIRST_COLUMN: u8 = if cfg!(feature = "sh1106") { 2 } else { 0 };

/// The panel's own supply: SSD1306 charge pump on (application note 3.1), SH1106 converter on (command 9). The SSD1309 is
/// supplied from outside and has neither command.
const SUPPLY: [u8; 2] = if cfg!(feature = "sh1106") {
    [0xad, 0x8b]
} else {
    [0x8d, 0x14]
};

/// Control bytes: one command follows and then another control byte, or data up to the end (SSD1306 data sheet, 8.1.5.2).
const ONE_COMMAND: u8 = 0x80;
const COMMANDS: u8 = 0x00;
const DATA: u8 = 0x40;

/// Everything but the switch (SSD1306 data sheet rev 1.1, table 9-1 and application note; SH1106 data sheet, command table).
const SET_UP: &[u8] = &[
    COMMANDS, //
    0xd5, 0x80, // clock: ratio 1, oscillator at its middle
    0xa8, 0x3f, // 64 rows
    0xd3, 0x00, // no vertical shift
    0x40, // first row on top
    SUPPLY[0], SUPPLY[1], //
    0x20, 0x02, // page addressing
    0xa1, 0xc8, // connector on top: both directions reversed
    0xda, 0x12, // alternating common pins
    0x81, 0xcf, // contrast
    0xd9, 0xf1, // pre-charge 1, discharge 15 clocks
    0xdb, 0x40, // deselect level
    0xa4, 0xa6, // memory shown, one is bright
];
const SWITCH_ON: &[u8] = &[COMMANDS, 0xaf];

/// Bytes before the data of one write: page, column low, column high, each behind a control byte, and one for the data.
const HEAD: usize = 7;

/// One display.
pub(crate) struct Oled<I> {
    bus: I,
    line: [u8; HEAD + COLUMNS],
}

impl<I: I2c> Oled<I> {
    /// On this bus; nothing is sent yet.
    pub(crate) fn new(bus: I) -> Self {
        Oled {
            bus,
            line: [0; HEAD + COLUMNS],
        }
    }

    /// Sends every setting. What is shown stays shown.
    pub(crate) async fn set_up(&mut self) -> Result<(), I::Error> {
        self.bus.write(ADDRESS, SET_UP).await
    }

    /// Switches the picture on.
    pub(crate) async fn switch_on(&mut self) -> Result<(), I::Error> {
        self.bus.write(ADDRESS, SWITCH_ON).await
    }

    /// Sends a piece of a page, from `column` on. What would lie outside of the page is not sent.
    pub(crate) async fn write(
        &mut self,
        page: usize,
        column: usize,
        bytes: &[u8],
    ) -> Result<(), I::Error> {
        debug_assert!(page < PAGES && column + bytes.len() <= COLUMNS);
        let at = (column as u8).wrapping_add(FIRST_COLUMN);
        let head = [
            ONE_COMMAND,
            0xb0 | page as u8,
            ONE_COMMAND,
            at & 0x0f,
            ONE_COMMAND,
            0x10 | at >> 4,
            DATA,
        ];
        let count = HEAD + bytes.len().min(COLUMNS);
        for (to, &from) in self.line.iter_mut().zip(head.iter().chain(bytes)) {
            *to = from;
        }
        match self.line.get(..count) {
            Some(line) => self.bus.write(ADDRESS, line).await,
            None => Ok(()),
        }
    }
}
