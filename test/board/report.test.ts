import { describe, expect, test } from 'vitest';
import { RESET_CAUSE } from '../../server/wire/messages.js';
import { TAG, TestHost } from './testHost.js';

describe('what the board tells', () => {
  test('it speaks first after reset, under tag 0', () => {
    const host = new TestHost({ model: 'a board', boardId: 9 });
    expect(host.identities).toHaveLength(1);
    expect(host.identities[0]).toMatchObject({
      tag: 0,
      nonce: 0,
      model: 'a board',
      boardId: 9,
      previousTag: 0,
      resetCause: RESET_CAUSE.powerOn,
    });
    host.silent(10_000);
    expect(host.samples.map((sample) => sample.tag)).toEqual([0, 0]);
  });

  test('samples come every 5 ms at rest and every millisecond when something changes', () => {
    const host = TestHost.connected();
    host.silent(20_000);
    expect(host.samples.map((sample) => sample.boardUs)).toEqual([5000, 10_000, 15_000, 20_000]);
    for (let n = 1; n <= 5; n++) {
      host.board.move(1);
      host.silent(1000);
    }
    host.silent(4000);
    expect(host.samples.slice(4).map((sample) => [sample.boardUs, sample.count])).toEqual([
      [21_000, 1],
      [22_000, 2],
      [23_000, 3],
      [24_000, 4],
      [25_000, 5],
    ]);
    host.silent(1000);
    expect(host.samples.at(-1)!.boardUs).toBe(30_000);
  });

  test('an edge is stamped at its own microsecond and count, and told once', () => {
    const host = TestHost.connected();
    host.board.move(-7);
    host.silent(1234);
    host.board.setInput(2, 1);
    host.board.setInput(2, 1);
    host.silent(15);
    host.board.setInput(2, 0);
    expect(host.edges).toEqual([
      { boardUs: 1234, count: -7, input: 2, level: 1, tag: TAG },
      { boardUs: 1249, count: -7, input: 2, level: 0, tag: TAG },
    ]);
  });

  test('a bouncing contact is told edge by edge', () => {
    const host = TestHost.connected();
    for (let n = 0; n < 9; n++) {
      host.silent(130);
      host.board.setInput(0, n % 2 === 0 ? 1 : 0);
    }
    expect(host.edges.map((edge) => edge.level)).toEqual([1, 0, 1, 0, 1, 0, 1, 0, 1]);
    host.silent(1000);
    expect(host.samples.at(-1)!.inputs).toBe(1);
  });

  test('board time and its wraps come once a second', () => {
    const host = new TestHost();
    host.silent(3_500_000);
    expect(host.clocks).toEqual([1e6, 2e6, 3e6]);
  });

  test('an output is shown as on, and its pin follows the idle level', () => {
    const host = TestHost.connected();
    host.configure({ output: 1, flags: 1 });
    expect([host.board.pinLevel(0), host.board.pinLevel(1)]).toEqual([0, 1]);
    host.pulse({ output: 0 });
    host.pulse({ output: 1 });
    host.silent(1000);
    expect([host.board.pinLevel(0), host.board.pinLevel(1)]).toEqual([1, 0]);
    expect(host.samples.at(-1)!.outputs).toBe(3);
    host.live(10_000);
    expect(host.board.outputs).toBe(0);
    expect([host.board.pinLevel(0), host.board.pinLevel(1)]).toEqual([0, 1]);
  });

  test('lost bytes and bad frames are counted, and counters wrap', () => {
    const host = TestHost.connected();
    host.board.overrun(258);
    for (let n = 0; n < 300; n++) host.board.receiveBytes(Uint8Array.of(1, 2, 0));
    host.silent(1000);
    expect(host.samples.at(-1)).toMatchObject({ overruns: 2, badFrames: 300 - 256 });
  });

  test('a message that only boards send is a bad frame to a board', () => {
    const host = TestHost.connected();
    host.sendBytes('clock' as never, { boardUs: 1, wraps: 0 } as never);
    host.silent(1000);
    expect(host.samples.at(-1)!.badFrames).toBe(1);
  });

  test('time and count wrap without a step', () => {
    const startUs = 2 ** 32 - 2500;
    const host = new TestHost({ startUs, startCount: 2 ** 31 - 2 });
    for (let n = 0; n < 5; n++) {
      host.board.move(1);
      host.silent(1000);
    }
    expect(host.samples.map((sample) => sample.boardUs)).toEqual(
      [1, 2, 3, 4, 5].map((n) => (startUs + n * 1000) % 2 ** 32),
    );
    expect(host.samples.map((sample) => sample.count)).toEqual([
      2 ** 31 - 1,
      -(2 ** 31),
      1 - 2 ** 31,
      2 - 2 ** 31,
      3 - 2 ** 31,
    ]);
    host.identify();
    expect(host.identities.at(-1)).toMatchObject({ wraps: 1, boardUs: 2500 });
  });

  test('after a reset the clock and the count are 0 and the boot id is another', () => {
    const host = TestHost.connected();
    host.board.move(500);
    host.live(2_000_000);
    host.board.reset(RESET_CAUSE.brownOut);
    const [first, , after] = host.identities;
    expect(after!.bootId).not.toBe(first!.bootId);
    expect(after).toMatchObject({ tag: 0, boardUs: 0, resetCause: RESET_CAUSE.brownOut });
    expect(host.faultNames()).toEqual(['brownOut']);
    expect(host.board.count).toBe(0);
    expect(host.board.worldUs).toBe(2_000_000);
    host.silent(5000);
    expect(host.samples.at(-1)).toMatchObject({ boardUs: 1000, count: 0, tag: 0 });
  });
});
