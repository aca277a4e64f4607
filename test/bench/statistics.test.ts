import { describe, expect, it } from 'vitest';
import { median, quantile, quantilesOf } from './statistics.js';

describe('order statistics', () => {
  it('takes the nearest rank', () => {
    // Nearest rank, the worked example of an open encyclopaedia's page on percentiles. (from memory)
    const sorted = [15, 20, 35, 40, 50];
    const at = (percent: number) => quantile(sorted, percent / 100);
    expect([5, 30, 40, 50, 100].map(at)).toEqual([15, 20, 20, 35, 50]);
  });

  it('sorts numbers as numbers, and leaves what it is given alone', () => {
    const values = [100, 9, 30];
    expect(median(values)).toBe(30);
    expect(values).toEqual([100, 9, 30]);
    expect(quantilesOf(values)).toMatchObject({ n: 3, p50: 30, max: 100 });
  });

  it('has no value where there is nothing', () => {
    expect(median([])).toBeNaN();
  });
});
