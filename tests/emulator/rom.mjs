// The boot ROM's functions that writing to the flash calls (RP2040 data sheet, 2.8.3); the emulator has no boot ROM. Each is a
// breakpoint and a return. What the flash chip does to its cells is as in the W25Q16JV data sheet: programming clears bits
// only (8.2.15), erasing sets all of a sector (8.2.17); for so long nothing runs but the PIO, the DMA and the world outside.

const CALL = 0xa0;
const CODE = 0x100;
const FUNCTIONS = ['lookup', 'IF', 'EX', 'RE', 'RP', 'FC', 'C4'];
const BX_LR = 0x4770;
const BKPT = 0xbe00;
const FLASH = 0x10000000;
const SRAM = 0x20000000;
const PAGE = 256;
const SECTOR = 4096;

export class Rom {
  /**
   * @param image the flash's cells, which outlive this machine
   * @param times ns that a page is programmed and a sector erased
   */
  constructor(mcu, image, { programNs, eraseNs }, problems) {
    this.mcu = mcu;
    this.image = image;
    this.times = { programNs, eraseNs };
    this.problems = problems;
    /** What the flash chip is about, and since when and until when: ns of the machine's clock. */
    this.work = null;
    this.until = Infinity;
    const bytes = new DataView(mcu.bootrom.buffer);
    // Magic and version, function table, data table, look-up (2.8.2).
    bytes.setUint32(0x10, 0x0201754d, true);
    bytes.setUint16(0x14, CODE, true);
    bytes.setUint16(0x16, CODE, true);
    bytes.setUint16(0x18, CODE | 1, true);
    FUNCTIONS.forEach((_, i) => {
      bytes.setUint16(CODE + 4 * i, BKPT | (CALL + i), true);
      bytes.setUint16(CODE + 4 * i + 2, BX_LR, true);
    });
  }

  /** Whether a breakpoint at this address is one of the functions. */
  has(address) {
    return address >= CODE && address < CODE + 4 * FUNCTIONS.length;
  }

  call(code) {
    const { core, sram } = this.mcu;
    const [a, b, c] = core.registers;
    switch (FUNCTIONS[code - CALL]) {
      case 'lookup': {
        const name = String.fromCharCode(b & 0xff, b >> 8);
        const at = FUNCTIONS.indexOf(name);
        if (at < 0) {
          this.problems.push(`no function ${name} in the boot ROM`);
        }
        core.registers[0] = at < 0 ? 0 : (CODE + 4 * at) | 1;
        break;
      }
      case 'C4':
        for (let i = 0; i < c; i += 4) {
          this.mcu.writeUint32(a + i, this.mcu.readUint32(b + i));
        }
        break;
      case 'RE':
        this.#begin({ from: a, length: b, data: null, ns: (this.times.eraseNs * b) / SECTOR });
        break;
      case 'RP':
        this.#begin({
          from: a,
          length: c,
          data: sram.slice(b - SRAM, b - SRAM + c),
          ns: (this.times.programNs * c) / PAGE,
        });
        break;
    }
  }

  #begin(work) {
    const { mcu } = this;
    if (mcu.core.LR < SRAM || work.from % (work.data ? PAGE : SECTOR) || work.length % (work.data ? PAGE : SECTOR)) {
      this.problems.push(`the flash is written to from 0x${mcu.core.LR.toString(16)}: 0x${work.from.toString(16)}`);
    }
    this.work = { ...work, since: mcu.clock.nanos };
    this.until = mcu.clock.nanos + work.ns;
    const read = mcu.readUint32;
    mcu.readUint32 = (address) => {
      if (address >>> 28 === 1) {
        this.problems.push(`0x${address.toString(16)} of the flash is read while that is busy`);
      }
      return read.call(mcu, address);
    };
  }

  /** The flash chip is through. */
  finish() {
    const { mcu, work } = this;
    this.#apply(work.length);
    mcu.core.cycles += Math.round(work.ns / 8);
    this.#end();
  }

  /** The power fails: what the flash chip was about is half done. */
  cut() {
    if (!this.work) {
      return;
    }
    const { from, length, data, since, ns } = this.work;
    const done = Math.floor((length * (this.mcu.clock.nanos - since)) / ns);
    this.#apply(done);
    if (!data) {
      // Cells on their way are set, or not.
      for (let i = from + done; i < from + Math.min(done + PAGE, length); i++) {
        this.image[i] |= Math.imul(i, 0x9e3779b1) >>> 24;
      }
    }
    this.#end();
  }

  #apply(done) {
    const { from, data } = this.work;
    for (let i = 0; i < done; i++) {
      this.image[from + i] = data ? this.image[from + i] & data[i] : 0xff;
    }
    this.mcu.flash.set(this.image.subarray(from, from + done), from);
  }

  #end() {
    delete this.mcu.readUint32;
    this.work = null;
    this.until = Infinity;
  }
}
