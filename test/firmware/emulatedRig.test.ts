import { afterEach, expect, test } from 'vitest';
import { RawHost } from '../rigProcess/rawHost.js';
import { PtyRig } from '../tools/ptyRig.js';

let rig: PtyRig | undefined;
let host: RawHost | undefined;
afterEach(async () => {
  host?.close();
  await rig?.stop();
});

test('the firmware runs on a pseudo-terminal, with the animal on the belt', async () => {
  rig = await PtyRig.start(['--emulated', '--seed', '3', '--trained']);
  host = new RawHost(rig.port);
  const identity = await host.handshake(0x4242);
  expect(identity).toMatchObject({ model: 'ATmega328P 16MHz', outputs: 6, inputs: 5, slots: 8 });
  const first = await host.until(
    ({ name, tag }) => name === 'sample' && tag === 0x4242,
    'a sample',
  );
  await rig.say('speed 40');
  const from = Number(first.message.count);
  await host.until(
    ({ name, message }) => name === 'sample' && Number(message.count) > from + 100,
    'the belt to move',
  );
});
