// A 128 x 64 display of the SSD1306 class as its controller sees the bus: SSD1306 data sheet rev 1.1, 8.1.5.2 (control
// bytes), 10.1 (commands). An SH1106 has 132 columns of memory and shows the middle ones (SH1106 data sheet rev 2.3).

const PAGES = 8;

/** Commands with bytes after them; what is not here has none. */
const ARGUMENTS = new Map([
  [0x20, 1], [0x81, 1], [0x8d, 1], [0xa8, 1], [0xad, 1], [0xd3, 1], [0xd5, 1], [0xd9, 1], [0xda, 1], [0xdb, 1],
  [0x21, 2], [0x22, 2],
]);

export class Display {
  /** @param {'ssd1306' | 'sh1106'} kind */
  constructor(kind, seed = 1) {
    this.sh1106 = kind === 'sh1106';
    this.columns = this.sh1106 ? 132 : 128;
    this.seed = seed;
    this.problems = [];
    this.bytes = 0;
    this.powerUp();
  }

  /** Registers as after reset, memory as noise: nothing clears it. */
  powerUp() {
    this.memory = Array.from({ length: PAGES }, () => Uint8Array.from({ length: this.columns }, () => this.#random()));
    this.on = false;
    this.inverse = false;
    this.allOn = false;
    this.pump = false;
    this.startLine = 0;
    this.shift = 0;
    this.rows = 64;
    this.remapped = false;
    this.reversed = false;
    this.mode = 2;
    this.page = 0;
    this.column = 0;
    this.command = [];
    this.changed = true;
    this.start();
  }

  /** Noise on the supply: some bytes and one register change, and nobody is told. */
  corrupt() {
    for (let i = 0; i < 40; i++) {
      this.memory[this.#random() % PAGES][this.#random() % this.columns] ^= 1 << (this.#random() % 8);
    }
    this.startLine = 13;
    this.inverse = true;
    this.changed = true;
  }

  #random() {
    // Numerical Recipes' linear congruential generator; only to have some noise.
    this.seed = (Math.imul(this.seed, 1664525) + 1013904223) >>> 0;
    return this.seed >>> 24;
  }

  /** A start condition with this display's address. */
  start() {
    this.control = true;
    this.only = false;
    this.data = false;
  }

  /** One byte after the address. */
  byte(value) {
    this.bytes++;
    this.changed = true;
    if (this.control) {
      this.only = !(value & 0x80);
      this.data = !!(value & 0x40);
      this.control = false;
      return;
    }
    if (this.data) {
      this.#store(value);
    } else {
      this.#command(value);
    }
    if (!this.only) {
      this.control = true;
    }
  }

  #store(value) {
    if (this.column < this.columns) {
      this.memory[this.page][this.column] = value;
    }
    // Page addressing: the column goes round, the page stays (10.1.3).
    this.column = (this.column + 1) % this.columns;
  }

  #command(value) {
    this.command.push(value);
    const [code, ...args] = this.command;
    if (args.length < (ARGUMENTS.get(code) ?? 0)) {
      return;
    }
    this.command = [];
    if (code <= 0x0f) this.column = (this.column & 0xf0) | code;
    else if (code <= 0x1f) this.column = (this.column & 0x0f) | ((code & 0x0f) << 4);
    else if (code === 0x20) this.mode = args[0] & 3;
    else if (code >= 0x40 && code <= 0x7f) this.startLine = code & 0x3f;
    else if (code === 0x8d) this.pump = !!(args[0] & 4);
    else if (code === 0xad) this.pump = args[0] === 0x8b;
    else if (code === 0xa0 || code === 0xa1) this.remapped = code === 0xa1;
    else if (code === 0xa4 || code === 0xa5) this.allOn = code === 0xa5;
    else if (code === 0xa6 || code === 0xa7) this.inverse = code === 0xa7;
    else if (code === 0xa8) this.rows = (args[0] & 0x3f) + 1;
    else if (code === 0xae || code === 0xaf) this.on = code === 0xaf;
    else if (code >= 0xb0 && code <= 0xb7) this.page = code & 7;
    else if (code === 0xc0 || code === 0xc8) this.reversed = code === 0xc8;
    else if (code === 0xd3) this.shift = args[0] & 0x3f;
    else if (![0x81, 0xd5, 0xd9, 0xda, 0xdb, 0xe3].includes(code)) {
      this.problems.push(`display: unknown command 0x${code.toString(16)}`);
    }
    if (this.mode !== 2 && !this.sh1106) {
      this.problems.push(`display: addressing mode ${this.mode} is not modelled`);
    }
  }

  /** What a person sees with the connector on top: 8 pages of 128 bytes, the lowest bit on top. */
  picture() {
    this.changed = false;
    const picture = new Uint8Array(PAGES * 128);
    if (!this.on || !this.pump) {
      return picture;
    }
    const offset = this.sh1106 ? 2 : 0;
    for (let y = 0; y < 64; y++) {
      const row = (y + this.startLine + this.shift) % 64;
      for (let x = 0; x < 128; x++) {
        const stored = !!(this.memory[row >> 3][x + offset] & (1 << (row & 7)));
        const lit = this.allOn || (stored !== this.inverse && y < this.rows);
        if (lit) {
          const [px, py] = [this.remapped ? x : 127 - x, this.reversed ? y : 63 - y];
          picture[(py >> 3) * 128 + px] |= 1 << (py & 7);
        }
      }
    }
    return picture;
  }
}
