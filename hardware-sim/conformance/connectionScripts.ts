import { blank } from '../../server/wire/codec.js';
import { CAPABILITY, FAULT, PROTOCOL_VERSION, SYNC_EDGE } from '../../server/wire/messages.js';
import { Xorshift32 } from '../board/xorshift.js';
import type { Script } from './scripts.js';

/** Connections, silence, samples, damaged frames, sync trains. */
export const connectionScripts: readonly Script[] = [
  {
    name: 'answers identify under the new tag, and begins its sequence again',
    rules: '2, 3, 4',
    async run(host) {
      await host.connect();
      const { identity } = host;
      host.check(identity.tag === host.tag, `identity came under tag ${identity.tag}`);
      host.check(identity.sequence === 0, `its sequence was ${identity.sequence}`);
      host.check(identity.protocol === PROTOCOL_VERSION, `protocol ${identity.protocol}`);
      host.check(identity.bootId !== 0, 'its boot id was 0');
      host.check(identity.outputs >= 1 && identity.outputs <= 16, `${identity.outputs} outputs`);
      host.check((identity.capabilities & CAPABILITY.slots) !== 0, 'it has no slots');
    },
  },
  {
    name: 'gives the same answer to the same identify, and changes nothing',
    rules: '3',
    async run(host) {
      await host.connect();
      const id = host.pulse();
      await host.live(20_000);
      host.outcomes.length = 0;
      await host.identify(host.tag);
      host.expectTold(id, 'fired again, done again');
      await host.live(20_000);
      const next = host.pulse();
      await host.live(20_000);
      host.expectTold(next, 'fired, done');
    },
  },
  {
    name: 'tells every kept outcome, oldest first, after identity',
    rules: '3, 14',
    async run(host) {
      await host.connect();
      const ids: number[] = [];
      for (let n = 0; n < 18; n++) {
        ids.push(host.pulse({ widthUs: 300 }));
        await host.live(2_000);
      }
      await host.identify();
      const { outcomesKept } = host.identity;
      host.check(outcomesKept >= 32, `only ${outcomesKept} outcomes are kept`);
      const again = host.outcomes.filter(({ repeated }) => repeated === 1).slice(-outcomesKept);
      host.check(again.length === outcomesKept, `${again.length} of ${outcomesKept} came`);
      const told = again.map(({ id }) => id);
      host.check(told.join() === [...told].sort((a, b) => a - b).join(), `order: ${told}`);
      host.check(told.at(-1) === ids.at(-1), 'the newest was not the last');
    },
  },
  {
    name: 'refuses another protocol, and tag 0, and changes nothing',
    rules: '2',
    async run(host) {
      await host.connect();
      host.identities.length = 0;
      host.send('identify', { nonce: 9, protocol: 99, newTag: 1234 }, 1234);
      await host.silent(10_000);
      host.check(host.identity.tag === 1234 && host.identity.outcomesKept === 0, 'its answer');
      const fault = host.last(host.faults, 'fault');
      host.check(fault.fault === FAULT.badProtocol && fault.detail === 99, 'no badProtocol');
      host.check(fault.tag === 1234, `the fault came under ${fault.tag}`);
      host.send('identify', { nonce: 10, protocol: PROTOCOL_VERSION, newTag: 0 });
      await host.silent(10_000);
      host.expectFaults('badProtocol, badProtocol');
      const id = host.pulse();
      await host.live(20_000);
      host.expectTold(id, 'fired, done');
    },
  },
  {
    name: 'obeys its own tag alone, and tells what it refused at most ten times a second',
    rules: '5',
    async run(host) {
      await host.connect();
      await host.live(120_000);
      host.faults.length = 0;
      const ids: number[] = [];
      for (let n = 0; n < 10; n++) {
        const pulse = host.pulseMessage();
        ids.push(pulse.id);
        host.send('pulse', pulse, host.tag ^ 0x1111);
        await host.silent(2_000);
        host.beat();
      }
      await host.live(150_000);
      for (const id of ids) host.expectTold(id, '');
      const { faults } = host;
      host.check(faults.length >= 2, `told ${faults.length} times`);
      host.check(
        faults.every(({ fault }) => fault === FAULT.wrongTag),
        'another fault',
      );
      for (let n = 1; n < faults.length; n++) {
        const apartUs = (faults[n]!.boardUs - faults[n - 1]!.boardUs) | 0;
        host.check(apartUs >= 99_000, `told twice within ${apartUs} us`);
      }
      const refused = host.faults.reduce((sum, { detail }) => sum + detail, 0);
      host.check(refused === 10, `${refused} of 10 were told`);
    },
  },
  {
    name: 'ends everything of the old tag when a new one begins, but not a sync train',
    rules: '2, 29',
    async run(host) {
      await host.connect();
      host.configure({ output: 2 });
      host.send('sync', {
        ...{ output: 2, running: 1, widthUs: 1_000 },
        ...{ leastGapUs: 3_000, mostGapUs: 6_000, seed: 7 },
      });
      const on = host.pulse({ widthUs: 900_000 });
      const waits = host.pulse({
        ...{ output: 1, flags: 1, startUs: host.boardUs + 400_000 },
        expiryUs: host.boardUs + 500_000,
      });
      const armed = host.arm({ slot: 1, output: 1, count: host.count + 500 });
      await host.live(20_000);
      await host.identify();
      await host.silent(5_000);
      host.expectTold(on, 'fired, done newTag, fired again, done newTag again');
      host.expectTold(waits, 'disarmed newTag, disarmed newTag again');
      host.expectTold(armed, 'disarmed newTag, disarmed newTag again');
      host.edges.length = 0;
      await host.silent(20_000);
      host.check(host.edges.length > 3, 'the sync train stopped');
      host.beat();
      const id = host.pulse();
      await host.live(3_000);
      host.expectTold(id, 'refused notConfigured');
      host.send('quiet', { outputs: 0xffff });
      await host.live(10_000);
    },
  },
  {
    name: 'acts on nothing before a fresh beat',
    rules: '9',
    async run(host) {
      await host.connect();
      await host.identify();
      host.configure({});
      const early = host.pulse();
      const armed = host.arm({ count: host.count + 10 });
      await host.silent(5_000);
      host.expectTold(early, 'refused silence');
      host.expectTold(armed, 'refused silence');
    },
  },
  {
    name: 'ends slots at 150 ms of silence, outputs and the tag at 250 ms',
    rules: '7, 10, 11',
    async run(host) {
      await host.connect();
      host.configure({ output: 1, flags: 2 });
      await host.live(30_000);
      const armed = host.arm({ slot: 0, count: host.count + 500 });
      const cut = host.pulse({ widthUs: 600_000 });
      const finishes = host.pulse({ output: 1, widthUs: 400_000 });
      await host.silent(2_000);
      host.beat();
      const beatenUs = host.boardUs;
      const { tag } = host;
      await host.silent(460_000);
      host.expectTold(armed, 'disarmed silence');
      host.near(host.outcome(armed, 'disarmed').boardUs - beatenUs, 150_500, 1_500, 'slots ended');
      host.expectTold(cut, 'fired, done silence');
      host.near(host.outcome(cut, 'done').boardUs - beatenUs, 250_500, 1_500, 'outputs idle');
      host.expectTold(finishes, 'fired, done');
      host.check(host.outcome(finishes, 'done').tag === 0, 'its end came under the old tag');
      host.expectFaults('watchdogSlots, watchdogOutputs');
      host.check(host.faults[1]!.tag === tag, 'the last fault came under another tag');
      host.check(host.last(host.samples, 'sample').tag === 0, 'the tag did not end');
      await host.identify();
      host.check(host.identity.previousTag === tag, `previous tag ${host.identity.previousTag}`);
    },
  },
  {
    name: 'ignores a beat from the future, and one older than another',
    rules: '8',
    async run(host) {
      await host.connect();
      const armed = host.arm({ count: host.count + 500 });
      await host.live(30_000);
      host.wanted = 0;
      host.beat(host.boardUs + 60_000);
      host.beat(host.boardUs - 60_000);
      await host.silent(5_000);
      host.expectTold(armed, '');
      host.beat();
      await host.silent(5_000);
      host.expectTold(armed, 'disarmed unwanted');
    },
  },
  {
    name: 'counts damaged frames, and decodes the next',
    rules: 'A frame',
    async run(host) {
      await host.connect();
      const before = host.last(host.samples, 'sample').badFrames;
      const spoilt = host.pulseMessage();
      const bytes = host.bytes('pulse', spoilt);
      bytes[6]! ^= 0x20;
      host.line.write(bytes);
      host.line.write(new Uint8Array(90).fill(7));
      host.line.write(Uint8Array.of(0, 3, 1, 2, 0, 0));
      const good = host.pulse();
      await host.live(20_000);
      host.expectTold(spoilt.id, '');
      host.expectTold(good, 'fired, done');
      const bad = (host.last(host.samples, 'sample').badFrames - before) & 0xff;
      host.check(bad === 3, `3 frames were damaged, ${bad} were counted`);
    },
  },
  {
    name: 'sends a sample at least every 5 ms, and a clock every second',
    rules: 'sample, clock',
    async run(host) {
      await host.connect();
      host.samples.length = 0;
      await host.live(2_100_000);
      const { clocks } = host;
      host.check(clocks.length >= 2, `${clocks.length} clocks in 2.1 s`);
      for (let n = 1; n < clocks.length; n++) {
        host.near((clocks[n]! - clocks[n - 1]!) | 0, 1_000_000, 8_000, 'from clock to clock');
      }
      const { samples } = host;
      for (let n = 1; n < samples.length; n++) {
        const gapUs = (samples[n]!.boardUs - samples[n - 1]!.boardUs) | 0;
        host.check(gapUs <= 8_000, `${gapUs} us without a sample`);
        host.check(((samples[n]!.sequence - samples[n - 1]!.sequence) & 0xff) < 4, 'a gap');
      }
    },
  },
  {
    name: 'sends a sync train at exactly the intervals of its seed, host or no host',
    rules: '29, 30, 31',
    async run(host) {
      await host.connect();
      host.configure({ output: 2 });
      const [leastGapUs, mostGapUs] = [10_000, 30_000];
      const sync = { ...blank('sync'), output: 2, running: 1, widthUs: 2_000 };
      host.send('sync', { ...sync, leastGapUs, mostGapUs, seed: 1 });
      await host.silent(600_000);
      const edges = host.edges.filter(({ input }) => input === (SYNC_EDGE | 2));
      host.check(edges.length > 30, `${edges.length} edges in 0.6 s`);
      const random = new Xorshift32(1);
      random.between(leastGapUs, mostGapUs);
      for (let n = 0; n + 2 < edges.length; n += 2) {
        const [rise, fall, next] = edges.slice(n, n + 3);
        host.check(rise!.level === 1 && fall!.level === 0, 'edges out of order');
        host.near((fall!.boardUs - rise!.boardUs) | 0, 2_000, 20, 'its width');
        const waitUs = random.between(leastGapUs, mostGapUs);
        host.near((next!.boardUs - fall!.boardUs) | 0, waitUs, 200, 'its interval');
      }
      host.send('quiet', { outputs: 4 });
      await host.silent(10_000);
      host.edges.length = 0;
      await host.silent(50_000);
      host.check(host.edges.length === 0, 'quiet did not stop it');
    },
  },
  {
    name: 'refuses a sync train that is not allowed',
    rules: '29',
    async run(host) {
      await host.connect();
      const good = { output: 0, running: 1, widthUs: 1_000, leastGapUs: 5_000, mostGapUs: 9_000 };
      host.send('sync', { ...good, seed: 1, output: 3 });
      host.send('sync', { ...good, seed: 1, widthUs: 2_000_000 });
      host.send('sync', { ...good, seed: 1, mostGapUs: 4_000 });
      await host.silent(10_000);
      host.expectFaults('syncRefused, syncRefused, syncRefused');
    },
  },
  {
    name: 'tells every change of an input, where and when it happened',
    rules: 'edge',
    needs: ['setInput'],
    async run(host) {
      await host.connect();
      const fromUs = host.boardUs;
      for (let n = 0; n < 6; n++) {
        host.line.setInput!(1, n % 2 === 0 ? 1 : 0);
        await host.silent(300);
      }
      host.line.setInput!(2, 1);
      await host.silent(6_000);
      host.check(host.edges.map(({ level }) => level).join('') === '1010101', 'the edges told');
      host.check(host.edges.map(({ input }) => input).join('') === '1111112', 'whose edges');
      for (let n = 1; n < 6; n++) {
        host.near(host.edges[n]!.boardUs - host.edges[n - 1]!.boardUs, 300, 20, 'between edges');
      }
      host.check(host.edges[0]!.boardUs >= fromUs, 'an edge in the past');
      host.check(host.last(host.samples, 'sample').inputs === 0b100, 'the levels in the sample');
      host.line.setInput!(2, 0);
      await host.silent(3_000);
    },
  },
];
