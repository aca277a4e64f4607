/**
 * What goes wrong between a host and a board, on the emulated firmware: `test/board/faults.test.ts`
 * has the same for the simulated one. Hours and thousands of millions of counts are preset.
 */
import { beforeEach, describe, expect, test } from 'vitest';
import { Dice } from '../../hardware-sim/animal/dice.js';
import { ConformanceHost } from '../../hardware-sim/conformance/conformanceHost.js';
import { emulatedLine } from '../../hardware-sim/conformance/lines.js';
import { PULSE_FLAG } from '../../server/wire/messages.js';
import { extend32, fromWraps } from '../../server/wire/time.js';
import { ClockPreset, presetCount } from './presets.js';

const MINUTE_US = 60_000_000;

let line: ReturnType<typeof emulatedLine>;
let host: ConformanceHost;
let rises: number[];
beforeEach(async () => {
  line = emulatedLine();
  host = new ConformanceHost(line);
  rises = [0, 0];
  line.board.probe = (output, level) => {
    if (level === 1) rises[output] = (rises[output] ?? 0) + 1;
  };
  await host.connect();
});

/** Both of a connection's outputs, as the pins rose. */
const rose = () => rises[0]! + rises[1]!;

describe('a disarm that races the edge', () => {
  test.each([-1, 0, 1])('with the count %i from the target gives one outcome', async (from) => {
    const id = host.arm({ count: host.count + 10, widthUs: 500 });
    await host.live(3_000);
    await line.turn!(10 + from, 20_011);
    host.wanted = 0;
    host.beat();
    await host.silent(2_000);
    await line.turn!(5 - from, 20_011);
    await host.live(20_000);
    host.expectTold(id, from >= 0 ? 'fired, done' : 'disarmed unwanted');
    expect(rose()).toBe(from >= 0 ? 1 : 0);
  });

  test('that is lost on the line is made good by the next beat, within 50 ms', async () => {
    const id = host.arm({ count: host.count + 100 });
    await host.live(3_000);
    host.wanted = 0;
    const bytes = host.bytes('beat', { finishedUs: host.boardUs, wanted: 0 });
    bytes[5]! ^= 0x10;
    line.write(bytes);
    const lostUs = line.board.boardUs;
    await host.silent(5_000);
    host.expectTold(id, '');
    await host.live(45_000);
    await line.turn!(120, 20_011);
    await host.live(5_000);
    host.expectTold(id, 'disarmed unwanted');
    expect(host.outcome(id, 'disarmed').boardUs - lostUs).toBeLessThan(50_000);
    expect(rose()).toBe(0);
  });
});

describe('a host that stalls while a slot is armed', () => {
  test.each([
    [100, 'fired, done', ''],
    [200, 'disarmed silence', 'watchdogSlots'],
    [300, 'disarmed silence', 'watchdogSlots, watchdogOutputs'],
  ])('for %i ms: the slot is %s', async (ms, told, faults) => {
    const id = host.arm({ count: host.count + 10 });
    await host.silent(2_000);
    host.beat();
    await host.silent(ms * 1_000);
    await line.turn!(20, 20_011);
    await host.silent(15_000);
    host.expectTold(id, told);
    host.expectFaults(faults);
  });

  test('for 3 s: what it had sent meanwhile is refused, and a new handshake is needed', async () => {
    const { count } = host;
    const dice = new Dice(5);
    // As much as a pseudo-terminal was seen to keep, and deliver at once.
    const stale = Array.from({ length: 120 }, (_, n) =>
      n % 2 === 0
        ? host.bytes('pulse', host.pulseMessage())
        : host.bytes(
            'arm',
            host.armMessage({ slot: n % 8, count: count + Math.floor(dice.unit() * 300) }),
          ),
    );
    await host.silent(3_000_000);
    host.outcomes.length = 0;
    for (const bytes of stale) {
      line.write(bytes);
      await host.silent(1_000);
    }
    await line.turn!(400, 20_011);
    await host.silent(20_000);
    expect(rose()).toBe(0);
    expect(host.outcomes).toEqual([]);
    host.beat();
    const early = host.pulse();
    await host.silent(5_000);
    host.expectTold(early, '');
    await host.connect();
    const id = host.pulse();
    await host.live(20_000);
    host.expectTold(id, 'fired, done');
  });
});

test.each([40, 80])(
  'a host suspended for %i minutes fires nothing of what it had sent, and finds the time again',
  async (minutes) => {
    const clock = new ClockPreset(line.board);
    await host.connect();
    const sentUs = line.board.boardUs;
    const armed = host.arm({ count: host.count + 100 });
    // Written as the host goes to sleep, these reach the board as it wakes.
    const stale = [1, 2, 3].map(() => host.pulseMessage());
    await host.silent(400_000);
    host.expectTold(armed, 'disarmed silence');
    let movedUs = 0;
    for (let left = minutes; left > 0; left -= 40) {
      movedUs += clock.forward(40 * MINUTE_US);
      await host.silent(1_100_000);
    }
    for (const message of stale) host.send('pulse', message);
    await host.connect();
    for (const message of stale) host.send('pulse', message);
    await line.turn!(200, 20_011);
    await host.live(20_000);
    for (const { id } of stale) {
      expect(['expired', 'refused badExpiry']).toContain(host.told(id));
    }
    expect(rose()).toBe(0);
    const { wraps, boardUs } = host.identity;
    const trueUs = fromWraps(wraps, boardUs);
    expect(Math.abs(trueUs - (line.board.boardUs + movedUs))).toBeLessThan(60_000);
    // The nearest signed difference alone is good for 35 minutes.
    expect(Math.abs(extend32(sentUs, boardUs) - trueUs)).toBeGreaterThan(MINUTE_US);
    const id = host.pulse();
    await host.live(20_000);
    host.expectTold(id, 'fired, done');
  },
);

test('time and count wrap together under an armed slot without a false firing', async () => {
  const clock = new ClockPreset(line.board);
  const aheadUs = 2 ** 32 - line.board.boardUs - 600_000;
  clock.forward(aheadUs);
  await host.connect();
  presetCount(line.board, 2 ** 31 - 50);
  await host.live(10_000);
  expect(host.count).toBe(2 ** 31 - 50);
  const ahead = host.arm({ count: (2 ** 31 + 50) | 0, widthUs: 2_000 });
  const far = host.arm({ slot: 1, output: 1, count: (2 ** 31 + 75) | 0, widthUs: 2_000 });
  const fromUs = host.boardUs;
  for (let n = 0; n < 99; n++) {
    await line.turn!(1, 20_011);
    await host.live(6_000);
  }
  expect(host.boardUs).toBeLessThan(fromUs);
  host.expectTold(ahead, '');
  await line.turn!(1, 20_011);
  await host.live(6_000);
  host.expectTold(ahead, 'fired, done');
  host.expectTold(far, '');
  host.expectFaults('');
});

test('a pulse over the wrap of time is as long as it was asked to be', async () => {
  const clock = new ClockPreset(line.board);
  clock.forward(2 ** 32 - line.board.boardUs - 100_000);
  await host.connect();
  const widthUs = 400_000;
  const id = host.pulse({ widthUs });
  await host.live(450_000);
  host.expectTold(id, 'fired, done');
  host.near(host.outcome(id, 'done').onUs, widthUs, 20, 'its time on');
});

test('a command repeated 100 times and in any order acts once', async () => {
  const dice = new Dice(71);
  const { count, boardUs } = host;
  const bytes = [0, 1, 2, 3].map((n) => {
    const startUs = boardUs + 30_000 + n * 40_000;
    const shape = { widthUs: 1_000, startUs, expiryUs: startUs + 9_000_000 };
    return host.bytes('pulse', host.pulseMessage({ flags: PULSE_FLAG.startAt, ...shape }));
  });
  bytes.push(host.bytes('arm', host.armMessage({ output: 1, count: count + 30, widthUs: 1_000 })));
  const order = Array.from({ length: 500 }, (_, n) => n % 5);
  for (let n = order.length - 1; n > 0; n--) {
    const other = Math.floor(dice.unit() * (n + 1));
    [order[n], order[other]] = [order[other]!, order[n]!];
  }
  for (const [n, which] of order.entries()) {
    line.write(bytes[which]!);
    await host.silent(1_000);
    if (n % 20 === 0) host.beat();
    if (n % 10 === 0) line.board.step(1);
  }
  await host.live(30_000);
  expect(rises.slice(0, 2)).toEqual([4, 1]);
});

test('a frame written short, at every length, is dropped, and the one after it acts', async () => {
  const short = host.bytes('pulse', host.pulseMessage({ widthUs: 2_000 }));
  // Short by at least one byte of the frame itself; what lacks the delimiter alone is whole.
  for (let length = 1; length < short.length - 1; length++) {
    line.write(short.subarray(0, length));
    line.write(Uint8Array.of(0));
    if (length % 8 === 0) await host.live(5_000);
  }
  await host.live(5_000);
  expect(rose()).toBe(0);
  const id = host.pulse({ widthUs: 1_000 });
  await host.live(5_000);
  host.expectTold(id, 'fired, done');
  expect(host.last(host.samples, 'sample').badFrames).toBe(short.length - 2);
});

test.each([
  ['on', 12, ['disarmed unwanted | fired, done', 'fired, done | refused leastCounts']],
  ['back', 2, ['disarmed unwanted | passed', 'fired, done | passed']],
] as const)(
  'a seam mark that moves a target %s just before it: the old one or the new, never both',
  async (_, to, expected) => {
    host.configure({ leastCounts: 60 });
    const told = new Set<string>();
    // The host's correction, a beat and an arm, meets the old target at every moment of its way.
    for (let offsetUs = 0; offsetUs < 1_000; offsetUs += 70) {
      host.wanted = 0xff;
      host.beat();
      await host.live(4_000);
      const { count } = host;
      const old = host.arm({ slot: 0, count: count + 3, widthUs: 500 });
      await host.live(4_000);
      await line.turn!(2, 5_021);
      const before = rises[0]!;
      host.wanted = 0b10;
      host.beat();
      const moved = host.arm({ slot: 1, count: count + to, widthUs: 500 });
      line.board.advanceTo(line.board.worldUs + offsetUs);
      await line.turn!(14, 5_021);
      await host.live(6_000);
      const words = `${host.told(old)} | ${host.told(moved)}`;
      expect(rises[0]! - before, words).toBe(words.includes('fired') ? 1 : 0);
      told.add(words);
      // Far enough for the least counts of the next.
      await line.turn!(100, 20_011);
      await host.live(5_000);
    }
    expect([...told].sort()).toEqual(expected);
  },
);

test('a board reset in the middle of a train is idle, and has forgotten what it was asked for', async () => {
  const id = host.pulse({ widthUs: 50_000, periodUs: 60_000, repeats: 5 });
  host.arm({ output: 1, count: host.count + 10 });
  await host.live(20_000);
  host.expectTold(id, 'fired');
  line.board.reset();
  await host.silent(60_000);
  await line.turn!(30, 20_011);
  await host.silent(300_000);
  expect(rises.slice(0, 2)).toEqual([1, 0]);
  expect(host.identity).toMatchObject({ outcomesKept: 0, previousTag: 0 });
  await host.identify();
  host.beat();
  const again = host.pulse({ id: 500 });
  await host.silent(5_000);
  host.expectTold(again, 'refused notConfigured');
});
