import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { Ajv2020 } from 'ajv/dist/2020.js';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { parse } from 'yaml';
import { individual } from '../../hardware-sim/animal/individual.js';
import { ANIMAL, PARAMETERS } from '../../hardware-sim/animal/parameters.js';
import { packageRoot } from '../../server/packageRoot.js';
import {
  animalSchema,
  animalText,
  parseAnimal,
  readAnimal,
} from '../../server/rehearse/animalFile.js';

const DEMO = join(packageRoot, 'hardware-sim/demo/animal.yaml');

describe('an animal file', () => {
  test('reads back what it was written from', () => {
    const { animal, problems } = parseAnimal(animalText({ name: 'mine', parameters: ANIMAL }));
    expect(problems).toEqual([]);
    expect(animal).toEqual({ name: 'mine', parameters: ANIMAL });
  });

  test.each(['- x', 'a: b', '#7', "it's", 'trailing ', '"', 'true'])(
    'keeps the name %j',
    (name) => {
      const { animal } = parseAnimal(animalText({ name, parameters: ANIMAL }));
      expect(animal!.name).toBe(name);
    },
  );

  test('ships with the demo, with the usual values', () => {
    expect(readAnimal(DEMO).parameters).toEqual(ANIMAL);
  });

  test('keeps to its schema, and the schema to the table', () => {
    const path = join(packageRoot, 'server/rehearse/animal.schema.json');
    const schema = JSON.parse(readFileSync(path, 'utf8')) as object;
    expect(schema).toEqual(animalSchema());
    const right = new Ajv2020().compile(schema);
    expect(right(parse(readFileSync(DEMO, 'utf8'), { schema: 'failsafe' }))).toBe(true);
    expect(right({ bout: '9 cm' })).toBe(false);
    expect(right({ bouts: '9 s' })).toBe(false);
  });

  test('leaves as usual what it does not say', () => {
    const { animal } = parseAnimal('animal: quick\nbout: 20 s\ngroom_chance: 0 %\n');
    expect(animal!.parameters).toEqual({ ...ANIMAL, boutS: 20, groomChance: 0 });
  });

  test('is told every problem at once, with its line', () => {
    const { problems } = parseAnimal(
      'animal: x\nbuot: 9 s\npause: 3\nslowest_cruise: 40 cm/s\nback_chance: 130 %\n',
    );
    expect(problems).toEqual([
      { line: 2, message: 'unknown line `buot`: nearest is `bout`' },
      { line: 3, message: 'found `3`: expected pause from 0.1 to 600 s' },
      { line: 5, message: 'found `130 %`: expected back_chance from 0 to 100 %' },
      { line: 4, message: 'slowest_cruise is more than fastest_cruise' },
    ]);
  });

  test.each(['', '[1, 2]', 'just text', 'a: b: c', '- x'])('of %j is refused', (text) => {
    const { animal, problems } = parseAnimal(text);
    expect(animal).toBeUndefined();
    expect(problems.length).toBeGreaterThan(0);
  });

  test('never throws, whatever text it is', () => {
    fc.assert(
      fc.property(fc.string(), (text) => {
        const { animal, problems } = parseAnimal(text);
        expect((animal === undefined) === problems.length > 0).toBe(true);
      }),
      { seed: 7, numRuns: 300 },
    );
  });
});

describe('one animal of a kind', () => {
  test('is the same for the same seed, and the kind itself where they do not differ', () => {
    expect(individual(ANIMAL, 5)).toEqual(individual(ANIMAL, 5));
    expect(individual(ANIMAL, 5)).not.toEqual(individual(ANIMAL, 6));
    const alike = individual({ ...ANIMAL, betweenAnimals: 0 }, 5);
    for (const [key, value] of Object.entries(ANIMAL)) {
      if (key !== 'betweenAnimals') expect(alike[key as keyof typeof ANIMAL]).toBeCloseTo(value, 9);
    }
  });

  test('stays within the bounds of every parameter', () => {
    const kind = { ...ANIMAL, betweenAnimals: 1 };
    const beyond: string[] = [];
    for (let seed = 0; seed < 300; seed++) {
      for (const [key, value] of Object.entries(individual(kind, seed))) {
        const { least, most } = PARAMETERS[key as keyof typeof ANIMAL];
        if (!(value >= least && value <= most)) beyond.push(`${key} ${value}`);
      }
    }
    expect(beyond).toEqual([]);
  });

  test('differs from others by the spread that the file says', () => {
    const logs = Array.from({ length: 2000 }, (_, seed) =>
      Math.log(individual(ANIMAL, seed).boutS / 9),
    );
    const mean = logs.reduce((sum, log) => sum + log, 0) / logs.length;
    const sd = Math.sqrt(logs.reduce((sum, log) => sum + (log - mean) ** 2, 0) / logs.length);
    expect(mean).toBeCloseTo(0, 1);
    expect(sd).toBeGreaterThan(0.18);
    expect(sd).toBeLessThan(0.22);
  });
});
