import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import { SessionCore } from '../../server/session/core/sessionCore.js';
import type { StampedDecision } from '../../server/session/decisions.js';
import type { OperatorAct } from '../../server/session/inputs.js';
import { Recorder } from '../../server/session/record/recorder.js';
import { rehearse } from '../../server/session/rehearsal.js';
import { replaySession } from '../../server/session/replay.js';
import { parseRig } from '../../server/session/rig/readRig.js';
import { blank } from '../../server/wire/codec.js';
import type { Identity, Quiet } from '../../server/wire/messages.js';
import { scratchFolder, setupOf, virtualRig } from './rehearsed.js';

const RULES = `title: Steered
belt: 180 cm
operator:
  gate_at: 20 to 80 cm, in steps of 1 cm, at first 45 cm
  drop: 2 to 6 uL, at first 4 uL
rules:
  water:
    when: reaches 90 cm
    do: give drop
  induce:
    when: reaches gate_at
    if: lap > 1000
    do: pulse gate for 300 ms
    limit: 1 per lap
    within: 1 cm
    asked: now or in the next 5 laps
  treat:
    when: operator presses treat
    do: give drop
    limit: at least 2 s apart
end: laps done this session >= 60 or time >= 60 min
`;

const demo = readFileSync(join(packageRoot, 'hardware-sim/demo/rig.yaml'), 'utf8');

/** The demo's rig with a button box on the four inputs from line 8 on. */
function boxRig() {
  const buttons = [
    ['hold_key', 'hold stimulus', ''],
    ['mark_key', 'mark', '    pressed: low\n'],
    ['ask_key', 'ask induce now', '    long_press: 400 ms\n'],
    ['stop_key', 'stop everything', '    debounce: 10 ms\n'],
  ].map(([name, does, more], n) => {
    return `  ${name}:\n    line: ${8 + n}\n    use: button\n    does: ${does}\n${more}`;
  });
  const text = demo.replace('outputs:\n', `${buttons.join('')}outputs:\n`);
  const { rig, problems } = parseRig('rig.yaml', text);
  if (!rig) throw new Error(JSON.stringify(problems));
  return rig;
}

const [HOLD, MARK, ASK, STOP] = [8, 9, 10, 11];
/** The mark key is low while pressed. */
const RELEASED = 1 << MARK;

/** A session core, its board's frames, and what it says. */
class Stage {
  readonly decisions: StampedDecision[] = [];
  readonly commands: { name: string; message: object }[] = [];
  readonly core: SessionCore;
  us = 1_000_000;
  count = 0;
  inputs = RELEASED;

  constructor(rules = RULES) {
    this.core = new SessionCore(setupOf(rules, 'seed', boxRig()), {
      command: (name, message) => this.commands.push({ name, message: { ...message } }),
      decision: (decision) => this.decisions.push(decision),
    });
    const identity: Identity = { ...blank('identity'), boardUs: this.us, slots: 8 };
    this.core.take({ kind: 'link up', identity, tag: 7, sameBoot: false, overNetwork: false });
    this.run(5);
    this.core.take({ kind: 'begin', firstId: 100 });
  }

  run(ms: number, countsPerMs = 0): this {
    for (let n = 0; n < ms; n++) {
      this.us += 1000;
      this.count += countsPerMs;
      const { us: boardUs, count, inputs } = this;
      this.core.sample({ ...blank('sample'), boardUs, count, inputs });
    }
    return this;
  }

  level(line: number, high: boolean): this {
    this.inputs = high ? this.inputs | (1 << line) : this.inputs & ~(1 << line);
    return this;
  }

  /** Past the seam mark, on input 1 of the demo's rig: lap 1 begins. */
  home(): this {
    const edge = (level: 0 | 1) => {
      const message = { boardUs: this.us, count: this.count, input: 1, level };
      this.level(1, level === 1);
      this.core.take({ kind: 'edge', message });
    };
    this.run(20, 5);
    edge(1);
    this.run(2, 1);
    edge(0);
    return this;
  }

  act(act: OperatorAct): this {
    this.core.take({ kind: 'operator', act, by: { who: 'KL', from: 'dashboard' } });
    return this;
  }

  get acts(): OperatorAct[] {
    return this.decisions.flatMap((one) => (one.kind === 'operator' ? [one.act] : []));
  }
  told<K extends StampedDecision['kind']>(kind: K) {
    return this.decisions.filter((one) => one.kind === kind) as (StampedDecision & { kind: K })[];
  }
}

describe('a button box on the inputs of the board', () => {
  it('holds at once, and lets go only after a long press', () => {
    const stage = new Stage();
    stage.level(HOLD, true).run(40).level(HOLD, false).run(100);
    expect(stage.acts).toEqual([{ act: 'hold', what: 'stimulus', on: true }]);
    expect(stage.told('operator')[0]).toMatchObject({ who: 'button box', from: 'hold_key' });
    stage.level(HOLD, true).run(400).level(HOLD, false).run(100);
    expect(stage.acts).toHaveLength(1);
    stage.level(HOLD, true).run(505);
    expect(stage.acts.at(-1)).toEqual({ act: 'hold', what: 'stimulus', on: false });
    stage.run(2000);
    expect(stage.acts).toHaveLength(2);
  });

  it('takes a contact that bounces for one press', () => {
    const stage = new Stage();
    for (let n = 0; n < 12; n++) stage.level(MARK, n % 2 === 1).run(2);
    stage.level(MARK, false).run(200);
    expect(stage.acts).toEqual([{ act: 'mark' }]);
    for (let n = 0; n < 12; n++) stage.level(MARK, n % 2 === 0).run(2);
    stage.level(MARK, true).run(200);
    expect(stage.acts).toEqual([{ act: 'mark' }]);
  });

  it('a short press asks for no stimulus, a long one does, in its own time', () => {
    const stage = new Stage().home();
    stage.level(ASK, true).run(390).level(ASK, false).run(50);
    expect(stage.acts).toEqual([]);
    stage.level(ASK, true).run(402).level(ASK, false).run(50);
    expect(stage.acts).toEqual([{ act: 'ask', rule: 'induce', laps: 0 }]);
    expect(stage.commands.filter(({ name }) => name === 'pulse')).toHaveLength(1);
  });

  it('what is held down as the session begins is no press', () => {
    const stage = new Stage();
    expect(stage.run(100).acts).toEqual([]);
    const held = new Stage();
    held.level(STOP, true);
    expect(held.run(20).acts).toEqual([{ act: 'stop everything' }]);
  });

  it.each([
    ['use: button', 'does: fly', /expected what a button does/],
    ['use: button', '', /needs to say what it `does`/],
    ['use: signal', 'does: mark', /only of a button/],
  ])('a rig file with `%s` and `%s` is refused', (use, does, why) => {
    const lines = `  key:\n    line: 8\n    ${use}\n${does ? `    ${does}\n` : ''}`;
    const { problems } = parseRig('rig.yaml', demo.replace('outputs:\n', `${lines}outputs:\n`));
    expect(problems.map(({ message }) => message).join()).toMatch(why);
  });
});

describe('steering', () => {
  it('holding ends what has begun, of that kind alone, and the sync train goes on', () => {
    const stage = new Stage().home();
    const quiets = () =>
      stage.commands
        .filter(({ name }) => name === 'quiet')
        .map(({ message }) => (message as Quiet).outputs);
    stage.act({ act: 'hold', what: 'stimulus', on: true });
    // laser, gate and tone: lines 1, 2 and 3.
    expect(quiets()).toEqual([0b1110]);
    stage.act({ act: 'hold', what: 'water', on: true });
    expect(quiets()).toEqual([0b1110, 0b1]);
    stage.act({ act: 'hold', what: 'water', on: false });
    expect(quiets()).toHaveLength(2);
  });

  it('a mark is stamped when the key is pressed, and its words may come laps later', () => {
    const stage = new Stage().home();
    stage.run(100, 5).act({ act: 'mark' });
    const [made] = stage.core.marks.open;
    expect(made).toMatchObject({ mark: 1, lap: 1, boardUs: stage.us });
    stage.run(2000, 5).act({ act: 'note', text: 'swallowed', mark: 1 });
    expect(stage.core.marks.open).toEqual([]);
    expect(stage.told('note').map(({ text, mark, markedUs }) => [text, mark, markedUs])).toEqual([
      ['', 1, made!.boardUs],
      ['swallowed', 1, made!.boardUs],
    ]);
    expect(stage.told('note')[1]!.boardUs).toBe(made!.boardUs + 2_000_000);
    stage.act({ act: 'note', text: 'by itself' });
    expect(stage.told('note')[2]).toMatchObject({ mark: null, markedUs: null });
  });

  it('a place that is moved counts from the next lap, and is told when the board is armed by it', () => {
    const rules = RULES.replace('    if: lap > 1000\n', '');
    const stage = new Stage(rules).home();
    stage.run(20, 5).act({ act: 'choose', name: 'gate_at', value: 52 });
    expect(stage.told('choice')).toEqual([]);
    // Round to the mark again, a lap of 4500 counts after the first.
    stage.run(859, 5);
    stage.home();
    expect(stage.told('choice')).toMatchObject([{ name: 'gate_at', value: 52, state: 'in force' }]);
    expect(stage.core.changes.isOpen(0)).toBe(true);
    stage.run(120, 5);
    // Armed from 30 cm ahead on; the board is taken to have it when it has not refused for 100 ms.
    stage.run(250, 1);
    expect(stage.told('choice').at(-1)).toMatchObject({ value: 52, state: 'armed anew' });
    expect(stage.core.changes.isOpen(0)).toBe(false);
    expect(stage.told('armed').at(-1)).toMatchObject({
      rule: 'induce',
      placeCm: expect.closeTo(52, 1),
    });
  });

  it('what no slot depends on is in force at once', () => {
    const stage = new Stage(RULES.replace('reaches 90 cm', 'spikes rises')).home();
    stage.act({ act: 'choose', name: 'drop', value: 3000 }).run(2);
    expect(stage.told('choice')).toMatchObject([{ name: 'drop', value: 3000, state: 'in force' }]);
    expect(stage.core.changes.isOpen(1)).toBe(false);
  });

  it('an alarm is told as the loop gave it, and decides nothing', () => {
    const stage = new Stage().home();
    const before = stage.commands.length;
    const { level, text, remedy } = {
      level: 'warn' as const,
      text: 'The belt stands',
      remedy: 'Look.',
    };
    stage.core.take({ kind: 'alarm', alarm: 'still', raised: true, level, text, remedy });
    expect(stage.told('alarm')).toMatchObject([
      { alarm: 'still', state: 'raised', level, text, remedy },
    ]);
    expect(stage.commands).toHaveLength(before);
  });
});

/** Whatever an operator may come up with, sensible or not. */
const act = fc.oneof<fc.Arbitrary<OperatorAct>[]>(
  fc.record({
    act: fc.constant('ask' as const),
    rule: fc.constantFrom('induce', 'water', 'none'),
    laps: fc.integer({ min: 0, max: 6 }),
  }),
  fc.record({ act: fc.constant('withdraw' as const), rule: fc.constantFrom('induce', 'none') }),
  fc.record({
    act: fc.constant('put off' as const),
    laps: fc.integer({ min: 0, max: 3 }),
    minutes: fc.integer({ min: 0, max: 1 }),
  }),
  fc.record({
    act: fc.constant('choose' as const),
    name: fc.constant('gate_at'),
    value: fc.integer({ min: 15, max: 85 }),
  }),
  fc.record({
    act: fc.constant('hold' as const),
    what: fc.constantFrom('stimulus' as const, 'water' as const),
    on: fc.boolean(),
  }),
  fc.record({ act: fc.constant('press' as const), button: fc.constantFrom('treat', 'none') }),
  fc.constantFrom<OperatorAct>(
    { act: 'mark' },
    { act: 'note', text: 'x', mark: 1 },
    { act: 'acknowledge', alarm: 'all' },
    { act: 'exclude lap', lap: 1 },
    { act: 'new cell', fields: {} },
  ),
);

describe('whatever the operator does', { timeout: 120_000 }, () => {
  it('a session replays identically, no asked rule fires twice a lap, and the end comes as put off', async () => {
    const rules = RULES.replace('>= 60 or', '>= 8 or');
    await fc.assert(
      fc.asyncProperty(
        fc.array(fc.tuple(fc.integer({ min: 1, max: 6000 }), act), { maxLength: 25 }),
        async (acts) => {
          const where = scratchFolder();
          const header = { session: 's', startedAtMs: 0, software: 'test', seed: 'x' };
          const recorder = Recorder.create(where.folder, header, { mode: 'bulk' });
          const told: StampedDecision[] = [];
          const rig = virtualRig();
          let due = [...acts];
          rehearse(setupOf(rules, 'x', boxRig()), rig, {
            mostUs: 10 * 60e6,
            recorder,
            onDecision: (decision) => told.push(decision),
            began: (runner) => {
              // An act every so many frames, between two of them as a live one is.
              let wait = due[0]?.[0] ?? 0;
              const { sample } = runner;
              runner.sample = (message) => {
                sample.call(runner, message);
                if (due.length === 0 || --wait > 0 || runner.core.state !== 'running') return;
                const [, what] = due[0]!;
                due = due.slice(1);
                wait = due[0]?.[0] ?? 0;
                runner.take({ kind: 'operator', act: what, by: { who: 'p', from: 'q' } });
              };
            },
          });
          recorder.close('done');
          const { difference } = await replaySession(where.folder, setupOf(rules, 'x', boxRig()));
          expect(difference).toBeNull();
          const fired = told.filter((one) => one.kind === 'fired' && one.rule === 'induce');
          const laps = fired.map(({ lap }) => lap);
          expect(new Set(laps).size).toBe(laps.length);
          where.remove();
        },
      ),
      { seed: 6, numRuns: 4 },
    );
  });
});
