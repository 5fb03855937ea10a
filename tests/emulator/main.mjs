// One request a line on standard input, one answer a line on standard output, both JSON.
//
//   {"do":"start","flash":base64,"pins":{...},"log":ADDRESS,"display":"ssd1306","timerUs":0,"firstCount":0,
//    "programNs":N,"eraseNs":N}
//   {"do":"run","ns":N,"stimuli":[[dt, pin or "display" or "power", level or fault],...]}
//       -> {"t","awake","log":[[t,boot,base64]],"events":[[t,what,value]],"resets":[[t,reason]],"calls":[[name,cycles,t]],
//           "feeds","longestUnfed","displayBytes","picture","problems":[text]}
//          `picture` is base64 of 8 pages of 128 bytes, there when the display was written to since it was told last;
//          `feeds` and `longestUnfed` (ns) are the watchdog's, since power-up
//   {"do":"watch","functions":{NAME:ADDRESS}}
//   {"do":"peek","address":A,"length":N}  -> {"bytes": base64}
//   {"do":"poke","address":A,"bytes":base64}
//
// A request that fails answers {"error": text}.

import { createInterface } from 'node:readline';
import { Board } from './board.mjs';

let board;

function answer(request) {
  if (request.do === 'start') {
    board = new Board({ ...request, flash: new Uint8Array(Buffer.from(request.flash, 'base64')) });
    return {};
  }
  if (!board) {
    throw new Error('nothing is started');
  }
  switch (request.do) {
    case 'run':
      return board.run(request.ns, request.stimuli);
    case 'watch':
      board.watched = new Map(Object.entries(request.functions).map(([name, at]) => [at & ~1, name]));
      board.stack = [];
      return {};
    case 'peek':
      return { bytes: Buffer.from(board.peek(request.address, request.length)).toString('base64') };
    case 'poke':
      board.poke(request.address, Buffer.from(request.bytes, 'base64'));
      return {};
    default:
      throw new Error(`no such request: ${request.do}`);
  }
}

for await (const line of createInterface({ input: process.stdin })) {
  let reply;
  try {
    reply = answer(JSON.parse(line));
  } catch (error) {
    reply = { error: String(error.stack ?? error) };
  }
  process.stdout.write(`${JSON.stringify(reply)}\n`);
}
