import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, describe, expect, test } from 'vitest';
import { DEFAULT_LATENCY, latencyAt, readLatency } from '../../server/rehearse/latency.js';
import { scratchFolder } from '../session/rehearsed.js';

const { folder, remove } = scratchFolder();
afterAll(remove);

function read(text: string) {
  const path = join(folder, 'latencies');
  writeFileSync(path, text);
  return readLatency(path);
}

describe('a distribution of latencies', () => {
  test('is the sorted values, with straight lines between them', () => {
    const latency = read('300\n100\n\n# a comment\n200\n');
    const at = [0, 0.25, 0.5, 0.75, 1].map((share) => latencyAt(latency, share));
    expect(at).toEqual([100, 150, 200, 250, 300]);
    expect(latency.words).toMatch(/^measured: .*latencies$/);
  });

  test('is read from a list, and from a calibration however deep it lies', () => {
    expect(latencyAt(read('[10, 20, 30]'), 0.5)).toBe(20);
    const kept = { results: { latency: { values: { roundTripUs: [5, 15] } } } };
    expect(latencyAt(read(JSON.stringify(kept)), 0.5)).toBe(10);
  });

  test('is read from counts between edges', () => {
    const latency = read(JSON.stringify({ roundTripUs: { edges: [0, 100, 200], counts: [3, 1] } }));
    expect(latencyAt(latency, 0.75)).toBe(100);
    expect(latencyAt(latency, 0.375)).toBe(50);
    expect(latencyAt(latency, 1)).toBe(200);
  });

  test('of one value is that value', () => {
    const one = read('42');
    expect([0, 0.3, 1].map((share) => latencyAt(one, share))).toEqual([42, 42, 42]);
  });

  test('is stated where nothing was measured', () => {
    expect(DEFAULT_LATENCY.words).toContain('not measured');
    expect(latencyAt(DEFAULT_LATENCY, 0.5)).toBe(130);
    expect(latencyAt(DEFAULT_LATENCY, 0.99)).toBe(400);
  });

  test.each([
    ['', 'no list of numbers'],
    ['[]', 'no list of numbers'],
    ['{"a": 1}', 'roundTripUs'],
    ['{"roundTripUs": {"edges": [1, 2], "counts": [0]}}', 'counts are all 0'],
    ['{', 'no JSON'],
    ['12\nfast\n', 'line 2 is no number: fast'],
    ['-4', 'less than 0'],
  ])('of %j is refused: %s', (text, why) => {
    expect(() => read(text)).toThrow(why);
  });

  test('of no file says which one was not there', () => {
    expect(() => readLatency(join(folder, 'none'))).toThrow(/none: ENOENT/);
  });
});
