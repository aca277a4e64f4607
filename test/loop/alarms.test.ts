import { join } from 'node:path';
import { describe, expect, test } from 'vitest';
import { ALARMS, type AlarmName } from '../../server/loop/alarms/alarms.js';
import { AlarmWatch, type Measured } from '../../server/loop/alarms/alarmWatch.js';
import { endWords } from '../../server/loop/alarms/conditions.js';
import { StallWatch } from '../../server/loop/alarms/stallWatch.js';
import type { Snapshot } from '../../server/loop/protocol.js';
import { packageRoot } from '../../server/packageRoot.js';
import type { Decision } from '../../server/session/decisions.js';
import type { OperatorAct } from '../../server/session/inputs.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { ScriptedAnimal } from '../tools/scriptedAnimal.js';

const rig = readRig(join(packageRoot, 'hardware-sim/demo/rig.yaml'));
const WELL: Measured = { stallMs: 0, behindMs: 0 };
const LONG_MS = 120_000;

/** A watch over a healthy session's lap 4, on a clock of the test's own. */
class Watched {
  readonly watch = new AlarmWatch(rig);
  readonly base: Snapshot;
  readonly told: string[] = [];
  nowMs = 1_000;
  boardUs: number;

  constructor() {
    const animal = new ScriptedAnimal();
    animal.begin('induction.yaml', 'M12');
    animal.advance(40);
    this.base = { ...animal.state };
    this.boardUs = this.base.boardUs;
    for (const { event } of animal.events) this.watch.hear(event);
    this.look();
  }

  /** Looks after so long; board time goes on with the host's. */
  look(change: Partial<Snapshot> = {}, ms = 250, measured: Partial<Measured> = {}): void {
    this.nowMs += ms;
    this.boardUs += ms * 1000;
    const state = { ...this.base, boardUs: this.boardUs, ...change };
    for (const { alarm, raised } of this.watch.look(state, { ...WELL, ...measured }, this.nowMs)) {
      this.told.push(`${raised ? '+' : '-'} ${alarm}`);
    }
  }

  tell(decision: Decision, us = this.boardUs): void {
    const { lap } = this.base;
    const stamp = { input: 0, boardUs: us, lap, positionCm: 90, speedCmPerS: 9 };
    this.watch.hear({ ...stamp, ...decision });
  }

  act(act: OperatorAct, who = 'KL'): void {
    this.tell({ kind: 'operator', act, who, from: 'dashboard' });
  }

  get on(): AlarmName[] {
    return this.watch.on.map(({ alarm }) => alarm);
  }
}

const drop: Decision = {
  ...{ kind: 'fired', rule: 'water', serial: 1, sham: false, armed: true, output: 'valve' },
  ...{ riseUs: null, placeCm: 90, riseCm: 90, errorMm: 0 },
};
const lick: Decision = { kind: 'lick', artefact: false };

describe('alarms', () => {
  test('are silent while all is well, for an hour', () => {
    const w = new Watched();
    for (let n = 0; n < 3600; n++) w.look({}, 1000);
    expect(w.told).toEqual([]);
    expect(w.on).toEqual([]);
  });

  test('each has a level and a remedy in words', () => {
    for (const [name, { level, remedy }] of Object.entries(ALARMS)) {
      expect(['note', 'warn', 'bad']).toContain(level);
      expect(remedy, name).toMatch(/^[A-Z].*\.$/);
    }
  });

  const link = (base: Snapshot) => ({ ...base.link, state: 'down' as const, reason: 'pulled' });
  const record = (base: Snapshot, change: object) => ({ ...base.record, ...change });
  test.each<[AlarmName, (base: Snapshot) => Partial<Snapshot>, Partial<Measured>?]>([
    ['link', (base) => ({ link: link(base) })],
    ['record', (base) => ({ record: record(base, { state: 'failed', reason: 'disk full' }) })],
    ['behind', () => ({}), { behindMs: 2_100 }],
    ['disk', (base) => ({ record: record(base, { diskFreeGb: 3 }) })],
    ['disk full', (base) => ({ record: record(base, { diskFreeGb: 0.4 }) })],
    ['host', () => ({}), { stallMs: 180 }],
    ['silence', () => ({}), { stallMs: 400 }],
    ['trust', () => ({ trust: 'doubtful' })],
    ['no lick', () => ({ licks: 0, lap: 4 })],
    ['water session', (base) => ({ waterUl: base.waterLimitUl * 0.91 })],
    ['water day', (base) => ({ waterTodayUl: base.waterDayLimitUl })],
    ['unsure', () => ({ waterUncertainUl: 4 })],
    ['end', () => ({ end: { laps: 5, s: null, exact: true, what: 'laps' } })],
  ])('%s is raised, once, and cleared when it is over', (alarm, change, measured = {}) => {
    const w = new Watched();
    const { base } = w;
    for (let n = 0; n < 40; n++) w.look(change(base), 250, measured);
    expect(w.told).toEqual([`+ ${alarm}`]);
    expect(w.on).toEqual([alarm]);
    expect(w.watch.on[0]!.text.length).toBeGreaterThan(8);
    for (let n = 0; n < 4; n++) w.look({}, LONG_MS / 4, {});
    expect(w.told).toEqual([`+ ${alarm}`, `- ${alarm}`]);
  });

  test('what flickers is one alarm: no storm', () => {
    const w = new Watched();
    for (let n = 0; n < 400; n++) w.look(n % 2 === 0 ? { trust: 'doubtful' } : {});
    // It never lasted long enough to be raised.
    expect(w.told).toEqual([]);
    for (let n = 0; n < 400; n++) w.look(n % 8 < 4 ? { trust: 'doubtful' } : {});
    expect(w.told).toEqual(['+ trust']);
  });

  test('frames that stop are told while the link still counts as up', () => {
    const w = new Watched();
    const frozen = { boardUs: w.boardUs };
    for (let n = 0; n < 3; n++) w.look(frozen);
    expect(w.on).toEqual([]);
    for (let n = 0; n < 8; n++) w.look(frozen);
    expect(w.told).toEqual(['+ frames']);
  });

  test('three drops without a lick, and not after one; a sham is none', () => {
    const w = new Watched();
    w.tell(lick);
    for (let n = 0; n < 2; n++) w.tell(drop);
    w.tell({ ...drop, sham: true, output: null } as Decision);
    w.look();
    expect(w.on).toEqual([]);
    w.tell(drop);
    w.tell({ kind: 'lick', artefact: true });
    w.look();
    expect(w.watch.on[0]!.text).toBe('3 drops were given and not licked');
    w.tell(drop);
    w.look();
    expect(w.watch.on[0]!.text).toBe('4 drops were given and not licked');
    w.tell(lick);
    for (let n = 0; n < 30; n++) w.look();
    expect(w.told).toEqual(['+ drops', '- drops']);
  });

  test('a stuck lick sensor until it is released; a missed seam mark until the next good one', () => {
    const w = new Watched();
    w.tell({ kind: 'lick sensor', state: 'stuck' });
    w.tell({ kind: 'seam', event: 'missed', slipMm: null });
    w.look();
    expect(w.on).toEqual(['lick stuck', 'seam']);
    w.tell({ kind: 'lick sensor', state: 'released' });
    w.tell({ kind: 'seam', event: 'accepted', slipMm: 1 });
    for (let n = 0; n < 30; n++) w.look();
    expect(w.on).toEqual([]);
  });

  test('a board that restarted, until stimulation is allowed again', () => {
    const w = new Watched();
    w.tell({ kind: 'link', state: 'up', reason: '' });
    w.look();
    expect(w.on).toEqual([]);
    w.tell({ kind: 'link', state: 'up', reason: 'the board restarted' });
    w.look();
    expect(w.on).toEqual(['restart']);
    w.act({ act: 'allow stimulation' });
    w.look();
    w.look({}, 6000);
    expect(w.on).toEqual([]);
  });

  test('a belt that stands still for five minutes of board time, not one that goes backwards', () => {
    const w = new Watched();
    const still = { speedCmPerS: 0.2 };
    w.look({ speedCmPerS: -8 });
    for (let n = 0; n < 29; n++) w.look(still, 10_000);
    expect(w.on).toEqual([]);
    for (let n = 0; n < 2; n++) w.look(still, 10_000);
    expect(w.watch.on[0]!.text).toBe('The belt has not moved for 5 min');
    w.look({ speedCmPerS: -8 });
    w.look({}, 10_000);
    expect(w.on).toEqual([]);
  });

  test('a valve that stays on beyond its longest', () => {
    const w = new Watched();
    // The demo's valve may be on for 250 ms.
    for (let n = 0; n < 3; n++) w.look({ outputs: 1 }, 100);
    w.look({ outputs: 0 }, 100);
    for (let n = 0; n < 3; n++) w.look({ outputs: 1 }, 100);
    expect(w.told).toEqual([]);
    for (let n = 0; n < 8; n++) w.look({ outputs: 1 }, 100);
    expect(w.told).toEqual(['+ valve on']);
  });

  test('drops that the board never accounts for, three in a row', () => {
    const w = new Watched();
    w.tell(drop);
    const silent: Decision = { kind: 'uncertain', rule: 'water', serial: 9, reason: 'never said' };
    for (let n = 0; n < 3; n++) w.tell({ ...silent, rule: 'induce' } as Decision);
    w.tell(silent);
    w.tell(silent);
    w.look();
    expect(w.on).toEqual([]);
    w.tell(silent);
    w.look();
    expect(w.on).toEqual(['valve silent']);
  });

  /** A drop every ten seconds with so many licks in the two seconds before and the three after it. */
  function laps(w: Watched, drops: number, before: number, after: number): void {
    for (let n = 0; n < drops; n++) {
      w.boardUs += 8_000_000;
      for (let k = 0; k < before; k++) w.tell(lick, w.boardUs + 100_000 * (k + 1));
      w.boardUs += 2_000_000;
      w.tell(drop);
      for (let k = 0; k < after; k++) w.tell(lick, w.boardUs + 150_000 * (k + 1));
      w.boardUs += 3_000_000;
      w.look();
    }
  }

  test('a valve that gives nothing: the animal still comes licking and no longer licks on', () => {
    const w = new Watched();
    laps(w, 12, 5, 12);
    expect(w.told).toEqual([]);
    laps(w, 7, 5, 2);
    expect(w.told).toEqual(['+ valve empty']);
  });

  test('an animal that has had enough neither comes nor drinks: no fault of the valve', () => {
    const w = new Watched();
    laps(w, 12, 5, 12);
    laps(w, 10, 0, 1);
    expect(w.on).not.toContain('valve empty');
  });

  test('licking without a pause for half a minute: it drips; with pauses it is licking', () => {
    const w = new Watched();
    const run = (seconds: number, pauseEveryS: number) => {
      for (let n = 0; n < seconds * 6; n++) {
        w.boardUs += 1e6 / 6;
        if (n % (pauseEveryS * 6) < (pauseEveryS - 3) * 6) w.tell(lick);
      }
      w.look({}, 1);
    };
    run(60, 10);
    expect(w.on).toEqual([]);
    run(35, 1000);
    expect(w.on).toEqual(['valve drips']);
  });

  test('seen by somebody: who and from where; it stays until it is over, and is unseen when it comes anew', () => {
    const w = new Watched();
    for (let n = 0; n < 3; n++) w.look({ trust: 'doubtful', waterUncertainUl: 4 });
    w.act({ act: 'acknowledge', alarm: 'trust' });
    const seen = w.watch.on.find(({ alarm }) => alarm === 'trust')!;
    expect(seen.seenBy).toEqual({ who: 'KL', from: 'dashboard' });
    w.look({ trust: 'doubtful', waterUncertainUl: 4 });
    w.act({ act: 'acknowledge', alarm: 'all' }, 'MN');
    const who = (alarm: AlarmName) => w.watch.on.find((one) => one.alarm === alarm)?.seenBy?.who;
    expect([who('trust'), who('unsure')]).toEqual(['KL', 'MN']);
    w.look({}, 250);
    w.look({}, LONG_MS);
    for (let n = 0; n < 3; n++) w.look({ trust: 'doubtful' });
    expect(w.watch.on).toMatchObject([{ alarm: 'trust', seenBy: null }]);
  });

  test('the gravest come first', () => {
    const w = new Watched();
    const { base } = w;
    const end = { laps: 2, s: null, exact: true, what: 'laps' };
    for (let n = 0; n < 4; n++) w.look({ end, trust: 'doubtful', link: link(base) });
    expect(w.on).toEqual(['link', 'trust', 'end']);
  });

  test('a loop that took up its record again knows what was on and seen', () => {
    const before = new Watched();
    for (let n = 0; n < 3; n++) before.look({ trust: 'doubtful' });
    const after = new Watched();
    const { level, text, remedy } = before.watch.on[0]!;
    const alarm = { kind: 'alarm', alarm: 'trust', level, text, remedy } as const;
    after.tell({ ...alarm, state: 'raised' });
    after.act({ act: 'acknowledge', alarm: 'trust' });
    for (let n = 0; n < 3; n++) after.look({ trust: 'doubtful' });
    expect(after.told).toEqual([]);
    expect(after.watch.on).toMatchObject([{ alarm: 'trust', seenBy: { who: 'KL' } }]);
    after.look({}, 250);
    after.look({}, LONG_MS);
    expect(after.told).toEqual(['- trust']);
  });

  test('a new session remembers none of the one before, and what is still wrong is raised in its record', () => {
    const w = new Watched();
    for (let n = 0; n < 5; n++) w.tell(drop);
    for (let n = 0; n < 3; n++) w.look({ waterUncertainUl: 4 });
    expect(w.on).toEqual(['drops', 'unsure']);
    w.tell({ kind: 'session began', title: 'next', seed: '1' });
    expect(w.on).toEqual([]);
    w.look({ waterUncertainUl: 4 });
    expect(w.told.at(-1)).toBe('+ unsure');
    expect(w.on).toEqual(['unsure']);
  });
});

test('a computer that holds the loop up: the worst of the last minute, and nothing of before a session', () => {
  const stalls = new StallWatch(20);
  let nowMs = 70_000;
  const ticks = (count: number, everyMs = 20) => {
    for (let n = 0; n < count; n++) {
      nowMs += everyMs;
      stalls.tick(nowMs);
    }
  };
  ticks(10);
  expect(stalls.worstMs).toBe(0);
  ticks(1, 200);
  ticks(1, 150);
  expect(stalls.worstMs).toBe(180);
  ticks(2990);
  expect(stalls.worstMs).toBe(180);
  ticks(20);
  expect(stalls.worstMs).toBe(0);
  ticks(1, 500);
  stalls.restart();
  nowMs += 900;
  ticks(5);
  expect(stalls.worstMs).toBe(0);
  ticks(1, 320);
  expect(stalls.worstMs).toBe(300);
});

test.each([
  [5, null, true, 'in 5 laps'],
  [1, null, true, 'with this lap'],
  [4, 52, false, 'in about 4 laps, 52 s'],
  [1, 5, false, 'with this lap, 5 s'],
  [null, 240, false, 'in 4 min'],
])('the end in words: %s laps, %s s, exact: %s', (laps, s, exact, words) => {
  expect(endWords(laps, s, exact)).toBe(words);
});
