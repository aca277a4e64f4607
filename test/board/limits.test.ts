import fc from 'fast-check';
import { expect, test } from 'vitest';
import { HostileHost } from './hostileHost.js';
import { LimitObserver } from './limitObserver.js';
import { TestHost } from './testHost.js';

const RUNS = 20;
const COMMANDS = 50_000;
/** Some seconds of pure reckoning, on a machine that may be busy. */
const PATIENCE_MS = 180_000;

test(
  'a million commands of a hostile host never take an output beyond its limits',
  () => {
    let rises = 0;
    fc.assert(
      fc.property(fc.integer(), fc.integer({ min: 0, max: 2 ** 32 - 1 }), (seed, startUs) => {
        const host = new TestHost({ startUs, startCount: startUs | 0, outputs: 4 });
        const observer = new LimitObserver(host);
        const hostile = new HostileHost(host, observer, seed);
        for (let n = 0; n < COMMANDS; n++) {
          hostile.act();
          observer.settle();
          if (observer.broken.length > 0) throw new Error(`command ${n}: ${observer.broken[0]}`);
        }
        rises += observer.rises;
      }),
      { seed: 81, numRuns: RUNS, endOnFailure: true },
    );
    // Enough of it got through to mean something.
    expect(rises).toBeGreaterThan(RUNS * 1000);
  },
  PATIENCE_MS,
);
