import { execFileSync } from 'node:child_process';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type Alignment, align, convert } from '../../server/analysis/align/align.js';
import { alignSession, ownEdges } from '../../server/analysis/align/alignSession.js';
import { readEdges } from '../../server/analysis/align/readEdges.js';
import { quantile, robustLine } from '../../server/analysis/align/robustLine.js';
import { readSession } from '../../server/analysis/readSession.js';
import { recordedSession } from './recorded.js';

/** mulberry32, a 32-bit generator in the public domain (from memory). */
function dice(seed: number): () => number {
  let a = seed;
  return () => {
    a = (a + 0x6d2b79f5) | 0;
    let t = Math.imul(a ^ (a >>> 15), 1 | a);
    t = (t + Math.imul(t ^ (t >>> 7), 61 | t)) ^ t;
    return ((t ^ (t >>> 14)) >>> 0) / 4_294_967_296;
  };
}
const normal = (random: () => number) =>
  Math.sqrt(-2 * Math.log(1 - random())) * Math.cos(2 * Math.PI * random());

interface Clock {
  readonly seed: number;
  readonly driftPpm: number;
  readonly lostOurs: number;
  readonly lostTheirs: number;
  readonly spurious: number;
  readonly lateS: number;
  readonly offsetS: number;
}

/** A session's sync edges, and the same as an instrument saw them whose clock wanders. */
function simulated(c: Clock, edges = 700, leastS = 0.4, mostS = 1.6) {
  const random = dice(c.seed);
  const truth: { ours: number; theirs: number }[] = [];
  let ours = 1;
  let wanderS = 0;
  for (let i = 0; i < edges; i++) {
    const gap = leastS + random() * (mostS - leastS);
    ours += gap;
    // A random walk of the other clock's phase: 10 us over each root second.
    wanderS += normal(random) * 10e-6 * Math.sqrt(gap);
    truth.push({ ours, theirs: c.offsetS + ours * (1 + c.driftPpm / 1e6) + wanderS });
  }
  const ref = truth.filter(() => random() >= c.lostOurs).map((edge) => edge.ours);
  const seen = truth
    .filter(({ ours: t }) => t >= c.lateS && random() >= c.lostTheirs)
    // Sampled at 30 kHz.
    .map(({ theirs }) => Math.ceil(theirs * 30_000) / 30_000);
  const from = seen[0]!;
  const length = seen.at(-1)! - from;
  const extra = Array.from(
    { length: Math.floor(seen.length * c.spurious) },
    () => from + random() * length,
  );
  return { truth, ref, other: [...seen, ...extra].sort((a, b) => a - b) };
}

const clock: fc.Arbitrary<Clock> = fc.record({
  seed: fc.nat(),
  driftPpm: fc.double({ min: -200, max: 200, noNaN: true }),
  lostOurs: fc.double({ min: 0, max: 0.1, noNaN: true }),
  lostTheirs: fc.double({ min: 0, max: 0.3, noNaN: true }),
  spurious: fc.double({ min: 0, max: 0.1, noNaN: true }),
  lateS: fc.double({ min: 0, max: 300, noNaN: true }),
  offsetS: fc.double({ min: -5_000, max: 5_000, noNaN: true }),
});

describe('edges at random intervals', () => {
  it('are found again through drift, wander, loss, spurious edges and a late start', () => {
    fc.assert(
      fc.property(clock, (c) => {
        const { truth, ref, other } = simulated(c);
        const [found] = align(ref, [other]) as [Alignment];
        expect(found, JSON.stringify(found)).not.toHaveProperty('refused');
        const inside = truth.filter(({ ours }) => ours >= found.fromS && ours <= found.toS);
        const errors = inside.map(({ ours, theirs }) => Math.abs(convert(found, ours) - theirs));
        expect(inside.length).toBeGreaterThan(0.9 * truth.filter((t) => t.ours >= c.lateS).length);
        // A sample of 33 us, and the wander over the few seconds of the curve's neighbours.
        expect(quantile(errors, 0.99)).toBeLessThan(150e-6);
        expect(found.driftPpm).toBeGreaterThan(c.driftPpm - 5);
        expect(found.driftPpm).toBeLessThan(c.driftPpm + 5);
        expect(found.residualsUs.p99).toBeLessThan(200);
      }),
      { seed: 4, numRuns: 25 },
    );
  });

  it('of another session are refused, whatever their loss', () => {
    fc.assert(
      fc.property(clock, fc.nat(), (c, seed) => {
        const { ref } = simulated(c);
        const { other } = simulated({ ...c, seed: seed ^ 0x5555 });
        const [found] = align(ref, [other]);
        expect(found).toHaveProperty('refused');
      }),
      { seed: 5, numRuns: 15 },
    );
  });

  it('are found for several acquisitions, each on a clock of its own', () => {
    const c = {
      seed: 8,
      driftPpm: 80,
      lostOurs: 0,
      lostTheirs: 0.2,
      spurious: 0.05,
      lateS: 0,
      offsetS: 0,
    };
    const { ref, other } = simulated(c);
    const part = (from: number, to: number) => other.slice(from, to).map((t) => t - other[from]!);
    const results = align(ref, [part(20, 150), part(200, 400), part(420, 440)]) as Alignment[];
    expect(results.map((r) => 'refused' in r)).toEqual([false, false, false]);
    expect(results.map((r) => Math.round(r.driftPpm / 25))).toEqual([3, 3, expect.any(Number)]);
    for (const { residualsUs } of results.slice(0, 2)) expect(residualsUs.p99).toBeLessThan(200);
  });

  it('in other units than they were said to be are refused in those words', () => {
    const c = {
      seed: 3,
      driftPpm: 0,
      lostOurs: 0,
      lostTheirs: 0,
      spurious: 0,
      lateS: 0,
      offsetS: 9,
    };
    const { ref, other } = simulated(c);
    const samples = other.map((t) => t * 30_000);
    expect(align(ref, [samples])[0]).toHaveProperty(
      'refused',
      expect.stringContaining('in other units'),
    );
  });

  it('too few to be sure of are refused with their number', () => {
    const { ref, other } = simulated({
      seed: 3,
      driftPpm: 0,
      lostOurs: 0,
      lostTheirs: 0,
      spurious: 0,
      lateS: 0,
      offsetS: 9,
    });
    expect(align(ref, [other.slice(0, 5)])).toEqual([
      { acquisition: 1, refused: expect.stringContaining('5 edges') },
    ]);
  });
});

describe('frames of a periodic clock', () => {
  const frames = (from: number, count: number) =>
    Array.from({ length: count }, (_, i) => from + i / 30);
  const onTheirs = (times: number[]) => times.map((t) => 40 + t * 1.00005);

  it('are counted within their run, and gaps of lost frames kept open', () => {
    const ref = [...frames(5, 300), ...frames(30, 450)];
    const theirs = onTheirs(frames(30, 450)).filter((_, i) => i % 17 !== 5);
    const lossy = ref.filter((_, i) => i % 31 !== 7);
    const [found] = align(lossy, [theirs]) as [Alignment];
    expect(found.driftPpm).toBeCloseTo(50, 3);
    expect(convert(found, 35)).toBeCloseTo(40 + 35 * 1.00005, 9);
    expect(found.method).toBe('counted frames');
  });
  it('are refused when no run is as long, or two are', () => {
    const ref = [...frames(5, 300), ...frames(30, 300)];
    expect(align(ref, [onTheirs(frames(5, 299))])[0]).toHaveProperty(
      'refused',
      expect.stringContaining('299'),
    );
    expect(align(ref, [onTheirs(frames(5, 300))])[0]).toHaveProperty(
      'refused',
      expect.stringContaining('2 runs'),
    );
  });
  it('are counted past edges that are none, at either side, at the beginning too', () => {
    const ref = [...frames(5, 300), ...frames(30, 450)];
    const spurious = (times: number[], at: readonly number[]) =>
      [...times, ...at].sort((a, b) => a - b);
    const theirs = onTheirs(spurious(frames(30, 450), [29.985, 31.012, 33.3133, 40.0217]));
    const ours = spurious(ref, [4.99, 7.0123, 20, 32.611]);
    const [found] = align(ours, [theirs]) as [Alignment];
    expect(found.matched).toBe(450);
    expect(found.driftPpm).toBeCloseTo(50, 3);
    expect(convert(found, 35)).toBeCloseTo(40 + 35 * 1.00005, 9);
  });
  it('are counted from the end when a recording began while they ran', () => {
    const whole = frames(0, 900);
    // Ours began late: the first frame that it has is at its own beginning.
    const late = whole.slice(333).map((t) => t - 11.1);
    const [ours] = align(late, [onTheirs(whole)], { fromS: 0, toS: 60 }) as [Alignment];
    expect(convert(ours, late.at(-1)!)).toBeCloseTo(40 + whole.at(-1)! * 1.00005, 9);
    // Theirs did: its times count from its own beginning.
    const theirs = whole.slice(200).map((t) => t - whole[200]! + 0.01);
    const [other] = align(whole, [theirs], { fromS: -5, toS: 60 }) as [Alignment];
    expect(convert(other, whole.at(-1)!)).toBeCloseTo(theirs.at(-1)!, 9);
    // Not known to be cut, or at both ends: no frame is certain.
    expect(align(late, [onTheirs(whole)])[0]).toHaveProperty('refused');
    const toS = late.at(-1)! + 0.01;
    expect(align(late, [onTheirs(whole)], { fromS: 0, toS })[0]).toHaveProperty('refused');
  });
  it('are held by the pauses between runs when the first and last run were cut', () => {
    const ref = [...frames(5, 300), ...frames(30, 450), ...frames(61, 450), ...frames(95, 200)];
    const theirs = onTheirs([...frames(30, 450).slice(77), ...frames(61, 450).slice(0, 401)]);
    const [found] = align(ref, [theirs]) as [Alignment];
    expect(found.matched).toBe(450 - 77 + 401);
    expect(convert(found, 35)).toBeCloseTo(40 + 35 * 1.00005, 9);
    // A pause of another length is another pause.
    const other = onTheirs([...frames(30, 450).slice(77), ...frames(62, 401)]);
    expect(align(ref, [other])[0]).toHaveProperty('refused');
  });
  it('are matched in order when there are as many acquisitions as runs', () => {
    const ref = [...frames(5, 300), ...frames(30, 300)];
    const results = align(ref, [frames(0, 300), frames(0, 300)]) as Alignment[];
    expect(results.map(({ offsetS }) => Math.round(offsetS))).toEqual([-5, -30]);
  });
});

/** What R 4.2.2 printed for the loop below. */
const KEPT = '-0.349460968141888  1.002570623206775';

describe('the robust line', () => {
  // NIST Statistical Reference Datasets, linear regression, Norris (certified values there).
  const norris =
    '0.1 0.2 338.8 337.4 118.1 118.2 888.0 884.6 9.2 10.1 228.1 226.5 668.5 666.3 998.5 996.3 449.1 448.6 ' +
    '778.9 777.0 559.2 558.2 0.3 0.4 0.1 0.6 778.1 775.5 668.8 666.9 339.3 338.0 448.9 447.5 10.8 11.6 ' +
    '557.7 556.0 228.3 228.1 998.0 995.8 888.8 887.6 119.6 120.2 0.3 0.3 0.6 0.3 557.6 556.8 339.3 339.1 ' +
    '888.0 887.2 998.5 999.0 778.9 779.0 10.2 11.1 117.6 118.3 228.9 229.2 668.4 669.1 449.2 448.9 0.2 0.5';
  const numbers = norris.split(' ').map(Number);
  const y = numbers.filter((_, i) => i % 2 === 0);
  const x = numbers.filter((_, i) => i % 2 === 1);

  it('is the certified least-squares line when nothing is down-weighted', () => {
    // The dataset lists y, then x.
    const line = robustLine(x, y, Number.POSITIVE_INFINITY);
    expect(line.slope).toBeCloseTo(1.00211681802045, 12);
    expect(line.offset).toBeCloseTo(-0.262323073774029, 10);
  });

  it('is the line of weighted regressions by R (lm) with the same weights, an outlier among them', () => {
    const withOutlier = y.map((value, i) => (i === 7 ? value + 40 : value));
    const code = `x <- c(${x}); y <- c(${withOutlier})
w <- rep(1, length(x))
for (i in 1:200) { f <- lm(y ~ x, weights = w); r <- resid(f); s <- 1.4826 * median(abs(r)); w <- pmin(1, 1.345 * s / abs(r)) }
cat(format(coef(f), digits = 15))`;
    let printed: string;
    try {
      printed = execFileSync('Rscript', ['--vanilla', '-e', code], { encoding: 'utf8' });
    } catch {
      console.log('notice: R is not installed; compared with the answer kept from R 4.2.2');
      printed = KEPT;
    }
    const line = robustLine(x, withOutlier);
    const [offset, slope] = printed.trim().split(/\s+/).map(Number);
    expect(line.offset).toBeCloseTo(offset!, 6);
    expect(line.slope).toBeCloseTo(slope!, 8);
  });
});

describe('a file of edges', () => {
  it('may be a bare column, samples at a rate, or a table with acquisitions', () => {
    expect(readEdges('1.5\n2.5\n')).toEqual([[1.5, 2.5]]);
    expect(readEdges('30000\r\n45000\r\n', { rateHz: 30_000 })).toEqual([[1, 1.5]]);
    expect(readEdges('acquisition,time_s\na,1\na,2\nb,0\n')).toEqual([[1, 2], [0]]);
    expect(readEdges('1\n2\n3\n0.5\n1.5\n')).toEqual([
      [1, 2, 3],
      [0.5, 1.5],
    ]);
    expect(readEdges('n,x\n1,4\n2,5\n', { column: 'x' })).toEqual([[4, 5]]);
  });
  it('is refused with the line that is no number', () => {
    expect(() => readEdges('1\ntwo\n')).toThrow('line 2');
    expect(() => readEdges('n,x\n1,4\n')).toThrow('--column');
  });
});

describe('a recorded session', () => {
  it('is put on the clock of an instrument that saw its sync train', async () => {
    const rigExtra = 'sync:\n  output: sync\n  width: 10 ms\n  from: 200 ms\n  to: 900 ms\n';
    const rules =
      'title: Water\nbelt: 180 cm\nrules:\n  water:\n    when: reaches 90 cm\n    do: give 4 uL\nend: time >= 3 min\n';
    const recorded = recordedSession({ minutes: 4, rules, rigExtra });
    const session = await readSession(recorded.folder);
    const { line, times } = ownEdges(session);
    expect(line).toBe('sync');
    expect(times.length).toBeGreaterThan(200);
    const random = dice(12);
    const theirs = times
      .slice(30)
      .filter(() => random() > 0.2)
      .map((t) => 17.25 + t * 1.0001);
    const { good, events } = alignSession(session, [theirs]);
    expect(good[0]!.driftPpm).toBeCloseTo(100, 2);
    const water = events.filter(({ kind, otherS }) => kind === 'water' && otherS !== null);
    expect(water.length).toBeGreaterThan(3);
    for (const { sessionS, otherS } of water)
      expect(otherS).toBeCloseTo(17.25 + sessionS * 1.0001, 5);
    expect(events.some(({ otherS }) => otherS === null)).toBe(true);
    const wrong = theirs.map((_, i) => i * 0.55 + random() * 0.3);
    expect(() => alignSession(session, [wrong])).toThrow('acquisition 1');
    recorded.remove();
  });
});
