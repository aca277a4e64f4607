import { AnimalsFolder } from '../../animals/animalsFolder.js';
import { dayAfter, dayOf, instantOf, inZone, ownZone } from '../../animals/days.js';
import type { AnimalCard } from '../../animals/entry.js';
import { historyOf } from '../../animals/history.js';
import { weighedOn } from '../../animals/weight.js';

const BY = 'demo';
const DAYS = 12;

interface DemoAnimal {
  readonly name: string;
  readonly card: Partial<AnimalCard>;
  /** Weight of each of the last days, g; the last is today's. */
  readonly weightsG: readonly number[];
  /** Water given by hand on each of the days before today, mL. */
  readonly waterMl: number;
}

const SHARED = { protocol: 'the demo’s own', targetUl: 1000, leastPercent: 80 } as const;

/** A scenario of our own: one that runs, one near its limit that has no session, one at rest. */
const ANIMALS: readonly DemoAnimal[] = [
  {
    name: 'sim1',
    card: { ...SHARED, sex: 'female', baselineG: 24.6, implantG: 1.2, state: 'restricted' },
    weightsG: [25.8, 25.1, 24.4, 23.9, 23.6, 23.2, 23.4, 23.1, 22.9, 23.2, 23.0, 23.1],
    waterMl: 1,
  },
  {
    name: 'sim2',
    card: { ...SHARED, sex: 'male', baselineG: 27.1, implantG: 1.2, state: 'restricted' },
    weightsG: [28.2, 27.4, 26.5, 25.9, 25.3, 24.8, 24.6, 24.2, 24.0, 23.8, 23.6, 23.6],
    waterMl: 0.9,
  },
  {
    name: 'sim3',
    card: { ...SHARED, sex: 'female', baselineG: 23.8, state: 'free' },
    weightsG: [23.8, 23.9, 23.7, 24.0, 24.1, 24.0, 24.2, 24.1, 24.3, 24.2, 24.4, 24.3],
    waterMl: 0,
  },
];

/** Makes the demo's animals where they are not there yet, and weighs them where today they were not. */
export async function keepDemoAnimals(folder: string, now = new Date()): Promise<void> {
  const animals = new AnimalsFolder(folder, () => now);
  for (const animal of ANIMALS) await keep(animals, animal, now);
}

async function keep(animals: AnimalsFolder, animal: DemoAnimal, now: Date): Promise<void> {
  const { name, card, weightsG, waterMl } = animal;
  const { entries: all, zone } = await animals.read().catch(() => noneYet());
  const today = dayOf(now, zone);
  const known = all.get(name);
  if (known !== undefined) {
    const weighed = weighedOn(historyOf(name, known, zone), today) !== undefined;
    const grams = weightsG.at(-1)!;
    if (!weighed) await animals.add(name, { kind: 'weight', at: inZone(now, zone), grams }, BY);
    return;
  }
  const first = dayAfter(today, 1 - DAYS);
  await animals.addAnimal(name, { kind: 'card', set: { ...card, baselineOn: first } }, BY);
  for (let n = 0; n < DAYS; n++) {
    const day = dayAfter(first, n);
    const at = (time: string) => inZone(instantOf(`${day} ${time}`, zone, day), zone);
    const grams = weightsG[n]!;
    const weighedAt = day === today ? inZone(now, zone) : at('09:10');
    await animals.add(name, { kind: 'weight', at: weighedAt, grams }, BY);
    if (day === today || waterMl === 0) continue;
    await animals.add(name, { kind: 'water', at: at('17:40'), ul: waterMl * 1_000 }, BY);
  }
}

/** The folder is not there before its first animal. */
function noneYet() {
  return { entries: new Map(), zone: ownZone() };
}
