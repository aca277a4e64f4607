import { describe, expect, it } from 'vitest';
import { rehearse } from '../../server/session/rehearsal.js';
import { setupOf, virtualRig } from '../session/rehearsed.js';

/** How often a rule with this condition fires in two minutes, asked each second. */
function firings(condition: string, more = ''): number {
  const setup = setupOf(`title: units
belt: 180 cm
${more}rules:
  asked:
    when: every 1 s
    if: ${condition}
    do: note
end: time >= 2 min
`);
  return rehearse(setup, virtualRig(), { mostUs: 3e8 }).core.engine.view().rules[0]!.firings;
}

// The factors between units are those of the SI (BIPM, The International System of Units, 9th
// edition, 2019): a speed is a length over a time, whatever units each was written in.
describe('arithmetic with units', () => {
  it.each([
    ['30 cm / 2 s >= 14.9 cm/s', true],
    ['30 cm / 2 s <= 15.1 cm/s', true],
    ['30 cm / 2 s > 15.1 cm/s', false],
    ['0.3 m / 2000 ms is 14.9 to 15.1 cm/s', true],
    ['15 cm/s * 2 s is 29.9 to 30.1 cm', true],
    ['2 s * 15 cm/s > 31 cm', false],
    ['30 cm / 15 cm/s is 1.9 to 2.1 s', true],
    ['20 Hz * 2 s is 39 to 41', true],
    ['1 / 50 ms is 19.9 to 20.1 Hz', true],
    ['4 uL / 2 is 1.9 to 2.1 uL', true],
    ['90 cm / 180 cm is 0.49 to 0.51', true],
    ['speed * 1 s <= 200 cm', true],
    ['speed * 1 s > 200 cm', false],
  ])('%s is %s', (condition, holds) => {
    expect(firings(condition)).toBe(holds ? 120 : 0);
  });

  it('holds for named values too', () => {
    expect(
      firings('gap / pause is 9.9 to 10.1 cm/s', 'values:\n  gap: 20 cm\n  pause: 2 s\n'),
    ).toBe(120);
  });
});
