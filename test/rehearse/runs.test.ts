import { describe, expect, test } from 'vitest';
import { Runs, type RunsSetting } from '../../server/main/runOnce.js';
import { runAll } from '../../server/main/runsPool.js';
import { type RunsReport, runsReport } from '../../server/rehearse/runsReport.js';
import { demoRig } from '../session/rehearsed.js';
import { settingOf, WATER } from './setting.js';

const CIRCUMSTANCES = { seed: 'a seed', animal: 'usual', latency: '', notes: [] };

function reportOf(setting: RunsSetting, runs: number): RunsReport {
  const session = new Runs(setting);
  const results = Array.from({ length: runs }, (_, n) => session.run(n));
  return runsReport(setting.file, results, CIRCUMSTANCES);
}

const ruleOf = (report: RunsReport, name: string) =>
  report.rules.find((rule) => rule.name === name)!;

// Each thread that is started takes some seconds on a busy machine.
describe('many runs of one file', { timeout: 120_000 }, () => {
  test('come out the same, byte by byte, on one, two and three threads', async () => {
    const setting = settingOf(WATER, { minutes: 2 });
    const tables: string[] = [];
    for (const jobs of [1, 2, 3]) {
      const results = await runAll(setting, 5, { jobs });
      tables.push(JSON.stringify(runsReport(setting.file, results, CIRCUMSTANCES)));
    }
    expect(tables[1]).toBe(tables[0]);
    expect(tables[2]).toBe(tables[0]);
    expect(tables[0]).toBe(JSON.stringify(reportOf(setting, 5)));
  });

  test('are another animal and other draws each, and others again under another seed', () => {
    const run = (seed: string) => new Runs(settingOf(WATER, { seed }));
    const one = run('one');
    const sessions = [0, 1, 2].map((n) => one.run(n).sessionS);
    expect(new Set(sessions).size).toBe(3);
    expect(run('two').run(0).sessionS).not.toBe(sessions[0]);
    expect(run('one').run(2).sessionS).toBe(sessions[2]);
  });

  test('stop at once when they are cancelled, with the reason that was given', async () => {
    const aborter = new AbortController();
    const reason = new Error('enough');
    const progress = () => aborter.abort(reason);
    const all = runAll(settingOf(WATER), 10_000, { jobs: 2, progress, signal: aborter.signal });
    await expect(all).rejects.toBe(reason);
  });

  test('tell how far they are', async () => {
    const shares: number[] = [];
    await runAll(settingOf(WATER), 4, { jobs: 2, progress: (done) => shares.push(done) });
    expect(shares).toEqual([0.25, 0.5, 0.75, 1]);
  });
});

describe('the report of many runs', () => {
  const HINDERED = `title: hindered
belt: 180 cm
draws:
  kind: stim or sham, every lap, in shuffled blocks of 2
phases:
  first: for 2 laps
  rest: to the end
rules:
  water:
    when: reaches 90 cm
    do: give 4 uL
  never:
    when: reaches 45 cm
    if: speed >= 200 cm/s and lap >= 3
    do: pulse laser for 50 ms
  twice:
    when: reaches 120 cm
    do: pulse laser for 50 ms
    limit: 2 per session
  coin:
    when: reaches 150 cm
    chance: 50 %
    sham: kind is sham
    do: pulse tone for 50 ms
  nobody:
    when: operator presses knock
    do: note
end: lap >= 8 or time >= 50 min
`;
  const report = reportOf(settingOf(HINDERED, { minutes: 60 }), 6);

  test('says which term of an `if` failed, and how often', () => {
    const never = ruleOf(report, 'never');
    expect(never.runsFired).toBe(0);
    // Lap 1 to 7 each reach the place once, in six sessions.
    expect(never.moments).toBe(7 * 6);
    expect(never.why.map(({ kind, words, times, runs }) => [kind, words, times, runs])).toEqual([
      ['if', 'speed >= 200 cm/s', 42, 6],
      ['if', 'lap >= 3', 12, 6],
    ]);
  });

  test('says which limit was met, and in how many sessions', () => {
    const twice = ruleOf(report, 'twice');
    expect([twice.fired.least, twice.fired.most]).toEqual([2, 2]);
    expect(twice.why).toEqual([
      { kind: 'limit', words: '2 per session', times: 5 * 6, unknown: 0, runs: 6 },
    ]);
  });

  test('tells firings by phase, and phases that are never left', () => {
    const water = ruleOf(report, 'water');
    expect(water.byPhase.map(({ phase, fired }) => [phase, fired.median])).toEqual([
      ['first', 2],
      ['rest', 5],
    ]);
    const phases = report.phases.map((p) => [p.name, p.runsEntered, p.runsNotLeft]);
    expect(phases).toEqual([
      ['first', 6, 0],
      ['rest', 6, 6],
    ]);
  });

  test('tells chance, shams and draws apart', () => {
    const coin = ruleOf(report, 'coin');
    const missed = coin.why.find(({ kind }) => kind === 'chance')!.times;
    const fired = coin.moments - missed;
    expect(coin.moments).toBe(7 * 6);
    expect(fired).toBeGreaterThan(8);
    expect(fired).toBeLessThan(34);
    const [draw] = report.draws;
    expect(draw!.values.map(({ value }) => value)).toEqual(['sham', 'stim']);
    // Blocks of two leave a session's share at a half, or one draw beside it.
    for (const { share } of draw!.values) expect(share).toBeCloseTo(0.5, 1);
  });

  test('says of a rule whose moment never came that nothing asked it', () => {
    const nobody = ruleOf(report, 'nobody');
    expect([nobody.moments, nobody.runsFired, nobody.why]).toEqual([0, 0, []]);
  });

  test('tells which alternative of `end` ended the sessions', () => {
    expect(report.endAlternatives).toEqual([
      { words: 'lap >= 8', runs: 6 },
      { words: 'time >= 50 min', runs: 0 },
    ]);
    expect(report.ends.map(({ runs }) => runs)).toEqual([6]);
  });

  test('adds up water, laps and licks as the sessions had them', () => {
    expect([report.laps.least, report.laps.most]).toEqual([8, 8]);
    expect(report.waterUl.median).toBeCloseTo(7 * 4, 1);
    expect(report.licks.least).toBeGreaterThan(30);
    expect(report.lickShare!.median).toBeGreaterThan(0.5);
    expect(report.minutes.low).toBeLessThanOrEqual(report.minutes.median);
    expect(report.minutes.bins.reduce((sum, runs) => sum + runs, 0)).toBe(6);
  });

  test('tells a draw of many numbers in fifths of their range', () => {
    const text = WATER.replace('rules:', 'draws:\n  spot: 20 to 140 cm, every lap\nrules:');
    const [draw] = reportOf(settingOf(text, { minutes: 10 }), 4).draws;
    expect(draw!.name).toBe('spot');
    expect(draw!.values.length).toBeLessThanOrEqual(5);
    const ranges = draw!.values.map(({ value }) => value.split(' to ').map(Number));
    for (const [from, to] of ranges) {
      expect(from).toBeGreaterThanOrEqual(20);
      expect(to).toBeLessThanOrEqual(140);
      expect(to).toBeGreaterThan(from!);
    }
    const shares = draw!.values.reduce((sum, { share }) => sum + share, 0);
    expect(shares).toBeCloseTo(1, 9);
  });

  test('counts what the guard withheld under one reason, however much was asked', () => {
    const outputs = demoRig.outputs.map((output) =>
      output.name === 'laser' ? { ...output, perSession: 3 } : output,
    );
    const rig = { ...demoRig, outputs };
    const text = WATER.replace(
      'end:',
      '  light:\n    when: lick\n    do: pulse laser for 5 ms\nend:',
    );
    const light = ruleOf(reportOf(settingOf(text, { rig }), 3), 'light');
    expect([light.fired.least, light.fired.most]).toEqual([3, 3]);
    const [most] = light.why;
    expect(most).toMatchObject({ kind: 'guard', runs: 3 });
    expect(most!.words).toBe('withheld: laser: not enough left of 3 for the session');
  });

  test('says that position was not known yet', () => {
    const text = WATER.replace(
      'end:',
      '  early:\n    when: every 1 s\n    if: in 0 to 180 cm\n    do: note\nend:',
    );
    const early = ruleOf(reportOf(settingOf(text), 3), 'early');
    const [why] = early.why;
    expect(why).toMatchObject({ kind: 'if', runs: 3 });
    expect(why!.unknown).toBe(why!.times);
    expect(why!.unknown).toBeGreaterThan(0);
  });
});

describe('the error of position', () => {
  const late = (us: number) => ({ words: '', shares: [0, 1], us: [us, us] });
  /** Two outputs at once: the host has to start them. */
  const text = WATER.replace(
    'end:',
    `  both:
    when: reaches 45 cm
    do:
      - pulse laser for 5 ms
      - pulse tone for 5 ms
end:`,
  );

  test('grows with the latency, by what the animal runs in that time, for the host alone', () => {
    const [prompt, slow] = [late(0), late(20_000)].map((latency) =>
      new Runs(settingOf(text, { latency, minutes: 5 })).run(0),
    );
    const water = prompt!.rules[0]!;
    expect(water.boardMm.length).toBeGreaterThan(3);
    expect(slow!.rules[0]!.boardMm).toEqual(water.boardMm);
    // The encoder reads 1 mm a lap too much, 1 mm more or less: at half a lap, half of it.
    for (const mm of water.boardMm) expect(Math.abs(mm)).toBeLessThan(3);
    expect(water.boardMm.some((mm) => Math.abs(mm) > 0.1)).toBe(true);
    const host = prompt!.rules[1]!.hostMm;
    expect(host.length).toBeGreaterThan(6);
    for (const [n, mm] of slow!.rules[1]!.hostMm.entries()) {
      // 20 ms at 1 to 60 cm/s.
      const byMm = mm - host[n]!;
      expect(byMm).toBeGreaterThan(0.2);
      expect(byMm).toBeLessThan(12);
    }
  });

  test("is the belt's own, wherever the seam mark sits", () => {
    const { seam } = demoRig.belt;
    const rig = { ...demoRig, belt: { ...demoRig.belt, seam: { ...seam!, offsetCm: 12 } } };
    const { boardMm } = new Runs(settingOf(text, { rig, minutes: 5 })).run(0).rules[0]!;
    expect(boardMm.length).toBeGreaterThan(3);
    for (const mm of boardMm) expect(Math.abs(mm)).toBeLessThan(3);
  });
});
