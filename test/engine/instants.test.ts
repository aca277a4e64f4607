import { describe, expect, test } from 'vitest';
import { Stage } from './stage.js';

describe('sentence 1: inputs first, then phase, draws, rules in order, and the end last', () => {
  test('a rule sees what the one above it did at the same instant', () => {
    const stage = new Stage(`
rules:
  above:
    when: lick
    do: note
  below:
    when: lick
    if: firings of above this session is 1
    do: note
  again:
    when: lick
    if: time since below fires <= 0 s
    do: note
`).lick();
    expect(stage.firings().map((d) => d.name)).toEqual(['above', 'below', 'again']);
  });

  test('a rule does not see what the one below it does at the same instant', () => {
    const stage = new Stage(`
rules:
  first:
    when: lick
    if: firings of second this session is 1
    do: note
  second:
    when: lick
    do: note
`).lick();
    expect(stage.firings().map((d) => d.name)).toEqual(['second']);
    stage.wait(200).lick();
    expect(stage.firings().map((d) => d.name)).toEqual(['second', 'first', 'second']);
  });

  test('a phase that ends as the lap begins is over when rules are asked about that lap', () => {
    const stage = new Stage(`
phases:
  one: for 2 laps
  two: to the end
rules:
  mark:
    when: lap begins
    if: phase is two
    do: note
`).to(4, 10);
    expect(stage.laps('mark')).toEqual([3, 4]);
  });

  test('a draw made as the lap begins is what that lap begins with', () => {
    const stage = new Stage(`
draws:
  side: left or right, every lap
rules:
  mark:
    when: lap begins
    if: side is left or right
    do: note
`).to(3, 10);
    expect(stage.laps('mark')).toEqual([1, 2, 3]);
  });

  test('the end comes after the rules of its instant', () => {
    const stage = new Stage(`
rules:
  mark:
    when: lap begins
    do: note
end: lap >= 2
`).to(4, 0);
    expect(stage.laps('mark')).toEqual([1, 2]);
    expect(stage.deeds.at(-1)).toMatchObject({ what: 'end', lap: 2 });
  });
});

describe('sentence 2: `if` is read at the moment', () => {
  test('a condition that becomes true later does not bring the moment back', () => {
    const stage = new Stage(`
rules:
  light:
    when: reaches 60 cm
    if: licks this lap >= 1
    do: pulse laser for 100 ms
`);
    stage.to(1, 70).lick().to(2, 30).lick().to(2, 70);
    expect(stage.laps('light')).toEqual([2]);
  });

  test('what the moment brings is already counted: this lick, this lap', () => {
    const stage = new Stage(`
rules:
  third:
    when: lick
    if: licks this lap is 3
    do: note
  fresh:
    when: lap begins
    if: licks this lap is 0 and lap is 2
    do: note
`);
    stage.to(1, 20).lick(5).to(2, 1);
    expect(stage.times('third').length).toBe(1);
    expect(stage.laps('fresh')).toEqual([2]);
  });
});

describe('sentence 3: a firing is a moment itself', () => {
  test('taken at the same instant, after the rules that were due', () => {
    const stage = new Stage(`
rules:
  follower:
    when: water fires
    do: note
  water:
    when: lick
    do: give 4 uL
  other:
    when: lick
    do: note
`).lick();
    expect(stage.firings().map((d) => d.name)).toEqual(['water', 'other', 'follower']);
    expect(new Set(stage.firings().map((d) => d.ms)).size).toBe(1);
  });

  test('`2 s after M` runs separately for each M, its `if` read when the time is up', () => {
    const stage = new Stage(`
rules:
  late:
    when: 2 s after lick
    if: licks this session >= 2
    do: note
`);
    stage.begin();
    stage.lick().wait(500).lick().wait(300).lick().wait(3000);
    const start = 10;
    // Licks at 10, 520 and 830 ms; at 2010 ms all three have been counted.
    expect(stage.times('late')).toEqual([2000 + start, 2520, 2830]);
  });

  test('a rule may wait a time after another has fired', () => {
    const stage = new Stage(`
rules:
  water:
    when: lick
    do: give 4 uL
  tail:
    when: 1 s after water fires
    do: pulse lamp for 20 ms
`);
    stage.begin();
    stage.lick().wait(1500);
    expect(stage.times('tail')).toEqual([1010]);
  });

  test('a firing that the board refused takes what waited for it along', () => {
    const stage = new Stage(`
rules:
  water:
    when: lick
    do: give 4 uL
  tail:
    when: 1 s after water fires
    do: pulse lamp for 20 ms
`);
    stage.outcome = 'not fired';
    stage.lick().wait(1500);
    expect(stage.firings('tail')).toEqual([]);
  });
});

describe('sentence 4: a condition as moment', () => {
  test('comes as it becomes true, and again only after having been not true', () => {
    const stage = new Stage(`
rules:
  fast:
    when: speed > 15 cm/s
    do: note
`);
    stage.begin();
    stage.runTo(174, 10).runTo(180, 20).runTo(186, 20).runTo(190, 10).runTo(200, 20);
    expect(stage.times('fast').length).toBe(2);
  });

  test('before the session nothing is true, so a condition true at the start comes then', () => {
    const stage = new Stage(`
rules:
  at_rest:
    when: still
    do: note
`).begin();
    expect(stage.times('at_rest')).toEqual([0]);
  });

  test('with `for`, it comes when the whole condition has been true so long without a break', () => {
    const stage = new Stage(`
places:
  spout: 85 to 100 cm
rules:
  wake:
    when: still and not in spout for 2 s
    do: note
`);
    stage.to(1, 40).wait(1500).to(1, 41).wait(1990);
    expect(stage.times('wake')).toEqual([]);
    stage.wait(20);
    expect(stage.times('wake').length).toBe(1);
    stage.wait(10_000);
    expect(stage.times('wake').length).toBe(1);
    stage.to(1, 90).wait(5000);
    expect(stage.times('wake').length).toBe(1);
  });
});
