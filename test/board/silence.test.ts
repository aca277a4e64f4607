import { describe, expect, test } from 'vitest';
import { CONFIGURE_FLAG, PULSE_FLAG } from '../../server/wire/messages.js';
import { TAG, TestHost } from './testHost.js';

const { finishOnSilence } = CONFIGURE_FLAG;

describe('a silent host', () => {
  test('loses its slots after 150 ms and its outputs and tag after 250 ms', () => {
    const host = TestHost.connected();
    const armed = host.arm({ count: 10 });
    const on = host.pulse({ output: 1, widthUs: 900_000 });
    host.silent(149_000);
    expect(host.told(armed)).toEqual([]);
    host.silent(1000);
    expect(host.told(armed)).toEqual(['disarmed silence']);
    expect(host.told(on)).toEqual(['fired']);
    host.silent(100_000);
    expect(host.told(on)).toEqual(['fired', 'done silence']);
    expect(host.pulses(1)).toEqual([[0, 250_000]]);
    expect(host.faultNames()).toEqual(['watchdogSlots', 'watchdogOutputs']);
    expect(host.board.tag).toBe(0);
  });

  test('hears the reason as the last word under its tag, and then tag 0', () => {
    const host = TestHost.connected();
    host.silent(260_000);
    expect(host.faults.at(-1)!.tag).toBe(TAG);
    expect(host.samples.at(-1)!.tag).toBe(0);
    host.identify(0x99);
    expect(host.identities.at(-1)!.previousTag).toBe(TAG);
  });

  test('is one that hears and commands but finishes nothing', () => {
    const host = TestHost.connected();
    for (let n = 0; n < 30; n++) {
      host.silent(10_000);
      // Beats with an old stamp, and commands, feed nothing.
      host.beat(0);
      host.pulse({ widthUs: 100 });
    }
    expect(host.faultNames().slice(0, 2)).toEqual(['watchdogSlots', 'watchdogOutputs']);
    expect(host.pulses().at(-1)![0]).toBeLessThan(250_000);
  });

  test('gets its slots back by beating again before 250 ms', () => {
    const host = TestHost.connected();
    host.silent(200_000);
    const during = host.arm({ count: 10 });
    host.beat();
    const after = host.arm({ slot: 1, count: 11 });
    host.live(500_000);
    expect(host.told(during)).toEqual(['refused silence']);
    expect(host.told(after)).toEqual([]);
    expect(host.faultNames()).toEqual(['watchdogSlots']);
  });

  test('loses its slots again when it falls silent again', () => {
    const host = TestHost.connected();
    host.silent(200_000);
    host.beat();
    const id = host.arm({ count: 10 });
    host.silent(150_000);
    expect(host.told(id)).toEqual(['disarmed silence']);
    expect(host.faultNames()).toEqual(['watchdogSlots', 'watchdogSlots']);
  });

  test('loses pulses that were still waiting', () => {
    const host = TestHost.connected();
    const id = host.pulse({
      flags: PULSE_FLAG.startAt,
      startUs: 400_000,
      expiryUs: 500_000,
    });
    host.silent(600_000);
    expect(host.told(id)).toEqual(['disarmed silence']);
    expect(host.changes).toEqual([]);
  });

  test('may have one pulse finished where the output says so, and no more of its train', () => {
    const host = TestHost.connected();
    host.configure({ flags: finishOnSilence });
    const id = host.pulse({ widthUs: 400_000, periodUs: 500_000, repeats: 3 });
    host.silent(2_000_000);
    expect(host.pulses()).toEqual([[0, 400_000]]);
    expect(host.told(id)).toEqual(['fired', 'done silence']);
    expect(host.outcome(id, 'done').tag).toBe(0);
  });

  test('ends a train that is between two pulses, finish or not', () => {
    const host = TestHost.connected();
    host.configure({ flags: finishOnSilence });
    host.pulse({ widthUs: 100_000, periodUs: 300_000, repeats: 3 });
    host.silent(2_000_000);
    expect(host.pulses()).toEqual([[0, 100_000]]);
  });

  test('does not spoil the reason of a pulse that finishes whole', () => {
    const host = TestHost.connected();
    host.configure({ flags: finishOnSilence });
    const id = host.pulse({ widthUs: 400_000 });
    host.silent(1_000_000);
    expect(host.told(id)).toEqual(['fired', 'done']);
  });

  test('cannot stretch a finishing pulse beyond its cut-off by a new connection', () => {
    const host = TestHost.connected();
    host.configure({ flags: finishOnSilence, longestOnUs: 400_000 });
    const id = host.pulse({ widthUs: 400_000 });
    host.silent(300_000);
    host.identify(0x99);
    host.beat();
    host.configure({ longestOnUs: 350_000, flags: finishOnSilence });
    host.live(200_000);
    expect(host.pulses()).toEqual([[0, 350_000]]);
    expect(host.told(id)).toContain('done longestOn');
  });
});

describe('beats', () => {
  test('are needed before anything is acted on', () => {
    const host = new TestHost();
    host.identify();
    host.configure({});
    expect(host.told(host.pulse())).toEqual(['refused silence']);
    expect(host.told(host.arm({ count: 9 }))).toEqual(['refused silence']);
    host.beat();
    expect(host.told(host.pulse())).toEqual(['fired']);
  });

  test('of a handshake that lay in a buffer for a second start nothing', () => {
    const host = new TestHost();
    host.silent(1_000_000);
    host.identify();
    host.beat(0);
    host.configure({});
    const armed = host.arm({ count: 9 });
    host.board.move(20);
    expect(host.told(armed)).toEqual(['refused silence']);
    expect(host.changes).toEqual([]);
  });

  test('with a stamp ahead of board time are ignored, mask and all', () => {
    const host = TestHost.connected();
    const armed = host.arm({ count: 9 });
    host.wanted = 0;
    host.beat(1);
    expect(host.told(armed)).toEqual([]);
    host.silent(150_000);
    host.beat(200_000);
    expect(host.told(armed)).toEqual(['disarmed silence']);
  });

  test('older than the newest are ignored, mask and all', () => {
    const host = TestHost.connected();
    host.live(100_000);
    const armed = host.arm({ count: 9 });
    host.wanted = 0;
    host.beat(99_999);
    expect(host.told(armed)).toEqual([]);
    host.beat(100_000);
    expect(host.told(armed)).toEqual(['disarmed unwanted']);
  });

  test('end the silence at the stamp they carry, not when they come', () => {
    const host = TestHost.connected();
    host.silent(100_000);
    host.beat(40_000);
    host.silent(89_000);
    expect(host.faultNames()).toEqual([]);
    host.silent(1000);
    expect(host.faultNames()).toEqual(['watchdogSlots']);
  });

  test('go on over the wrap of board time', () => {
    const host = TestHost.connected({ startUs: 2 ** 32 - 100_000 });
    const armed = host.arm({ count: 9 });
    host.live(1_000_000);
    expect(host.faults).toEqual([]);
    host.board.move(9);
    expect(host.told(armed)).toEqual(['fired']);
  });
});
