import { describe, expect, test } from 'vitest';
import { alarmsOf } from '../../dashboard/model/alarms.js';
import { emptyLive, type Live, take } from '../../dashboard/model/live.js';
import type { Snapshot } from '../../server/loop/protocol.js';
import type { Decision } from '../../server/session/decisions.js';
import { ScriptedAnimal } from '../tools/scriptedAnimal.js';

/** A page at a healthy session's lap 5. */
function healthy(): { live: Live; base: Snapshot } {
  const animal = new ScriptedAnimal();
  animal.begin('induction.yaml', 'M12');
  animal.advance(40);
  const live = emptyLive();
  take(live, { tell: 'setup', setup: animal.setup }, 0);
  take(live, { tell: 'events', events: animal.events }, 0);
  take(live, { tell: 'state', state: { ...animal.state } }, 0);
  return { live, base: { ...animal.state } };
}

const ids = (live: Live) => alarmsOf(live.alarms, live.state).map((alarm) => alarm.id);

function show(live: Live, base: Snapshot, change: Partial<Snapshot>): void {
  take(live, { tell: 'state', state: { ...base, ...change } }, 0);
}

function tell(live: Live, base: Snapshot, decision: Decision): void {
  const stamp = { input: 0, boardUs: base.boardUs, lap: base.lap, positionCm: 90, speedCmPerS: 9 };
  const number = live.lastEvent + 1;
  take(live, { tell: 'events', events: [{ number, event: { ...stamp, ...decision } }] }, 0);
}

const drop: Decision = {
  ...{ kind: 'fired', rule: 'water', serial: 1, sham: false, armed: true, output: 'valve' },
  ...{ riseUs: 1, placeCm: 90, riseCm: 90, errorMm: 0 },
};

describe('alarms', () => {
  test('are silent while all is well', () => {
    const { live } = healthy();
    expect(ids(live)).toEqual([]);
    expect(alarmsOf(live.alarms, undefined)).toEqual([]);
  });

  test('each condition of the rig and the session has one, with a remedy, and it goes again', () => {
    const { live, base } = healthy();
    const record = { ...base.record, state: 'failed' as const, reason: 'disk full' };
    const low = { ...base.record, diskFreeGb: 1 };
    const cases: [string, Partial<Snapshot>][] = [
      ['record', { record }],
      ['disk', { record: low }],
      ['trust', { trust: 'doubtful' }],
      ['held stimulus', { held: { stimulus: 'the board restarted', water: null } }],
      ['held water', { held: { stimulus: null, water: 'by KL' } }],
      ['held both', { held: { stimulus: 'all stopped', water: 'all stopped' } }],
      ['no lick', { licks: 0, lap: 4 }],
      ['water session', { waterUl: base.waterLimitUl * 0.91 }],
      ['water day', { waterTodayUl: base.waterDayLimitUl }],
      ['unsure', { waterUncertainUl: 4 }],
    ];
    for (const [id, change] of cases) {
      show(live, base, change);
      expect(ids(live)).toEqual([id]);
      expect(alarmsOf(live.alarms, live.state)[0]!.remedy).not.toBe('');
      show(live, base, {});
      expect(ids(live)).toEqual([]);
    }
  });

  test('three drops without a lick, and not after one', () => {
    const { live, base } = healthy();
    tell(live, base, { kind: 'lick', artefact: false });
    for (let n = 0; n < 2; n++) tell(live, base, drop);
    tell(live, base, { ...drop, sham: true, output: null } as Decision);
    expect(ids(live)).toEqual([]);
    tell(live, base, drop);
    expect(ids(live)).toEqual(['drops']);
    tell(live, base, { kind: 'lick', artefact: true });
    expect(ids(live)).toEqual(['drops']);
    tell(live, base, { kind: 'lick', artefact: false });
    expect(ids(live)).toEqual([]);
  });

  test('a stuck lick sensor until it is released; a missed seam mark for a lap', () => {
    const { live, base } = healthy();
    tell(live, base, { kind: 'lick sensor', state: 'stuck' });
    expect(ids(live)).toEqual(['lick']);
    tell(live, base, { kind: 'lick sensor', state: 'released' });
    tell(live, base, { kind: 'seam', event: 'missed', slipMm: null });
    expect(ids(live)).toEqual(['seam']);
    show(live, base, { lap: base.lap + 2 });
    expect(ids(live)).toEqual([]);
  });

  test('a belt that stands still for five minutes of board time', () => {
    const { live, base } = healthy();
    const at = (minutes: number, speedCmPerS: number) =>
      show(live, base, { boardUs: base.boardUs + minutes * 60e6, speedCmPerS });
    at(4.9, 0.2);
    expect(ids(live)).toEqual([]);
    at(5.1, 0.2);
    expect(ids(live)).toEqual(['still']);
    at(5.2, -8);
    at(5.3, 0);
    expect(ids(live)).toEqual([]);
  });

  test('one that was seen stays away until it has gone and come again; the worst comes first', () => {
    const { live, base } = healthy();
    const record = { ...base.record, state: 'failed' as const, reason: 'x' };
    show(live, base, { trust: 'doubtful', record });
    expect(ids(live)).toEqual(['record', 'trust']);
    live.alarms.acknowledged.add('record');
    expect(ids(live)).toEqual(['trust']);
    show(live, base, {});
    expect(ids(live)).toEqual([]);
    show(live, base, { record });
    expect(ids(live)).toEqual(['record']);
  });

  test('a new session remembers none of the one before', () => {
    const { live, base } = healthy();
    for (let n = 0; n < 5; n++) tell(live, base, drop);
    expect(ids(live)).toEqual(['drops']);
    tell(live, base, { kind: 'session began', title: 'next', seed: '1' });
    expect(ids(live)).toEqual([]);
  });
});
