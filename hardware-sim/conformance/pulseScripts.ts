import type { Script } from './scripts.js';

const BUSY_TRAIN = { widthUs: 4_000, periodUs: 10_000, repeats: 5 };

/** Pulses, trains, limits, ids. */
export const pulseScripts: readonly Script[] = [
  {
    name: 'fires a pulse at once, and says when it ended',
    rules: '16, 20',
    async run(host) {
      await host.connect();
      const askedUs = host.boardUs;
      const id = host.pulse({ widthUs: 7_000 });
      await host.live(20_000);
      host.expectTold(id, 'fired, done');
      const fired = host.outcome(id, 'fired');
      const done = host.outcome(id, 'done');
      host.check(fired.boardUs >= askedUs, 'it rose before it was asked for');
      host.near(done.boardUs - fired.boardUs, 7_000, 20, 'its width');
      host.near(done.onUs, 7_000, 20, 'its time on');
    },
  },
  {
    name: 'starts at a board time',
    rules: '16, 18',
    async run(host) {
      await host.connect();
      const startUs = host.boardUs + 40_000;
      const late = host.pulse({ flags: 1, startUs, expiryUs: startUs });
      const past = host.pulse({ output: 1, flags: 1, startUs: host.boardUs - 5_000 });
      await host.live(60_000);
      host.expectTold(late, 'fired, done');
      host.near(host.outcome(late, 'fired').boardUs, startUs, 60, 'its start');
      host.expectTold(past, 'fired, done');
    },
  },
  {
    name: 'sends a train, rise to rise',
    rules: '19, 20',
    async run(host) {
      await host.connect();
      const id = host.pulse(BUSY_TRAIN);
      await host.live(70_000);
      host.expectTold(id, 'fired, done');
      const lastsUs = host.outcome(id, 'done').boardUs - host.outcome(id, 'fired').boardUs;
      host.near(lastsUs, 44_000, 100, 'the train');
      host.near(host.outcome(id, 'done').onUs, 20_000, 100, 'its time on');
    },
  },
  {
    name: 'refuses bad shapes',
    rules: '16',
    async run(host) {
      await host.connect();
      const bad = {
        'no width': { widthUs: 0 },
        'no repeats': { repeats: 0 },
        'a period not above the width': { repeats: 2, periodUs: 10_000 },
        'no such output': { output: host.identity.outputs },
      };
      for (const [about, change] of Object.entries(bad)) {
        const id = host.pulse(change);
        await host.silent(3_000);
        host.beat();
        host.expectTold(id, 'refused badShape', about);
      }
      host.outcomes.length = 0;
      host.pulse({ id: 0 });
      await host.silent(3_000);
      host.expectTold(0, 'refused badShape', 'id 0');
    },
  },
  {
    name: 'refuses what limits forbid: never, too long, gaps too short',
    rules: '16',
    async run(host) {
      await host.connect();
      const never = host.pulse({ output: 2 });
      const long = host.pulse({ widthUs: 1_000_001 });
      host.configure({ leastGapUs: 7_000 });
      const gaps = host.pulse(BUSY_TRAIN);
      await host.live(15_000);
      host.expectTold(never, 'refused notConfigured');
      host.expectTold(long, 'refused longestOn');
      host.expectTold(gaps, 'refused leastGap');
    },
  },
  {
    name: 'refuses what is stale, or too far ahead',
    rules: '16',
    async run(host) {
      await host.connect();
      const expired = host.pulse({ expiryUs: host.boardUs - 1 });
      const far = host.pulse({ expiryUs: host.boardUs + 10_500_000 });
      const before = host.pulse({
        ...{ flags: 1, startUs: host.boardUs + 50_000 },
        expiryUs: host.boardUs + 40_000,
      });
      await host.live(15_000);
      host.expectTold(expired, 'expired');
      host.expectTold(far, 'refused badExpiry');
      host.expectTold(before, 'refused badExpiry');
    },
  },
  {
    name: 'keeps one owner, and the least gap after its fall',
    rules: '17, 19',
    async run(host) {
      await host.connect();
      host.configure({ leastGapUs: 150_000 });
      const first = host.pulse({ widthUs: 5_000 });
      const busy = host.pulse({ widthUs: 5_000 });
      await host.live(10_000);
      const soon = host.pulse({ widthUs: 5_000 });
      await host.live(160_000);
      const later = host.pulse({ widthUs: 5_000 });
      await host.live(10_000);
      host.expectTold(first, 'fired, done');
      host.expectTold(busy, 'refused busy');
      host.expectTold(soon, 'refused leastGap');
      host.expectTold(later, 'fired, done');
    },
  },
  {
    name: 'keeps the allowance, of time and of rises, and gives back what was cut',
    rules: '17, 20, 21',
    async run(host) {
      await host.connect();
      host.configure({ allowanceUs: 250_000, allowanceRises: 9 });
      const fits = host.pulse({ widthUs: 200_000 });
      await host.live(5_000);
      host.send('quiet', { outputs: 1 });
      await host.live(5_000);
      const back = host.pulse({ widthUs: 130_000 });
      await host.live(150_000);
      const over = host.pulse({ widthUs: 130_000 });
      await host.live(5_000);
      host.expectTold(fits, 'fired, done cut');
      host.expectTold(back, 'fired, done');
      host.expectTold(over, 'refused allowance');
      host.configure({ allowanceRises: 2 });
      const many = host.pulse({ widthUs: 100, periodUs: 1_000, repeats: 3 });
      const few = host.pulse({ widthUs: 100, periodUs: 1_000, repeats: 2 });
      await host.live(5_000);
      host.expectTold(many, 'refused allowance');
      host.expectTold(few, 'fired, done');
    },
  },
  {
    name: 'checks the count window at the rise',
    rules: '17',
    async run(host) {
      await host.connect();
      const { count } = host;
      const inside = host.pulse({ flags: 2, countFrom: count, countTo: count, widthUs: 1_000 });
      await host.live(5_000);
      const outside = host.pulse({ flags: 2, countFrom: count + 1, countTo: count + 9 });
      await host.live(5_000);
      host.expectTold(inside, 'fired, done');
      host.expectTold(outside, 'refused countWindow');
    },
  },
  {
    name: 'ends everything on quiet, under any tag',
    rules: '5, 28',
    async run(host) {
      await host.connect();
      const on = host.pulse({ widthUs: 900_000 });
      const waits = host.pulse({
        ...{ output: 1, flags: 1, startUs: host.boardUs + 400_000 },
        expiryUs: host.boardUs + 500_000,
      });
      const armed = host.arm({ slot: 2, output: 1, count: host.count + 100 });
      await host.live(10_000);
      host.send('quiet', { outputs: 0xffff }, 3);
      await host.live(15_000);
      host.expectTold(on, 'fired, done cut');
      host.expectTold(waits, 'disarmed cut');
      host.expectTold(armed, 'disarmed cut');
      const again = host.pulse({ widthUs: 1_000 });
      await host.live(5_000);
      host.expectTold(again, 'fired, done');
    },
  },
  {
    name: 'ends a pulse whose limits are taken away, or shortened',
    rules: '21, 22',
    async run(host) {
      await host.connect();
      const cut = host.pulse({ widthUs: 900_000 });
      const shortened = host.pulse({ output: 1, widthUs: 900_000 });
      await host.live(10_000);
      host.configure({ longestOnUs: 0 });
      host.configure({ output: 1, longestOnUs: 250_000 });
      await host.live(260_000);
      host.expectTold(cut, 'fired, done cut');
      host.expectTold(shortened, 'fired, done longestOn');
      const { boardUs } = host.outcome(shortened, 'fired');
      host.near(host.outcome(shortened, 'done').boardUs - boardUs, 250_000, 20, 'the cut-off');
    },
  },
  {
    name: 'ends a train when its limits no longer allow the next pulse',
    rules: '19',
    async run(host) {
      await host.connect();
      const id = host.pulse({ widthUs: 4_000, periodUs: 20_000, repeats: 10 });
      await host.live(30_000);
      host.configure({ allowanceRises: 1 });
      await host.live(60_000);
      host.expectTold(id, 'fired, done allowance');
    },
  },
  {
    name: 'acts on an id once, however often and in whatever order it comes',
    rules: '12, 13',
    async run(host) {
      await host.connect();
      const low = host.newId();
      const message = host.pulseMessage({ widthUs: 2_000 });
      host.send('pulse', message);
      await host.live(10_000);
      for (let n = 0; n < 5; n++) host.send('pulse', message);
      await host.live(15_000);
      // A board that is asked again before it could answer may answer once.
      const told = host.told(message.id).replace(/(, fired again)+(, done again)+/g, '*');
      host.check(/^fired, done[*]+$/.test(told), `sent six times: ${host.told(message.id)}`);
      const fired = host.outcomes.filter(({ id, kind }) => id === message.id && kind === 1);
      const at = new Set(fired.map(({ boardUs }) => boardUs));
      host.check(at.size === 1, `it rose ${at.size} times`);
      host.pulse({ id: low, widthUs: 2_000 });
      await host.live(10_000);
      host.expectTold(low, 'fired, done');
      for (let n = 0; n < 80; n++) host.newId();
      const high = host.pulse({ widthUs: 2_000 });
      await host.live(10_000);
      host.expectTold(high, 'fired, done');
      host.pulse({ id: high - 70 });
      host.pulse({ id: high - 64, widthUs: 1_000 });
      await host.live(10_000);
      host.expectTold(high - 70, 'refused oldId');
      host.expectTold(high - 64, 'fired, done');
    },
  },
  {
    name: 'has at least eight places for pulses to wait, and says when they are full',
    rules: '18',
    async run(host) {
      await host.connect();
      const ids: number[] = [];
      for (let n = 0; n < 20; n++) {
        const startUs = host.boardUs + 60_000 + n * 2_000;
        ids.push(host.pulse({ flags: 1, widthUs: 500, startUs, expiryUs: startUs + 1_000 }));
        if (n % 4 === 3) await host.silent(4_000);
      }
      await host.live(130_000);
      const told = ids.map((id) => host.told(id));
      const fired = told.filter((words) => words === 'fired, done').length;
      const busy = told.filter((words) => words === 'refused busy').length;
      host.check(fired >= 8 && fired + busy === 20, told.join(' | '));
      const faults = host.faults.length;
      host.check(faults > 0 === busy > 0, `${faults} faults for ${busy} refused`);
    },
  },
  {
    name: 'is idle high where it is configured so',
    rules: '22',
    needs: ['pin'],
    async run(host) {
      await host.connect();
      host.check(host.line.pin!(0) === 0, 'the pin of an idle output was high');
      host.configure({ flags: 1 });
      await host.silent(3_000);
      host.check(host.line.pin!(0) === 1, 'the pin of an output that idles high was low');
      const id = host.pulse({ widthUs: 30_000 });
      await host.live(20_000);
      host.check(
        host.line.pin!(0) === 0,
        'the pin of an output that idles high and is on was high',
      );
      host.check(host.last(host.samples, 'sample').outputs === 1, 'outputs in the sample');
      host.configure({});
      await host.live(5_000);
      host.expectTold(id, 'fired, done cut');
      host.check(host.line.pin!(0) === 0, 'the pin of an idle output was high');
    },
  },
];
