import { describe, expect, test } from 'vitest';
import { FAULT, PROTOCOL_VERSION, PULSE_FLAG } from '../../server/wire/messages.js';
import { TAG, TestHost } from './testHost.js';

describe('a connection', () => {
  test('begins with an identity that repeats the nonce, under the new tag', () => {
    const host = TestHost.connected();
    expect(host.identities.at(-1)).toMatchObject({ nonce: 77, tag: TAG, previousTag: 0 });
    host.live(10_000);
    expect(host.samples.every((sample) => sample.tag === TAG)).toBe(true);
  });

  test('is not given to another protocol, and an old one stays as it was', () => {
    const host = TestHost.connected();
    host.send('identify', { nonce: 5, protocol: PROTOCOL_VERSION + 1, newTag: 0x777 });
    expect(host.identities.at(-1)).toMatchObject({ nonce: 5, protocol: 1, tag: 0x777 });
    expect(host.faults).toMatchObject([{ fault: FAULT.badProtocol, detail: 2, tag: 0x777 }]);
    expect(host.told(host.pulse())).toEqual(['fired']);
  });

  test('asked for again under its own tag ends nothing', () => {
    const host = TestHost.connected();
    const armed = host.arm({ count: 10 });
    host.identify();
    expect(host.told(armed)).toEqual([]);
    host.board.move(10);
    expect(host.told(armed)).toEqual(['fired']);
  });

  test('that is replaced ends all it asked for, and unconfigures', () => {
    const host = TestHost.connected();
    const armed = host.arm({ slot: 2, count: 10 });
    const waits = host.pulse({ flags: PULSE_FLAG.startAt, startUs: 20_000 });
    const on = host.pulse({ output: 1 });
    host.silent(1000);
    host.identify(0x99);
    expect(host.told(armed)[0]).toBe('disarmed newTag');
    expect(host.told(waits)[0]).toBe('disarmed newTag');
    expect(host.told(on)[1]).toBe('done newTag');
    expect(host.outcomes.find((one) => one.id === armed)!.tag).toBe(TAG);
    expect(host.identities.at(-1)).toMatchObject({ tag: 0x99, previousTag: TAG });
    host.beat();
    expect(host.told(host.pulse({ id: 1000 }))).toEqual(['refused notConfigured']);
  });

  test('keeps the memory of the last fall and rise, so that a new host cannot evade a guard', () => {
    const host = TestHost.connected();
    host.configure({ leastGapUs: 100_000 });
    host.pulse();
    host.live(20_000);
    host.identify(0x99);
    host.beat();
    host.configure({ leastGapUs: 100_000 });
    expect(host.told(host.pulse())).toEqual(['refused leastGap']);
    host.configure({ leastCounts: 10 });
    expect(host.told(host.pulse())).toEqual(['refused leastCounts']);
  });

  test('gets every outcome kept, oldest first, and as many as identity says', () => {
    const host = TestHost.connected();
    const first = host.pulse();
    host.live(20_000);
    const second = host.pulse();
    host.live(20_000);
    host.outcomes.length = 0;
    host.identify(0x99);
    expect(host.identities.at(-1)!.outcomesKept).toBe(4);
    expect(host.outcomes.map((one) => [one.id, one.kind, one.repeated, one.tag])).toEqual([
      [first, 1, 1, 0x99],
      [first, 2, 1, 0x99],
      [second, 1, 1, 0x99],
      [second, 2, 1, 0x99],
    ]);
    expect(host.outcomes[1]).toMatchObject({ boardUs: 10_000, onUs: 10_000 });
  });

  test('keeps the newest outcomes when there are more than it has places for', () => {
    const host = TestHost.connected({ outcomesKept: 32 });
    const ids = Array.from({ length: 40 }, () => host.pulse({ output: 2 }));
    host.outcomes.length = 0;
    host.identify(0x99);
    expect(host.outcomes.map((one) => one.id)).toEqual(ids.slice(-32));
  });

  test('forgets outcomes at a reset', () => {
    const host = TestHost.connected();
    host.pulse();
    host.board.reset();
    host.identify(0x99);
    expect(host.identities.at(-1)!.outcomesKept).toBe(0);
  });

  test('of an old tag is not obeyed, which is told at most ten times a second', () => {
    const host = TestHost.connected();
    host.identify(0x99);
    host.beat();
    host.configure({});
    for (let n = 0; n < 100; n++) {
      host.send('pulse', host.pulseMessage(), TAG);
      host.live(5000);
    }
    expect(host.changes).toEqual([]);
    const told = host.faults.filter((fault) => fault.fault === FAULT.wrongTag);
    expect(told.length).toBeGreaterThanOrEqual(5);
    expect(told.length).toBeLessThanOrEqual(6);
    host.live(100_000);
    const refused = host.faults.reduce((sum, fault) => sum + fault.detail, 0);
    expect(refused).toBe(100);
  });

  test('is not needed to make things quiet', () => {
    for (const tag of [0, 0x1234]) {
      const host = TestHost.connected();
      const id = host.pulse();
      host.sendBytes('quiet', { outputs: 0xffff }, tag);
      expect(host.told(id)).toEqual(['fired', 'done cut']);
    }
  });
});

describe('an id', () => {
  test('that comes again is told what became of it, and does nothing', () => {
    const host = TestHost.connected();
    const pulse = host.pulseMessage();
    host.send('pulse', pulse);
    host.live(20_000);
    host.send('pulse', pulse);
    expect(host.told(pulse.id)).toEqual(['fired', 'done', 'fired again', 'done again']);
    expect(host.pulses()).toHaveLength(1);
  });

  test('that waits or is armed is told nothing when it comes again', () => {
    const host = TestHost.connected();
    const arm = host.armMessage({ count: 10 });
    host.send('arm', arm);
    for (let n = 0; n < 70; n++) host.pulse({ output: 7 });
    host.send('arm', arm);
    expect(host.told(arm.id)).toEqual([]);
  });

  test('far below the highest, of which nothing is known, is refused as old', () => {
    const host = TestHost.connected();
    host.pulse({ id: 1000 });
    expect(host.told(host.pulse({ output: 1, id: 936 }))).toEqual(['fired']);
    expect(host.told(host.pulse({ output: 1, id: 935 }))).toEqual(['refused oldId']);
  });

  test('may come out of order', () => {
    const host = TestHost.connected();
    const ids = [5, 70, 6, 69, 7];
    for (const id of ids) {
      host.pulse({ id, widthUs: 100 });
      host.live(1000);
    }
    for (const id of ids) expect(host.told(id)).toEqual(['fired', 'done']);
  });

  test('may be as high as 2^32 - 1', () => {
    const host = TestHost.connected();
    host.sendBytes('pulse', host.pulseMessage({ id: 0xffff_fffe }));
    host.sendBytes('pulse', host.pulseMessage({ id: 0xffff_ffff, output: 1 }));
    expect(host.told(0xffff_fffe)).toEqual(['fired']);
    expect(host.told(0xffff_ffff)).toEqual(['fired']);
  });

  test('is free again under a new tag', () => {
    const host = TestHost.connected();
    host.pulse({ id: 3 });
    host.live(20_000);
    host.identify(0x99);
    host.beat();
    host.configure({});
    host.pulse({ id: 3 });
    host.live(20_000);
    expect(host.pulses()).toHaveLength(2);
  });
});
