/** What the simulated animal claims to do. Every range here is `common practice, no source`. */
import { beforeAll, describe, expect, test } from 'vitest';
import { Animal } from '../../hardware-sim/animal/animal.js';
import { ANIMAL } from '../../hardware-sim/animal/parameters.js';
import { aheadCm, lickIntervalsS, median, PLACE_CM, WaterHost } from './waterHost.js';

const NO_GROOMING = { groomChance: 0 };

/** Mean speed where `ahead` cm of belt lie between the animal and the place; running only. */
function meanSpeed(host: WaterHost, from: number, to: number): number {
  const speeds = host.speeds.filter((_, n) => {
    const ahead = aheadCm(host.positions[n]!, PLACE_CM);
    return ahead >= from && ahead < to && host.speeds[n]! > 1;
  });
  return speeds.reduce((sum, speed) => sum + speed, 0) / speeds.length;
}

const shareNear = (host: WaterHost, behindCm: number, beforeCm: number) =>
  host.licks.filter((lick) => {
    const ahead = aheadCm(lick.positionCm, PLACE_CM);
    return ahead <= beforeCm || ahead >= 180 - behindCm;
  }).length / host.licks.length;

describe('a trained animal', () => {
  let host: WaterHost;
  beforeAll(() => {
    host = new WaterHost({ seed: 4, trained: true, animal: NO_GROOMING });
    host.runMinutes(20);
  });

  test('runs at 10 to 30 cm/s for most of its running, with peaks near 60', () => {
    const running = host.speeds.filter((speed) => speed > 5);
    const usual = running.filter((speed) => speed >= 10 && speed <= 30).length / running.length;
    expect(usual).toBeGreaterThan(0.7);
    expect(median(running)).toBeGreaterThan(10);
    expect(median(running)).toBeLessThan(30);
    expect(Math.max(...host.speeds)).toBeGreaterThan(45);
    expect(Math.max(...host.speeds)).toBeLessThanOrEqual(60);
  });

  test('runs in bouts with pauses between them', () => {
    let bouts = 0;
    let still = 0;
    host.speeds.forEach((speed, n) => {
      if (Math.abs(speed) < 1) still++;
      if (speed >= 5 && host.speeds[n - 1]! < 5) bouts++;
    });
    expect(bouts).toBeGreaterThan(60);
    expect(still / host.speeds.length).toBeGreaterThan(0.1);
    expect(still / host.speeds.length).toBeLessThan(0.6);
  });

  test('slows before the spout', () => {
    expect(meanSpeed(host, 0, 5)).toBeLessThan(0.6 * meanSpeed(host, 60, 120));
  });

  test('licks where the water comes: mostly from 15 cm before it to 15 cm behind', () => {
    expect(host.licks.length).toBeGreaterThan(500);
    expect(shareNear(host, 15, 15)).toBeGreaterThan(0.8);
  });

  test('licks in expectation, before any water has come', () => {
    const before = host.licks.filter((lick) => {
      const ahead = aheadCm(lick.positionCm, PLACE_CM);
      return ahead > 0.5 && ahead <= 15;
    });
    expect(before.length / host.drops).toBeGreaterThan(1);
  });

  test('licks at 5 to 9 Hz, with contacts of 15 to 80 ms', () => {
    const rates = lickIntervalsS(host.licks).map((seconds) => 1 / seconds);
    const within = rates.filter((rate) => rate >= 5 && rate <= 9).length / rates.length;
    expect(within).toBeGreaterThan(0.9);
    for (const lick of host.licks.slice(0, -1)) {
      expect(lick.contactUs).toBeGreaterThanOrEqual(15_000);
      expect(lick.contactUs).toBeLessThanOrEqual(80_000);
    }
  });

  test('drinks what it is given', () => {
    const { drunkUl, atSpoutUl } = host.rig.animal;
    expect(host.drops).toBeGreaterThan(30);
    // One drop may have been cut off by the end.
    expect(drunkUl + atSpoutUl).toBeGreaterThan(4 * (host.drops - 1) - 1e-6);
    expect(drunkUl / (4 * host.drops)).toBeGreaterThan(0.9);
  });

  test('steps back a little now and then', () => {
    const back = host.speeds.filter((speed) => speed < -1).length;
    expect(back).toBeGreaterThan(50);
    expect(back / host.speeds.length).toBeLessThan(0.1);
    expect(Math.min(...host.speeds)).toBeGreaterThan(-10);
  });
});

describe('a naive animal', () => {
  test('licks everywhere', () => {
    const host = new WaterHost({ seed: 5, animal: NO_GROOMING });
    host.giving = false;
    host.runMinutes(15);
    const thirds = [0, 0, 0];
    for (const lick of host.licks) thirds[Math.floor(lick.positionCm / 60)]!++;
    for (const count of thirds) expect(count / host.licks.length).toBeGreaterThan(0.15);
    expect(host.rig.animal.skill).toBe(0);
  });

  test('does not slow where no water has ever come', () => {
    const host = new WaterHost({ seed: 6 });
    host.giving = false;
    host.runMinutes(10);
    expect(meanSpeed(host, 0, 5)).toBeGreaterThan(0.7 * meanSpeed(host, 60, 120));
  });

  test('learns over laps: it comes to lick and slow before the place', () => {
    const host = new WaterHost({ seed: 7, animal: NO_GROOMING });
    host.runMinutes(8);
    const early = shareNear(host, 15, 15);
    const skillEarly = host.rig.animal.skill;
    host.runMinutes(12);
    host.licks.length = 0;
    host.speeds.length = 0;
    host.positions.length = 0;
    host.runMinutes(15);
    expect(host.rig.animal.skill).toBeGreaterThan(0.85);
    expect(skillEarly).toBeLessThan(host.rig.animal.skill);
    expect(shareNear(host, 15, 15)).toBeGreaterThan(Math.max(0.75, early));
    expect(meanSpeed(host, 0, 5)).toBeLessThan(0.6 * meanSpeed(host, 60, 120));
  });
});

describe('an animal', () => {
  test('learns the new place when the water moves', () => {
    const host = new WaterHost({ seed: 8, trained: true });
    host.moveTo(30);
    host.runMinutes(25);
    const off = Math.abs(host.rig.animal.expectedCm - 30);
    expect(off).toBeLessThan(12);
    expect(host.rig.animal.skill).toBeGreaterThan(0.4);
  });

  test('runs less as its thirst wanes, and stops when it has had its fill', () => {
    const host = new WaterHost({ seed: 9, trained: true, animal: { quenchedUl: 200 } });
    host.runMinutes(5);
    const fresh = host.rig.belt.travelCm;
    host.runMinutes(40);
    const before = host.rig.belt.travelCm;
    host.runMinutes(5);
    expect(host.rig.animal.thirst).toBeLessThan(0.1);
    expect(host.rig.belt.travelCm - before).toBeLessThan(0.2 * fresh);
  });

  test('grooms in pauses, with contacts that no tongue makes', () => {
    const host = new WaterHost({ seed: 10, trained: true, animal: { groomChance: 0.5 } });
    host.runMinutes(10);
    const odd = host.licks.filter((lick) => lick.contactUs < 15_000 || lick.contactUs > 80_000);
    expect(odd.length).toBeGreaterThan(20);
  });

  test('does the same again from the same seed, and something else from another', () => {
    const run = (seed: number) => {
      const host = new WaterHost({ seed });
      host.runMinutes(2);
      return { travel: host.rig.belt.travelCm, licks: host.licks };
    };
    expect(run(21)).toEqual(run(21));
    expect(run(21).travel).not.toBe(run(22).travel);
  });
});

describe('a drop at the spout', () => {
  /** So many animals of a kind, each given its first drop; those that took no notice of it. */
  const unmoved = (trained: boolean, animals = 600) =>
    Array.from({ length: animals }, (_, seed) => {
      const animal = new Animal(ANIMAL, 180, seed + 1, trained, PLACE_CM);
      const { skill } = animal;
      animal.drop(4, PLACE_CM, 1_000_000);
      return { animal, skill };
    }).filter(({ animal }) => animal.licking.nextUs === Number.POSITIVE_INFINITY);

  test('is missed by a naive animal now and then, by a trained one hardly ever', () => {
    const naive = unmoved(false).length / 600;
    expect(naive).toBeGreaterThan(0.1);
    expect(naive).toBeLessThan(0.4);
    expect(unmoved(true).length / 600).toBeLessThan(0.05);
  });

  test('that was missed hangs there, teaches nothing, and is drunk with the next licks', () => {
    const missed = unmoved(false);
    expect(missed.length).toBeGreaterThan(0);
    for (const { animal, skill } of missed) {
      expect(animal.skill).toBe(skill);
      expect(animal.atSpoutUl).toBe(4);
      for (let lick = 0; lick < 4; lick++) animal.licked();
      expect(animal.drunkUl).toBeCloseTo(4, 9);
    }
  });

  test('falls beside a spout at which as much hangs as can', () => {
    const animal = new Animal({ ...ANIMAL, naiveMissChance: 1 }, 180, 3, false, PLACE_CM);
    for (let drop = 0; drop < 10; drop++) animal.drop(4, PLACE_CM, 1_000_000);
    expect(animal.atSpoutUl).toBe(15);
  });
});
