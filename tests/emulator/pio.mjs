// Lets the emulated PIO run in step with simulated time; rp2040js runs it on timers of the host, and ignores enabling,
// delays and the joining of FIFOs.

const CYCLE_NS = 8;
const JOIN_RX = 1 << 31;
/** A loop that waits for a pin is at most this many instructions long. */
const LONGEST_LOOP = 12;
/** An edge has passed through the program after this many cycles. */
const SETTLED = 40;

export class Pios {
  constructor(mcu) {
    this.mcu = mcu;
    this.running = [];
    /** Catch up at this time, ns: an edge is on its way through a program. */
    this.due = Infinity;
    for (const pio of mcu.pio) {
      pio.run = () => {};
      const write = pio.writeUint32.bind(pio);
      pio.writeUint32 = (offset, value) => {
        this.catchUp();
        write(offset, value);
        this.#look();
      };
      const read = pio.readUint32.bind(pio);
      pio.readUint32 = (offset) => {
        this.catchUp();
        return read(offset);
      };
    }
  }

  #look() {
    for (const machine of this.mcu.pio.flatMap((pio) => pio.machines)) {
      const size = machine.shiftCtrl & JOIN_RX ? 8 : 4;
      if (machine.rxFIFO.size !== size) {
        machine.rxFIFO = new machine.rxFIFO.constructor(size);
        machine.updateDMARx();
      }
      const known = this.running.find((r) => r.machine === machine);
      if (machine.enabled && !known) {
        const divider = machine.clockDivInt + machine.clockDivFrac / 256 || 65536;
        this.running.push({
          machine,
          origin: this.mcu.clock.nanos / CYCLE_NS - machine.cycles * divider,
          divider,
        });
      } else if (!machine.enabled && known) {
        this.running.splice(this.running.indexOf(known), 1);
      }
    }
  }

  /** To be called after a pin has changed. */
  pinChanged() {
    this.due = this.mcu.clock.nanos + SETTLED * CYCLE_NS;
  }

  /** Runs every enabled machine up to the present. */
  catchUp() {
    const { nanos } = this.mcu.clock;
    if (nanos >= this.due) {
      this.due = Infinity;
    }
    for (const { machine, origin, divider } of this.running) {
      this.#run(machine, Math.floor((nanos / CYCLE_NS - origin) / divider));
    }
  }

  #run(machine, until) {
    let anchor = null;
    let steps = 0;
    while (machine.cycles < until) {
      const before = machine.cycles;
      machine.step();
      if (machine.cycles === before) {
        // Waiting for a pin, a FIFO or a flag.
        machine.cycles = until;
        return;
      }
      if (machine.rxFIFO.itemCount > 0) {
        // The DMA empties it in no time; what has no DMA stays.
        this.mcu.clock.tick(0);
      }
      // Pins do not change in here: a loop that leaves everything but X as it was goes on like that, until X is 0.
      if (anchor && anchor.pc === machine.pc) {
        const fell = anchor.x - machine.x;
        const took = machine.cycles - anchor.cycles;
        if (same(anchor, machine) && (fell === 0 || fell === 1) && took > 0) {
          let times = Math.floor((until - machine.cycles) / took) - 1;
          if (fell === 1) {
            times = Math.min(times, machine.x - 1);
          }
          if (times > 0) {
            machine.cycles += times * took;
            machine.x -= times * fell;
          }
        }
        anchor = null;
        steps = 0;
      } else if (!anchor || ++steps > LONGEST_LOOP) {
        anchor = snapshot(machine);
        steps = 0;
      }
    }
  }
}

function snapshot(m) {
  return {
    pc: m.pc, x: m.x, y: m.y, isr: m.inputShiftReg, osr: m.outputShiftReg,
    rx: m.rxFIFO.itemCount, tx: m.txFIFO.itemCount, cycles: m.cycles,
  };
}

function same(a, m) {
  return a.y === m.y && a.isr === m.inputShiftReg && a.osr === m.outputShiftReg
    && a.rx === m.rxFIFO.itemCount && a.tx === m.txFIFO.itemCount;
}
