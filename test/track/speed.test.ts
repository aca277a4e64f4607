import { describe, expect, it } from 'vitest';
import { SpeedWindow } from '../../server/track/speedWindow.js';
import { TrackedBelt } from './trackedBelt.js';

describe('speed', () => {
  it('is signed, and the same forwards and backwards', () => {
    const rig = new TrackedBelt().begin(10);
    rig.belt.rest(300_000);
    rig.belt.run(400, 1);
    // 1 count a millisecond at 20 counts a centimetre.
    expect(rig.instant.speedCmPerS).toBeCloseTo(50, 6);
    rig.belt.run(-600, 1);
    expect(rig.instant.speedCmPerS).toBeCloseTo(-50, 6);
  });

  it('falls to exactly zero within its window once counts stop', () => {
    const rig = new TrackedBelt().begin(10);
    rig.belt.rest(100_000);
    expect(rig.instant.speedCmPerS).toBeGreaterThan(0);
    rig.belt.rest(105_000);
    expect(rig.instant.speedCmPerS).toBe(0);
  });

  it('does not jump at a seam correction', () => {
    const rig = new TrackedBelt().begin(50);
    rig.belt.run(2000, 1);
    rig.belt.slip(0);
    const before = rig.instant.speedCmPerS;
    rig.belt.run(700, 1);
    expect(rig.instant.speedCmPerS).toBeCloseTo(before, 6);
  });

  it('is the mean over a stretch in which no frames came, not a jump', () => {
    const rig = new TrackedBelt().begin(10);
    rig.belt.run(300, 1);
    rig.lose = () => true;
    rig.belt.run(2000, 1);
    rig.lose = () => false;
    rig.belt.sample();
    expect(rig.instant.speedCmPerS).toBeCloseTo(50, 6);
  });

  it('counts one count after a rest as one count in the window', () => {
    const rig = new TrackedBelt().begin(10);
    rig.belt.rest(1_000_000);
    rig.belt.run(1, 1);
    // One count is 0.05 cm; 0.05 cm in 200 ms.
    expect(rig.instant.speedCmPerS).toBeCloseTo(0.25, 9);
  });

  it('holds its memory under a storm of edges, and is right again after it', () => {
    const speed = new SpeedWindow(100_000);
    speed.restart(0, 0);
    let us = 0;
    let moved = 0;
    const take = () => {
      speed.io.set([us, ++moved]);
      speed.take();
    };
    for (; us < 50_000; us += 5) take();
    for (; us <= 250_000; us += 1000) take();
    expect(speed.io[2]).toBeCloseTo(1 / 1000, 9);
  });
});
