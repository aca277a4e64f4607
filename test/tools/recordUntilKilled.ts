/** A process that records until it is killed, and after each batch says how far it has written. */
import fs from 'node:fs';
import { Recorder } from '../../server/session/record/recorder.js';
import { blank } from '../../server/wire/codec.js';

const [, , folder] = process.argv;
const recorder = Recorder.create(folder!, {
  session: 'killed',
  startedAtMs: Date.now(),
  software: 'test',
  seed: '',
});
const sample = blank('sample');
const pulse = blank('pulse');
for (let input = 0; ; input++) {
  sample.boardUs = (input * 1000) >>> 0;
  sample.count = input * 3;
  recorder.sample(input, sample);
  if (input % 10 !== 9) continue;
  pulse.id = input;
  recorder.command(input, 'pulse', pulse);
  recorder.batchEnd(true);
  fs.writeSync(1, `${input}\n`);
}
