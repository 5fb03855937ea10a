// The board on the bench: the emulated chip, the display, and wires to everything else.

import { RP2040 } from 'rp2040js';
import { SimulationClock } from './node_modules/rp2040js/dist/esm/clock/simulation-clock.js';
import { Display } from './display.mjs';
import * as measures from './measures.mjs';
import { Pios } from './pio.mjs';
import { Rom } from './rom.mjs';

const CYCLE_NS = 8;
const FLASH = 0x10000000;
/** The Pico's flash. */
const FLASH_BYTES = 2 * 1024 * 1024;
const LOG_MAGIC = 'SEGGER RTT';
const SRAM = 0x20000000;
const VECTORS = 0x10000100;
const ADDRESS = 0x3c;
/** The log's buffer holds 1 KiB. */
const LOG_NS = 1_000_000;
const PITCH_NS = 10_000;
const SIO = 5;
const LOW = 0;
const HIGH = 1;

export class Board {
  /**
   * @param flash the image from 0x10000000 on
   * @param pins what is wired to which pin: { over: 16, ... }
   * @param log address of the log's control block
   */
  constructor({ flash, pins, log, display = 'ssd1306', timerUs = 0, firstCount = 0, programNs, eraseNs }) {
    // A changed byte stays changed over a power cut, as in the chip.
    this.image = new Uint8Array(FLASH_BYTES).fill(0xff);
    this.image.set(flash);
    this.flashTimes = { programNs, eraseNs };
    this.pins = pins;
    this.log = log - SRAM;
    this.display = new Display(display);
    this.displayFault = 'none';
    this.clocksWhileStuck = 0;
    this.firstCount = firstCount;
    this.watched = new Map();
    this.problems = [];
    this.levels = new Map();
    this.events = [];
    this.text = [];
    this.awakeBefore = 0;
    this.feeds = 0;
    this.longestUnfed = 0;
    /** How many times it was reset: the log's decoder starts anew each time. */
    this.boot = 0;
    this.#start({ nanos: timerUs * 1000, epoch: -timerUs * 1000 });
  }

  /** Time since power-up, ns; goes on across resets. */
  get now() {
    return this.epoch + this.clock.nanos;
  }

  /** Cycles in which the core was not asleep. */
  get awake() {
    return this.awakeBefore + this.mcu.core.cycles;
  }

  #start({ nanos, epoch, kept }) {
    this.clock = new SimulationClock();
    this.clock.nanosCounter = nanos;
    this.epoch = epoch;
    const mcu = new RP2040(this.clock);
    this.mcu = mcu;
    mcu.logger = measures.logger(() => mcu.core, this.problems);
    mcu.flash.set(this.image);
    if (kept) {
      mcu.sram.set(kept.sram);
    }
    this.reset = null;
    let fedAt = Infinity;
    const watchdog = measures.watchdog(
      mcu,
      (w) => {
        this.reset = w;
      },
      () => {
        this.feeds++;
        this.longestUnfed = Math.max(this.longestUnfed, this.now - fedAt);
        fedAt = this.now;
      },
    );
    if (kept) {
      watchdog.reason = kept.reason;
      watchdog.scratchData.set(kept.scratch);
    }
    this.rom = new Rom(mcu, this.image, this.flashTimes, this.problems);
    measures.faults(mcu, this.rom, (pc) => this.problems.push(`locked up at 0x${pc.toString(16)}`));
    measures.flashControl(mcu);
    measures.timer(mcu);
    measures.pulls(mcu, new Set(this.levels.keys()));
    const device = (address) =>
      address === ADDRESS && (this.displayFault === 'none' || this.displayFault === 'stuck') ? this.display : undefined;
    measures.i2c(mcu, 0, device, () => this.displayFault === 'stuck');
    this.pios = new Pios(mcu);
    for (const [pin, level] of this.levels) {
      mcu.gpio[pin].setInputValue(!!level);
    }
    this.#wire();
    if (this.firstCount) {
      this.#shortenFirstCount();
    }
    mcu.core.VTOR = VECTORS;
    mcu.core.SP = mcu.readUint32(VECTORS);
    mcu.core.PC = mcu.readUint32(VECTORS + 4) & ~1;
    this.nextLog = this.clock.nanos + LOG_NS;
    this.stack = [];
  }

  #wire() {
    const { gpio, pwm } = this.mcu;
    for (const name of ['over', 'right', 'under', 'relay', 'status']) {
      gpio[this.pins[name]].addListener((state) => {
        this.events.push([this.now, name, state === HIGH ? 1 : 0]);
      });
    }
    // The buzzer is read off the PWM's registers, not off its edges.
    const channel = pwm.channels[(this.pins.buzzer >> 1) & 7];
    const write = channel.writeRegister.bind(channel);
    let last = 0;
    // A change of pitch takes several writes; what lies between is too short to be heard.
    const settled = this.clock.createAlarm(() => {
      const duty = this.pins.buzzer & 1 ? channel.cc >>> 16 : channel.cc & 0xffff;
      const sounding = channel.csr & 1 && duty && gpio[this.pins.buzzer].functionSelect === 4;
      const hz = sounding ? Math.round(this.mcu.clkSys / channel.timer.prescaler / (channel.top + 1)) : 0;
      if (hz !== last) {
        last = hz;
        this.events.push([this.now, 'buzzer', hz]);
      }
    });
    channel.writeRegister = (offset, value) => {
      write(offset, value);
      settled.schedule(PITCH_NS);
    };
    // A confused device lets go of the data line after nine clocks, which come from the pin as a plain output.
    const clock = gpio[this.pins.scl];
    clock.addListener((state, before) => {
      if (this.displayFault === 'stuck' && clock.functionSelect === SIO && before === LOW && state !== LOW) {
        this.clocksWhileStuck++;
        if (this.clocksWhileStuck >= 9) {
          this.#displayFault('none');
        }
      }
    });
  }

  /** The DMA's first count ends early: it takes hours otherwise. */
  #shortenFirstCount() {
    const [channel] = this.mcu.dma.channels;
    const start = channel.start.bind(channel);
    channel.start = () => {
      start();
      channel.transCount = this.firstCount;
      channel.start = start;
    };
  }

  #displayFault(fault) {
    if (this.displayFault === 'unplugged' && fault !== 'unplugged') {
      this.display.powerUp();
    }
    this.displayFault = fault === 'corrupt' ? 'none' : fault;
    if (fault === 'corrupt') {
      this.display.corrupt();
    }
    this.clocksWhileStuck = 0;
    this.#pin(this.pins.sda, fault !== 'stuck');
  }

  #pin(pin, level) {
    this.pios.catchUp();
    this.clock.tick(0);
    this.levels.set(pin, level);
    this.mcu.gpio[pin].setInputValue(!!level);
    this.pios.pinChanged();
  }

  /** What happens from outside: a level on a pin or a fault of the display. */
  #happen([, what, value]) {
    if (what === 'display') {
      this.#displayFault(value);
    } else if (what === 'power') {
      this.reset = 'power';
    } else {
      this.#pin(what, value);
    }
  }

  /**
   * Lets `ns` pass. `stimuli` are [ns from now, pin or 'display', level or fault], in order of time; with 'power' the board is
   * switched off and on.
   */
  run(ns, stimuli = []) {
    const from = this.now;
    const end = from + ns;
    let next = 0;
    this.events = [];
    this.text = [];
    this.resets = [];
    this.calls = [];
    while (this.now < end) {
      const { epoch, clock, mcu, pios, rom } = this;
      const { core } = mcu;
      const stop = end - epoch;
      const stimulus = () => (next < stimuli.length ? from + stimuli[next][0] - epoch : Infinity);
      let due = Math.min(stimulus(), pios.due, this.nextLog, stop);
      const watched = this.watched.size > 0;
      while (!this.reset) {
        if (core.waiting || rom.work) {
          const alarm = clock.nextAlarm ? clock.nextAlarm.nanos : Infinity;
          clock.tick(Math.max(Math.min(alarm, due, rom.until) - clock.nanos, 0));
          if (clock.nanos >= rom.until) {
            rom.finish();
          }
        } else {
          if (watched) {
            this.#watch(core);
          }
          clock.tick(core.executeInstruction() * CYCLE_NS);
        }
        if (pios.due < due) {
          due = pios.due;
        }
        if (clock.nanos >= due) {
          while (clock.nanos >= stimulus() && !this.reset) {
            this.#happen(stimuli[next++]);
          }
          if (clock.nanos >= pios.due) {
            pios.catchUp();
          }
          if (clock.nanos >= this.nextLog) {
            this.#drain();
            this.nextLog = clock.nanos + LOG_NS;
          }
          if (clock.nanos >= stop) {
            break;
          }
          due = Math.min(stimulus(), pios.due, this.nextLog, stop);
        }
      }
      if (this.reset) {
        this.#restart();
      }
    }
    this.pios.catchUp();
    this.#drain();
    return {
      t: this.now,
      awake: this.awake,
      log: this.text,
      events: this.events,
      resets: this.resets,
      calls: this.calls,
      feeds: this.feeds,
      longestUnfed: this.longestUnfed,
      displayBytes: this.display.bytes,
      picture: this.display.changed ? Buffer.from(this.display.picture()).toString('base64') : undefined,
      problems: this.problems.splice(0).concat(this.display.problems.splice(0)),
    };
  }

  /**
   * After a reset everything but the SRAM and the watchdog starts anew (RP2040 data sheet, 4.7), after a power cut these, too,
   * and the SRAM is noise; outputs fall to their pulls.
   */
  #restart() {
    this.#drain();
    const cut = this.reset === 'power';
    const kept = { sram: this.mcu.sram, reason: this.reset.reason, scratch: this.reset.scratchData };
    if (cut) {
      this.rom.cut();
      this.display.powerUp();
      kept.sram = this.mcu.sram.map((_, i) => Math.imul(i ^ this.boot, 0x9e3779b1) >>> 24);
      kept.reason = 0;
      kept.scratch = new Uint32Array(8);
    } else {
      if (this.rom.work) {
        // The flash chip does not notice.
        this.rom.finish();
      }
      this.resets.push([this.now, kept.reason === 2 ? 'forced' : 'timer']);
    }
    this.boot++;
    this.awakeBefore += this.mcu.core.cycles;
    for (const name of ['over', 'right', 'under', 'relay', 'status', 'buzzer']) {
      this.events.push([this.now, name, 0]);
    }
    this.#start({ nanos: 0, epoch: this.now, kept });
  }

  #drain() {
    const view = this.mcu.sramView;
    if (LOG_MAGIC !== String.fromCharCode(...this.mcu.sram.subarray(this.log, this.log + LOG_MAGIC.length))) {
      return;
    }
    // Up channel 0 of the log's control block: name, buffer, size, write, read, flags.
    const [buffer, size, write, read] = [28, 32, 36, 40].map((at) => view.getUint32(this.log + at, true));
    if (write === read || size === 0 || write >= size || read >= size) {
      return;
    }
    const at = buffer - SRAM;
    const { sram } = this.mcu;
    const bytes = write > read
      ? Buffer.from(sram.slice(at + read, at + write))
      : Buffer.concat([sram.slice(at + read, at + size), sram.slice(at, at + write)]);
    this.text.push([this.now, this.boot, bytes.toString('base64')]);
    view.setUint32(this.log + 40, write, true);
  }

  /** Counts the cycles of watched functions, calls inside them included. */
  #watch(core) {
    const pc = core.PC & ~1;
    const top = this.stack[this.stack.length - 1];
    if (top && pc === top.back && core.SP === top.sp) {
      this.stack.pop();
      this.calls.push([top.name, core.cycles - top.from, this.epoch + this.clock.nanos]);
    }
    const name = this.watched.get(pc);
    if (name && !(top && top.name === name)) {
      this.stack.push({ name, from: core.cycles, back: core.LR & ~1, sp: core.SP });
    }
  }

  /** Bytes of flash or SRAM. */
  peek(address, length) {
    const { sram, flash } = this.mcu;
    return address >= SRAM ? sram.slice(address - SRAM, address - SRAM + length) : flash.slice(address - FLASH, address - FLASH + length);
  }

  /** Changes bytes of flash or SRAM behind the firmware's back. In flash the change outlives resets. */
  poke(address, bytes) {
    if (address >= SRAM) {
      this.mcu.sram.set(bytes, address - SRAM);
    } else {
      this.mcu.flash.set(bytes, address - FLASH);
      this.image.set(bytes, address - FLASH);
    }
  }
}
