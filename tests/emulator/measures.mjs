// What rp2040js 1.4.1 leaves out and this firmware needs, put right from outside. Each measure says what is missing.
// Not modelled at all: the second core, exception entry cost, flash cache misses, bus contention, input synchronisers,
// analogue behaviour. Cycle counts are lower bounds therefore.

const TIMER = 0x40054;
const WATCHDOG = 0x40058;
const WATCHDOG_LOAD = 0x04;
const XIP_CTRL = 0x14000;
const HARD_FAULT = 3;
const INPUT_PULL_UP = 3;
const IC_INTR_MASK = 0x30;
const IC_ENABLE = 0x6c;
const ALARM_0 = 0x10;
const ALARM_3 = 0x1c;

/** SEV does nothing: a wake-up from task to task would wait for the next interrupt. Warnings are collected. */
export function logger(core, problems) {
  const note = (_, from, message) => {
    const text = `${from}: ${message}`;
    if (problems.length < 50 && !problems.includes(text)) {
      problems.push(text);
    }
  };
  return {
    debug() {},
    info(_, message) {
      if (message === 'SEV') {
        core().eventRegistered = true;
      }
    },
    warn: (from, message) => note(null, from, message),
    error: (from, message) => note(null, from, message),
  };
}

/**
 * UDF and BKPT only call a hook: outside of the boot ROM they become the hard fault that they are (ARMv6-M architecture
 * reference, B1.5.6).
 */
export function faults(mcu, rom, onLockUp) {
  mcu.onBreak = (code) => {
    const { core } = mcu;
    if (rom.has(core.PC - core.breakRewind)) {
      rom.call(code);
      return;
    }
    core.PC -= core.breakRewind;
    // A fault inside the hard fault's own handler locks the core up.
    if (core.IPSR === HARD_FAULT) {
      onLockUp(core.PC);
      return;
    }
    core.exceptionEntry(HARD_FAULT);
    core.PC &= ~1;
  };
}

/** Flash access waits for a register that is not there. */
export function flashControl(mcu) {
  mcu.peripherals[XIP_CTRL] = {
    readUint32: () => 0,
    writeUint32() {},
    writeUint32Atomic() {},
  };
}

/** An alarm at a fraction of a microsecond fires in the microsecond before its own. */
export function timer(mcu) {
  const timer = mcu.peripherals[TIMER];
  const write = timer.writeUint32.bind(timer);
  timer.writeUint32 = (offset, value) => {
    write(offset, value);
    if (offset >= ALARM_0 && offset <= ALARM_3) {
      const { nanos } = mcu.clock;
      const micros = Math.floor(nanos / 1000);
      const delta = ((value - micros) >>> 0) * 1000 - (nanos - micros * 1000);
      timer.alarms[(offset - ALARM_0) / 4].clockAlarm.schedule(Math.max(delta, 0));
    }
  };
}

/** Pull-ups are ignored: an open switch would read closed. `driven` says which pins something outside holds. */
export function pulls(mcu, driven) {
  for (const pin of mcu.gpio) {
    pin.addListener((state) => {
      if (state === INPUT_PULL_UP && !driven.has(pin.index)) {
        pin.setInputValue(true);
      }
    });
  }
}

/** The watchdog starts again at once, and nothing resets: `reset` is told the reason; `fed` of every feed. */
export function watchdog(mcu, reset, fed) {
  const watchdog = mcu.peripherals[WATCHDOG];
  const write = watchdog.writeUint32.bind(watchdog);
  watchdog.writeUint32 = (offset, value) => {
    write(offset, value);
    if (offset === WATCHDOG_LOAD) {
      fed();
    }
  };
  watchdog.onWatchdogTrigger = () => {
    watchdog.timer.enable = false;
    watchdog.alarm.enable = false;
    reset(watchdog);
  };
  return watchdog;
}

/**
 * The interrupt mask is missing, bytes take no time, and disabling does not end a transfer.
 * `device(address)` is the device on the bus, or undefined; `stuck()` whether a line is held down.
 */
export function i2c(mcu, port, device, stuck) {
  const bus = mcu.i2c[port];
  const write = bus.writeUint32.bind(bus);
  let addressed;
  let then;
  const alarm = mcu.clock.createAlarm(() => then());
  const later = (what) => {
    if (stuck()) {
      return;
    }
    then = what;
    // Nine bits of a byte and its acknowledgement, at the speed that the registers say.
    const nanos = (9 * (bus.sclHighPeriod + bus.sclLowPeriod) * 1e9) / mcu.clkPeri;
    alarm.schedule(nanos);
  };
  bus.writeUint32 = (offset, value) => {
    if (offset === IC_INTR_MASK) {
      bus.intEnable = value & 0x1fff;
      bus.checkInterrupts();
      return;
    }
    if (offset === IC_ENABLE && !(value & 1)) {
      alarm.cancel();
      bus.state = 0;
      bus.busy = false;
      bus.stop = false;
      bus.pendingRestart = false;
    }
    write(offset, value);
  };
  bus.onStart = () => {
    if (!stuck()) {
      bus.completeStart();
    }
  };
  bus.onConnect = (address) => {
    later(() => {
      addressed = device(address);
      addressed?.start();
      bus.completeConnect(addressed !== undefined);
    });
  };
  bus.onWriteByte = (value) => {
    later(() => {
      // It may have been unplugged since.
      const there = addressed !== undefined && addressed === device(bus.targetAddress);
      if (there) {
        addressed.byte(value);
      }
      bus.completeWrite(there);
    });
  };
  bus.onReadByte = () => later(() => bus.completeRead(0xff));
}
