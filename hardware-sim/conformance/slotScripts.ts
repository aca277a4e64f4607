import type { Script } from './scripts.js';

/** Armed slots, and the encoder. */
export const slotScripts: readonly Script[] = [
  {
    name: 'refuses slots that do not exist, are taken, share a low byte, or are not ahead',
    rules: '24',
    async run(host) {
      await host.connect();
      const { count, identity } = host;
      const none = host.arm({ slot: identity.slots, count: count + 10 });
      const first = host.arm({ slot: 0, count: count + 10 });
      await host.live(3_000);
      const taken = host.arm({ slot: 0, count: count + 20 });
      const shares = host.arm({ slot: 1, count: count + 10 + 256 });
      const here = host.arm({ slot: 2, count });
      const behind = host.arm({ slot: 2, rising: 0, count: count + 5 });
      await host.live(5_000);
      host.expectTold(none, 'refused badSlot');
      host.expectTold(first, '');
      host.expectTold(taken, 'refused slotTaken');
      host.expectTold(shares, 'refused sharedLowByte');
      host.expectTold(here, 'passed');
      host.expectTold(behind, 'passed');
    },
  },
  {
    name: 'ends a slot that a beat no longer wants, and takes another in its place',
    rules: '8, 27',
    async run(host) {
      await host.connect();
      const gone = host.arm({ slot: 0, count: host.count + 30 });
      const kept = host.arm({ slot: 1, count: host.count + 40 });
      host.wanted = 0b10;
      await host.live(15_000);
      host.expectTold(gone, 'disarmed unwanted');
      host.expectTold(kept, '');
      host.wanted = 0b11;
      const next = host.arm({ slot: 0, count: host.count + 30 });
      await host.live(5_000);
      host.expectTold(next, '');
    },
  },
  {
    name: 'counts four to a cycle, A before B up',
    rules: 'sample',
    needs: ['turn'],
    async run(host) {
      await host.connect();
      const { count } = host;
      await host.line.turn!(700, 20_011);
      await host.silent(3_000);
      host.check(host.count === count + 700, `counted ${host.count - count} of 700`);
      await host.line.turn!(-1_300, 5_021);
      await host.live(3_000);
      host.check(host.count === count - 600, `counted ${host.count - count} of -600`);
    },
  },
  {
    name: 'counts both lines changing at once as illegal, and does not move',
    rules: 'sample',
    needs: ['jump'],
    async run(host) {
      await host.connect();
      const { count, illegal } = host.last(host.samples, 'sample');
      host.line.jump!();
      await host.silent(3_000);
      host.check(host.count === count, `the count moved by ${host.count - count}`);
      const more = host.last(host.samples, 'sample').illegal - illegal;
      host.check(more === 1, `${more} illegal transitions were counted`);
      host.line.jump!();
      await host.silent(3_000);
    },
  },
  {
    name: 'fires at the target and at no other count, in its direction alone',
    rules: '25',
    needs: ['turn'],
    async run(host) {
      await host.connect();
      const { count } = host;
      const up = host.arm({ slot: 0, output: 0, count: count + 300, widthUs: 2_000 });
      const down = host.arm({ slot: 1, output: 1, rising: 0, count: count - 41, widthUs: 2_000 });
      await host.silent(5_000);
      await host.line.turn!(299, 10_007);
      await host.live(3_000);
      host.expectTold(up, '');
      await host.line.turn!(1, 10_007);
      await host.live(5_000);
      host.expectTold(up, 'fired, done');
      host.check(host.outcome(up, 'fired').count === count + 300, 'where it fired');
      await host.line.turn!(-340, 10_007);
      await host.live(5_000);
      host.expectTold(down, '');
      await host.line.turn!(-5, 10_007);
      await host.live(5_000);
      host.expectTold(down, 'fired, done');
      host.check(host.outcome(down, 'fired').count === count - 41, 'where it fired, falling');
    },
  },
  {
    name: 'fires once, however the belt jitters over the target',
    rules: '25',
    needs: ['turn'],
    async run(host) {
      await host.connect();
      const id = host.arm({ count: host.count + 5, widthUs: 500 });
      await host.silent(5_000);
      await host.line.turn!(5, 5_021);
      for (let n = 0; n < 12; n++) {
        await host.line.turn!(n % 2 === 0 ? -2 : 2, 5_021);
        await host.live(1_000);
      }
      host.expectTold(id, 'fired, done');
    },
  },
  {
    name: 'fires every one of many slots, in whatever order they were armed',
    rules: '25',
    needs: ['turn'],
    async run(host) {
      await host.connect();
      const { count } = host;
      const places = [70, 10, 50, 30, 80, 20, 60, 40];
      const ids = places.map((place, slot) =>
        host.arm({ slot, output: 0, count: count + place, widthUs: 200 }),
      );
      await host.live(30_000);
      await host.line.turn!(90, 5_021);
      await host.live(10_000);
      ids.forEach((id, n) => {
        host.expectTold(id, 'fired, done', `the slot at +${places[n]}`);
        const at = host.outcome(id, 'fired').count - count;
        host.check(at === places[n], `the slot at +${places[n]} fired at +${at}`);
      });
    },
  },
  {
    name: 'checks a slot like a pulse when it rises: busy, gap, counts apart, allowance',
    rules: '17, 25',
    needs: ['turn'],
    async run(host) {
      await host.connect();
      // Away from where an earlier script may have fired last.
      await host.line.turn!(150, 20_011);
      await host.live(10_000);
      const { count } = host;
      host.configure({ leastCounts: 100, leastGapUs: 30_000, allowanceRises: 2 });
      const at = (slot: number, place: number) =>
        host.arm({ slot, count: count + place, widthUs: 4_000 });
      const first = at(0, 10);
      const busy = at(1, 12);
      await host.live(10_000);
      await host.line.turn!(15, 5_021);
      await host.live(6_000);
      const gap = at(2, 20);
      await host.silent(2_000);
      await host.line.turn!(10, 20_011);
      await host.live(50_000);
      const near = at(3, 60);
      const far = at(4, 115);
      await host.live(5_000);
      await host.line.turn!(100, 5_021);
      await host.live(50_000);
      const over = at(5, 300);
      await host.live(5_000);
      await host.line.turn!(200, 20_011);
      await host.live(5_000);
      host.expectTold(first, 'fired, done');
      host.expectTold(busy, 'refused busy');
      host.expectTold(gap, 'refused leastGap');
      host.expectTold(near, 'refused leastCounts');
      host.expectTold(far, 'fired, done');
      host.expectTold(over, 'refused allowance');
    },
  },
  {
    name: 'will not arm after 150 ms of silence, until a fresh beat comes',
    rules: '10',
    async run(host) {
      await host.connect();
      await host.live(5_000);
      await host.silent(180_000);
      const late = host.arm({ count: host.count + 50 });
      await host.silent(5_000);
      host.beat();
      await host.silent(3_000);
      const fresh = host.arm({ count: host.count + 50 });
      await host.live(5_000);
      host.expectTold(late, 'refused silence');
      host.expectTold(fresh, '');
      host.expectFaults('watchdogSlots');
    },
  },
];
