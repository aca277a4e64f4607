/** What happens when two things meet on the board, swept through the moment of meeting. */
import { expect, test } from 'vitest';
import { ConformanceHost } from '../../hardware-sim/conformance/conformanceHost.js';
import { emulatedLine } from '../../hardware-sim/conformance/lines.js';

test('a disarming beat that races the edge gives one outcome, which the pin agrees with', async () => {
  const line = emulatedLine();
  const { board } = line;
  const host = new ConformanceHost(line);
  await host.connect();
  let rises = 0;
  board.probe = (_output, level) => {
    rises += level;
  };
  const told = new Map<string, number>();
  // The beat takes 0.3 ms on the line; the board acts on it within some 0.3 ms more.
  for (let offsetUs = 150; offsetUs < 800; offsetUs += 13) {
    host.wanted = 0xffff_ffff;
    host.beat();
    const id = host.arm({ count: host.count + 1, widthUs: 500 });
    await host.live(4_000);
    const before = rises;
    host.wanted = 0;
    host.beat();
    board.advanceTo(board.worldUs + offsetUs);
    board.step(1);
    await host.live(6_000);
    const words = host.told(id);
    told.set(words, (told.get(words) ?? 0) + 1);
    expect(rises - before).toBe(words === 'fired, done' ? 1 : 0);
  }
  expect([...told.keys()].sort()).toEqual(['disarmed unwanted', 'fired, done']);
});

test('of two slots on one output, a count apart, one fires and the other is busy', async () => {
  const line = emulatedLine();
  const host = new ConformanceHost(line);
  await host.connect();
  for (const rate of [5_021, 20_011, 50_021]) {
    const { count } = host;
    const first = host.arm({ slot: 0, count: count + 20, widthUs: 5_000 });
    const second = host.arm({ slot: 1, count: count + 21, widthUs: 5_000 });
    await host.live(5_000);
    await line.turn!(30, rate);
    await host.live(10_000);
    host.expectTold(first, 'fired, done');
    host.expectTold(second, 'refused busy');
  }
});

test('six slots fire on six counts in a row, at 20,000 edges a second', async () => {
  const line = emulatedLine();
  const host = new ConformanceHost(line);
  await host.connect();
  for (let output = 0; output < 6; output++) host.configure({ output });
  await host.live(8_000);
  const { count } = host;
  const ids = [0, 1, 2, 3, 4, 5].map((n) =>
    host.arm({ slot: n, output: n, count: count + 10 + n, widthUs: 3_000 }),
  );
  await host.live(10_000);
  await line.turn!(30, 20_011);
  await host.live(20_000);
  ids.forEach((id, n) => {
    host.expectTold(id, 'fired, done');
    expect(host.outcome(id, 'fired').count).toBe(count + 10 + n);
  });
});
