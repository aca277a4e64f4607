import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import { parseRig, readRig } from '../../server/session/rig/readRig.js';

const demoPath = join(packageRoot, 'hardware-sim/demo/rig.yaml');
const demo = readFileSync(demoPath, 'utf8');

/** The demo rig with one piece of text replaced, so that one thing is wrong. */
function spoilt(from: string, to: string): string {
  expect(demo).toContain(from);
  return demo.replace(from, to);
}
function problemsOf(text: string): string[] {
  return parseRig('rig.yaml', text).problems.map((p) => `${p.line}:${p.column} ${p.message}`);
}

describe('what viewers may', () => {
  it('is to look, unless the file lets them hold the stimulus, and nothing else', () => {
    const may = (line: string) => parseRig('rig.yaml', `${demo}\n${line}`).rig?.viewersMayHold;
    expect(may('')).toBe(false);
    expect(may('viewers_may: only look')).toBe(false);
    expect(may('viewers_may: hold stimulus')).toBe(true);
    const [problem] = problemsOf(`${demo}\nviewers_may: end the session`);
    expect(problem).toContain('expected only look or hold stimulus');
  });
});

describe('the demo rig file', () => {
  const rig = readRig(demoPath);

  it('is read with its amounts in base units', () => {
    expect(rig.belt).toMatchObject({ lengthCm: 180, countsPerCm: 25, toleranceCm: 0.5 });
    expect(rig.belt.seam).toEqual({ line: 1, offsetCm: 0, warnCm: 1, stopCm: 3 });
    expect(rig.lick).toEqual({ line: 0, lockoutUs: 50_000, stuckUs: 1_000_000, artefactUs: 5_000 });
    expect(rig.water).toEqual({ perSessionNl: 1e6, perDayNl: 1.5e6, largestDropNl: 12_000 });
  });

  it('opens its valve for the dead time and the volume', () => {
    const valve = rig.outputs.find((output) => output.kind === 'valve')!.valve!;
    expect(valve.deadUs + 4_000 * valve.usPerNl).toBe(8_000 + 4 * 12_000);
  });

  it('reads a duty as a share of a stretch of time', () => {
    const laser = rig.outputs.find((output) => output.name === 'laser')!;
    expect(laser.duty).toEqual({ share: 0.5, windowUs: 10_000_000 });
  });
});

describe('a rig file with a mistake', () => {
  const cases: [string, string, string, RegExp][] = [
    ['an unknown key', 'rig: demo', 'rigg: demo', /unknown key `rigg`: expected one of rig, board/],
    ['a missing key', 'rig: demo\n', '', /missing key `rig`/],
    [
      'a number without its unit',
      'length: 180 cm',
      'length: 180',
      /found `180`: expected a length/,
    ],
    ['a wrong unit', 'longest_on: 250 ms', 'longest_on: 250 cm', /expected a time, such as 50 ms/],
    ['a wrong kind', 'kind: valve', 'kind: tap', /found `tap`: expected valve or stimulus or mark/],
    [
      'two outputs on one line',
      'line: 1\n    kind: stimulus',
      'line: 0\n    kind: stimulus',
      /line 0 is `valve` already/,
    ],
    ['a seam input that is not there', 'input: seam', 'input: hem', /no input is called `hem`/],
    [
      'a second lick sensor',
      'spikes:\n    line: 2',
      'spikes:\n    line: 2\n    use: lick',
      /a second lick sensor/,
    ],
    [
      'more water a session than a day',
      'per_day: 1.5 mL',
      'per_day: 0.5 mL',
      /more water a session than a day/,
    ],
    [
      'a calibration longer than the longest opening',
      'longest_on: 250 ms',
      'longest_on: 100 ms',
      /shorter than the largest calibrated drop/,
    ],
    ['an alias', 'rig: demo', 'rig: *x', /lias/],
    ['a doubled key', 'rig: demo', 'rig: demo\nrig: other', /unique/],
  ];
  it.each(cases)('%s is named with its place', (_what, from, to, message) => {
    const problems = problemsOf(spoilt(from, to));
    expect(problems.join('\n')).toMatch(message);
  });

  it('is told where: the line and the column of the key', () => {
    expect(problemsOf(spoilt('kind: valve', 'kind: tap'))[0]).toMatch(/^\d+:5 /);
  });

  it('is told every problem at once', () => {
    const text = spoilt('length: 180 cm', 'length: 180').replace('kind: valve', 'kind: tap');
    expect(problemsOf(text)).toHaveLength(2);
  });
});

describe('any text at all', () => {
  it('is a rig or a list of problems, and never a crash', () => {
    fc.assert(
      fc.property(fc.oneof(fc.string(), mutated()), (text) => {
        const { rig, problems } = parseRig('rig.yaml', text);
        expect(rig !== undefined).toBe(problems.length === 0);
      }),
      { seed: 4, numRuns: 300 },
    );
  });

  function mutated(): fc.Arbitrary<string> {
    return fc
      .tuple(fc.nat(demo.length - 1), fc.nat(30), fc.string({ maxLength: 12 }))
      .map(([at, cut, put]) => demo.slice(0, at) + put + demo.slice(at + cut));
  }
});
