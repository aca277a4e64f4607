import { readdirSync, readFileSync } from 'node:fs';
import { describe, expect, test } from 'vitest';
import { isArmable } from '../../server/rules/armable.js';
import { parseRules } from '../../server/rules/text/parseRules.js';
import { type Deed, Stage } from './stage.js';
import { followTrajectory } from './trajectory.js';

/**
 * The twelve sessions on a fixed path (`trajectory.ts`). What they should fire was worked out by
 * `expected/make.py`, which shares nothing with the engine but the language's description.
 */
const SESSIONS = new URL('../../hardware-sim/demo/sessions/', import.meta.url);
const EXPECTED = new URL('./expected/', import.meta.url);
const FRAMES = 110_000;

const files = readdirSync(SESSIONS).filter((name) => /^\d\d-.*\.yaml$/.test(name));

function stageOf(name: string): Stage {
  const { file, problems } = parseRules(name, (path) => {
    return readFileSync(new URL(path, SESSIONS));
  });
  if (!file) throw new Error(JSON.stringify(problems));
  return new Stage(file);
}

function row(deed: Deed): string {
  const place = Number.isNaN(deed.cm) ? '' : deed.cm.toFixed(2);
  return `${deed.name},${deed.what === 'sham' ? 'sham' : 'real'},${deed.lap},${place},${deed.ms}`;
}

/** Within one instant, the order in which rules are told of is not part of what is expected. */
function sorted(rows: readonly string[]): string[] {
  const time = (line: string): number => Number(line.split(',').at(-1));
  return [...rows].sort((a, b) => time(a) - time(b) || (a < b ? -1 : 1));
}

describe('the twelve sessions fire what was worked out for them', () => {
  test('there are twelve', () => expect(files.length).toBe(12));

  describe.each(files)('%s', (name) => {
    const text = readFileSync(new URL(`${name.slice(0, 2)}.csv`, EXPECTED), 'utf8');
    const expected = text.trim().split('\n').slice(1);

    test('started by the host', () => {
      const stage = stageOf(name);
      followTrajectory(stage, FRAMES);
      expect(sorted(stage.firings().map(row))).toEqual(sorted(expected));
      expect(stage.of('missed')).toEqual([]);
    });

    test('started by the board where it may be', () => {
      const stage = stageOf(name);
      stage.slots = true;
      followTrajectory(stage, 50_000);
      const early = expected.filter((line) => Number(line.split(',').at(-1)) < 500_000);
      expect(sorted(stage.firings().map(row))).toEqual(sorted(early));
      const armable = stage.file.rules.some((rule) => isArmable(rule));
      expect(stage.of('armed').length > 0).toBe(armable);
    });
  });
});
