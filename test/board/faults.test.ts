/** Faults that the design says must have a test, as far as the board alone can show them. */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { FrameEncoder } from '../../server/wire/codec.js';
import { PROTOCOL_VERSION, PULSE_FLAG } from '../../server/wire/messages.js';
import { extend32, fromWraps } from '../../server/wire/time.js';
import { TAG, TestHost } from './testHost.js';

const TARGET = 100;
const MINUTE_US = 60_000_000;

describe('a disarm that races the edge', () => {
  test.each([-1, 0, 1])('with the count %i from the target gives one outcome', (from) => {
    const host = TestHost.connected();
    const id = host.arm({ count: TARGET });
    host.board.move(TARGET + from);
    host.wanted = 0;
    host.beat();
    host.board.move(-from + 5);
    host.live(50_000);
    const fired = from >= 0;
    expect(host.told(id)).toEqual(fired ? ['fired', 'done'] : ['disarmed unwanted']);
    expect(host.pulses()).toHaveLength(fired ? 1 : 0);
  });

  test('that is lost on the line is made good by the next beat, within 50 ms', () => {
    const host = TestHost.connected();
    const id = host.arm({ count: TARGET });
    const bytes = new FrameEncoder().encode('beat', { finishedUs: 0, wanted: 0 }, TAG).slice();
    bytes[5]! ^= 0x10;
    host.board.receiveBytes(bytes);
    expect(host.told(id)).toEqual([]);
    host.wanted = 0;
    host.live(50_000);
    host.board.move(TARGET);
    expect(host.told(id)).toEqual(['disarmed unwanted']);
    expect(host.outcome(id, 'disarmed').boardUs).toBeLessThanOrEqual(50_000);
  });
});

describe('a host that stalls while a slot is armed', () => {
  test('for 100 ms: the slot fires', () => {
    const host = TestHost.connected();
    const id = host.arm({ count: TARGET });
    host.silent(100_000);
    host.board.move(TARGET);
    expect(host.told(id)).toEqual(['fired']);
  });

  test('for 200 ms: the slot has ended, the connection has not', () => {
    const host = TestHost.connected();
    const id = host.arm({ count: TARGET });
    host.silent(200_000);
    host.board.move(TARGET);
    expect(host.told(id)).toEqual(['disarmed silence']);
    host.beat();
    expect(host.told(host.pulse())).toEqual(['fired']);
  });

  test('for 300 ms: outputs are idle, and what it sends then is refused', () => {
    const host = TestHost.connected();
    const id = host.arm({ count: TARGET });
    const on = host.pulse({ output: 1, widthUs: 1_000_000 });
    host.silent(300_000);
    host.board.move(TARGET);
    host.beat();
    const after = host.pulse();
    expect(host.told(id)).toEqual(['disarmed silence']);
    expect(host.told(on)).toEqual(['fired', 'done silence']);
    expect(host.told(after)).toEqual([]);
    expect(host.faultNames()).toEqual(['watchdogSlots', 'watchdogOutputs', 'wrongTag']);
    expect(host.board.outputs).toBe(0);
  });
});

test('861 commands that lay in a pseudo-terminal for 3 s fire nothing', () => {
  const host = TestHost.connected();
  const stale = Array.from({ length: 861 }, (_, n) =>
    n % 2 === 0
      ? (['pulse', host.pulseMessage()] as const)
      : (['arm', host.armMessage({ slot: n % 16, count: n })] as const),
  );
  host.silent(3_000_000);
  for (const [name, message] of stale) host.sendBytes(name, message as never);
  host.board.move(2000);
  host.silent(100_000);
  expect(host.changes).toEqual([]);
  expect(host.outcomes).toEqual([]);
});

test.each([40, 80])(
  'a host suspended for %i minutes fires nothing of what it had sent, and finds the time again',
  (minutes) => {
    const host = TestHost.connected({ startUs: 2 ** 32 - 5 * MINUTE_US });
    host.keepSamples = false;
    const sentUs = host.board.boardUs;
    const waits = host.pulse({
      flags: PULSE_FLAG.startAt,
      startUs: sentUs + 30_000,
      expiryUs: sentUs + 40_000,
    });
    const armed = host.arm({ count: TARGET });
    // These were written as the host went to sleep, and reach the board as it wakes.
    const stale = [1, 2, 3].map(() => host.pulseMessage());
    host.silent(minutes * MINUTE_US);
    for (const message of stale) host.send('pulse', message, TAG);
    host.identify(0x99);
    const { wraps, boardUs: raw } = host.identities.at(-1)!;
    host.beat();
    host.configure({});
    for (const message of stale) host.send('pulse', message);
    host.board.move(2 * TARGET);
    for (const { id } of stale) {
      expect(['expired', 'refused badExpiry']).toContain(host.told(id).join());
    }
    expect(host.told(armed)[0]).toBe('disarmed silence');
    // Its start was 30 ms ahead and the watchdog 250 ms: this one was right to rise.
    expect(host.told(waits)[0]).toBe('fired');
    expect(host.pulses()).toEqual([[30_000, 40_000]]);

    expect(fromWraps(wraps, raw)).toBe(sentUs + minutes * MINUTE_US);
    // The nearest signed difference alone would be wrong by a whole wrap.
    expect(extend32(sentUs, raw)).not.toBe(sentUs + minutes * MINUTE_US);
  },
);

test('a board that is reset in the middle of a pulse is idle, and has forgotten', () => {
  const host = TestHost.connected();
  host.pulse({ widthUs: 500_000, periodUs: 600_000, repeats: 5 });
  host.arm({ count: TARGET });
  host.live(100_000);
  host.board.reset();
  expect(host.board.outputs).toBe(0);
  host.board.move(2 * TARGET);
  host.silent(5_000_000);
  expect(host.pulses()).toEqual([[0, 100_000]]);
  host.identify(0x99);
  expect(host.identities.at(-1)).toMatchObject({ outcomesKept: 0, previousTag: 0 });
  host.beat();
  expect(host.told(host.pulse({ id: 500 }))).toEqual(['refused notConfigured']);
});

test('a command repeated 100 times and in any order acts once', () => {
  fc.assert(
    fc.property(
      fc.shuffledSubarray(
        Array.from({ length: 500 }, (_, n) => n % 5),
        { minLength: 500 },
      ),
      (order) => {
        const host = TestHost.connected();
        const messages = [0, 1, 2, 3, 4].map((n) =>
          n === 4
            ? (['arm', host.armMessage({ count: TARGET, output: 1 })] as const)
            : ([
                'pulse',
                host.pulseMessage({
                  flags: PULSE_FLAG.startAt,
                  startUs: 1000 + n * 2000,
                  widthUs: 1000,
                  expiryUs: 9_000_000,
                }),
              ] as const),
        );
        for (const which of order) {
          const [name, message] = messages[which]!;
          host.sendBytes(name, message as never);
          host.live(37);
        }
        host.board.move(TARGET + 10);
        host.live(50_000);
        expect(host.pulses(0)).toHaveLength(4);
        expect(host.pulses(1)).toHaveLength(1);
      },
    ),
    { seed: 71, numRuns: 20 },
  );
});

test("the target's count is skipped: the slot is passed, and nothing fires", () => {
  const host = TestHost.connected();
  const id = host.arm({ count: TARGET });
  host.board.move(TARGET - 1);
  host.board.skipCounts(2);
  host.live(1000);
  host.board.move(-5);
  host.board.move(20);
  expect(host.told(id)).toEqual(['passed']);
  expect(host.changes).toEqual([]);
});

test('two slots on one output: one fires, one is busy', () => {
  const host = TestHost.connected();
  const first = host.arm({ slot: 0, count: TARGET });
  const second = host.arm({ slot: 1, count: TARGET + 2 });
  host.board.move(TARGET + 5);
  host.live(50_000);
  expect(host.told(first)).toEqual(['fired', 'done']);
  expect(host.told(second)).toEqual(['refused busy']);
  expect(host.pulses()).toHaveLength(1);
});

test('time and count wrap together under an armed slot without a false firing', () => {
  const host = TestHost.connected({ startUs: 2 ** 32 - 500_000, startCount: 2 ** 31 - 50 });
  const ahead = host.arm({ count: 2 ** 31 + 50 });
  const far = host.arm({ slot: 1, output: 1, count: 2 ** 31 + 75 });
  for (let n = 0; n < 99; n++) {
    host.board.move(1);
    host.live(10_000);
  }
  expect([...host.told(ahead), ...host.told(far)]).toEqual([]);
  host.board.move(1);
  expect(host.told(ahead)).toEqual(['fired']);
  expect(host.told(far)).toEqual([]);
  expect(host.faults).toEqual([]);
});

test('whatever bits are flipped, no command is made up: a frame is whole or dropped', () => {
  fc.assert(
    fc.property(
      fc.array(fc.record({ bit: fc.nat(), twice: fc.boolean() }), { minLength: 1, maxLength: 60 }),
      (flips) => {
        const host = TestHost.connected();
        const encoder = new FrameEncoder();
        const sent = new Map<number, number>();
        let spoilt = 0;
        flips.forEach(({ bit, twice }, n) => {
          const widthUs = 100 + n;
          const pulse = host.pulseMessage({ widthUs });
          const bytes = encoder.encode('pulse', pulse, TAG).slice();
          if (twice) {
            // Clean frames lie between the spoilt ones: they must still act.
            sent.set(pulse.id, widthUs);
          } else {
            const at = bit % ((bytes.length - 1) * 8);
            bytes[at >> 3]! ^= 1 << (at & 7);
            spoilt++;
          }
          host.board.receiveBytes(bytes);
          host.live(1000);
        });
        const fired = new Map(host.pulses().map(([rise, fall], n) => [n, (fall ?? 0) - rise]));
        expect([...fired.values()]).toEqual([...sent.values()]);
        host.live(1000);
        if (spoilt > 0) expect(host.samples.at(-1)!.badFrames).toBeGreaterThanOrEqual(1);
      },
    ),
    { seed: 72, numRuns: 100 },
  );
});

test('a frame written short is dropped, and the one after a new delimiter acts', () => {
  const host = TestHost.connected();
  const encoder = new FrameEncoder();
  const whole = host.pulseMessage({ widthUs: 1000 });
  const bytes = encoder.encode('pulse', host.pulseMessage({ widthUs: 2000 }), TAG).slice();
  // Short by at least one byte of the frame itself; what lacks the delimiter alone is whole.
  for (let length = 1; length < bytes.length - 1; length++) {
    host.board.receiveBytes(bytes.subarray(0, length));
    host.board.receiveBytes(Uint8Array.of(0));
  }
  host.board.receiveBytes(encoder.encode('pulse', whole, TAG));
  host.live(5000);
  expect(host.pulses()).toEqual([[0, 1000]]);
  expect(host.told(whole.id)).toEqual(['fired', 'done']);
});

test('an identify with any protocol but ours changes nothing', () => {
  fc.assert(
    fc.property(
      fc.integer({ min: 0, max: 255 }),
      fc.integer({ min: 0, max: 0xffff }),
      (protocol, newTag) => {
        fc.pre(protocol !== PROTOCOL_VERSION);
        const host = TestHost.connected();
        const id = host.pulse();
        host.send('identify', { nonce: 1, protocol, newTag });
        host.live(20_000);
        expect(host.board.tag).toBe(TAG);
        expect(host.told(id)).toEqual(['fired', 'done']);
      },
    ),
    { seed: 73, numRuns: 50 },
  );
});
