// Contact and rate figures: common practice, no source.
import { describe, expect, it } from 'vitest';
import { OUTCOME, SYNC_EDGE } from '../../server/wire/messages.js';
import { LICK, TrackedBelt } from './trackedBelt.js';

function resting(): TrackedBelt {
  const rig = new TrackedBelt();
  rig.belt.sample();
  rig.belt.rest(20_000);
  return rig;
}

function touch(rig: TrackedBelt, contactUs: number, breakUs: number): void {
  rig.belt.edge(LICK, 1);
  rig.belt.rest(contactUs);
  rig.belt.edge(LICK, 0);
  rig.belt.rest(breakUs);
}

describe('a lick', () => {
  it('begins at the first rise, at once, and its own time is that of the edge', () => {
    const rig = resting();
    const atUs = rig.belt.nowUs;
    rig.belt.edge(LICK, 1);
    expect(rig.instant.lick).toBe(true);
    expect(rig.instant.rose).toBe(1);
    expect(rig.events.at(-1)).toEqual({ kind: 'lick', artefact: false, stampUs: atUs });
    rig.belt.rest(1000);
    expect(rig.instant.lick).toBe(false);
    expect(rig.instant.rose).toBe(0);
  });

  it('counts once however its contact bounces, on closing and on breaking', () => {
    const rig = resting();
    for (let i = 0; i < 4; i++) touch(rig, 1000, 1000);
    rig.belt.edge(LICK, 1);
    rig.belt.rest(80_000);
    rig.belt.edge(LICK, 0);
    for (let i = 0; i < 4; i++) {
      rig.belt.rest(1000);
      touch(rig, 1000, 0);
    }
    expect(rig.licks).toBe(1);
  });

  it('counts each time at the rates at which animals lick', () => {
    for (const hz of [5, 7, 9]) {
      const rig = resting();
      for (let i = 0; i < 40; i++) touch(rig, 40_000, Math.round(1_000_000 / hz) - 40_000);
      expect(rig.licks).toBe(40);
      expect(rig.touches.filter((told) => told !== 'lick')).toEqual([]);
    }
  });

  it('that was touched before the first frame is no lick', () => {
    const rig = new TrackedBelt();
    rig.belt.inputs = 1;
    rig.belt.sample();
    expect(rig.tracker.contact).toBe(true);
    expect(rig.instant.rose).toBe(0);
    rig.belt.rest(60_000);
    rig.belt.edge(LICK, 0);
    for (let i = 0; i < 4; i++) {
      rig.belt.rest(1000);
      touch(rig, 1000, 0);
    }
    expect(rig.licks).toBe(0);
  });

  it('counts although its edge was lost, once two samples show the contact', () => {
    const rig = resting();
    rig.lose = (kind) => kind === 'edge';
    rig.belt.edge(LICK, 1);
    rig.belt.rest(1000);
    expect(rig.licks).toBe(0);
    rig.belt.rest(6000);
    expect(rig.licks).toBe(1);
    rig.belt.rest(30_000);
    rig.belt.edge(LICK, 0);
    rig.belt.rest(12_000);
    expect(rig.tracker.contact).toBe(false);
    expect(rig.licks).toBe(1);
  });
});

describe('an onset near a change of an output', () => {
  it('is an artefact up to 5 ms after it, and a lick beyond', () => {
    for (const [afterUs, told] of [
      [0, 'artefact'],
      [5000, 'artefact'],
      [5001, 'lick'],
    ] as const) {
      const rig = resting();
      rig.belt.outputs = 1;
      rig.belt.sample();
      rig.belt.nowUs += afterUs;
      rig.belt.edge(LICK, 1);
      expect(rig.touches).toEqual([told]);
      expect(rig.instant.lick).toBe(told === 'lick');
    }
  });

  it('is reckoned from the outcome where that tells the change exactly', () => {
    const rig = resting();
    const risesUs = rig.belt.nowUs;
    rig.tracker.outcome({
      id: 1,
      kind: OUTCOME.fired,
      reason: 0,
      output: 0,
      repeated: 0,
      boardUs: risesUs,
      count: 0,
      onUs: 0,
    });
    // The sample that shows the same change 4 ms later is no second change.
    rig.belt.nowUs += 4000;
    rig.belt.outputs = 1;
    rig.belt.sample();
    rig.belt.nowUs += 2000;
    rig.belt.edge(LICK, 1);
    expect(rig.touches).toEqual(['lick']);
  });

  it('is not judged by an outcome that is told again', () => {
    const rig = resting();
    const { nowUs } = rig.belt;
    const fired = {
      id: 1,
      kind: OUTCOME.fired,
      reason: 0,
      output: 0,
      repeated: 1,
      count: 0,
      onUs: 0,
    };
    expect(rig.tracker.outcome({ ...fired, boardUs: nowUs - 1000 })).toBe(nowUs - 1000);
    rig.belt.edge(LICK, 1);
    expect(rig.touches).toEqual(['lick']);
  });

  it('is an artefact after an edge of the sync train', () => {
    const rig = resting();
    const { count } = rig.belt;
    const message = { boardUs: rig.belt.nowUs, count, input: SYNC_EDGE | 5, level: 1 };
    rig.tracker.edge(message, rig.instant);
    expect(rig.instant.inputs).toBe(0);
    rig.belt.outputs = 1 << 5;
    rig.belt.nowUs += 300;
    rig.belt.edge(LICK, 1);
    expect(rig.touches).toEqual(['artefact']);
  });

  it('starts no lockout: a real lick just behind it counts', () => {
    const rig = resting();
    rig.belt.outputs = 1;
    rig.belt.sample();
    touch(rig, 200, 7000);
    rig.belt.edge(LICK, 1);
    expect(rig.touches).toEqual(['artefact', 'lick']);
  });
});

describe('the lick sensor', () => {
  it('is stuck after more than a second of contact, told once, and told when released', () => {
    const rig = resting();
    rig.belt.edge(LICK, 1);
    rig.belt.rest(1_000_000);
    expect(rig.touches).toEqual(['lick']);
    rig.belt.rest(3_000_000);
    expect(rig.touches).toEqual(['lick', 'stuck']);
    rig.belt.edge(LICK, 0);
    expect(rig.touches).toEqual(['lick', 'stuck', 'released']);
  });

  it('is too fast above 12 Hz: told once, and onsets are artefacts until it slows down', () => {
    const rig = resting();
    for (let i = 0; i < 20; i++) touch(rig, 20_000, 50_000);
    expect(rig.touches.slice(0, 6)).toEqual([
      'lick',
      'lick',
      'lick',
      'lick',
      'too fast',
      'artefact',
    ]);
    expect(rig.touches.filter((told) => told === 'too fast')).toHaveLength(1);
    expect(rig.licks).toBe(4);
    rig.belt.rest(500_000);
    touch(rig, 20_000, 100_000);
    expect(rig.licks).toBe(5);
  });
});

describe('other inputs', () => {
  it('rise and fall at the instant of their edge', () => {
    const rig = resting();
    rig.belt.edge(3, 1);
    expect([rig.instant.rose, rig.instant.fell, rig.instant.inputs]).toEqual([8, 0, 8]);
    rig.belt.edge(3, 0);
    expect([rig.instant.rose, rig.instant.fell, rig.instant.inputs]).toEqual([0, 8, 0]);
  });

  it('show no edge for what changed while the link was down', () => {
    const rig = resting();
    rig.belt.inputs = 8;
    rig.tracker.linkResumed(true);
    rig.belt.rest(20_000);
    expect(rig.instant.inputs).toBe(8);
    expect(rig.instant.rose).toBe(0);
  });
});
