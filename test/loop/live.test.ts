import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterEach, describe, expect, it } from 'vitest';
import type { StampedDecision } from '../../server/session/decisions.js';
import { readDescription } from '../../server/session/description.js';
import { finished, LiveRig, lapwing, until } from '../tools/liveRig.js';

/** Water and a gate once a lap, on a 30 cm belt. */
const EACH_LAP = `title: Each lap
belt: 30 cm
rules:
  water:
    when: reaches 15 cm
    do: give 4 uL
    within: 1 cm
  gate:
    when: reaches 25 cm
    do: pulse gate for 20 ms
    limit: 1 per lap
    within: 1 cm
end: laps done this session >= 400
`;

let rig: LiveRig | undefined;
afterEach(async () => {
  await rig?.stop();
  rig = undefined;
});

async function started(rules: string, ...more: string[]): Promise<LiveRig> {
  rig = await LiveRig.start({ rules });
  rig.watch();
  rig.run(...more);
  await until(
    'the first lap',
    () => (rig!.state?.lap ?? 0) >= 1,
    60_000,
    () => rig!.output,
  );
  return rig;
}

function fired(events: readonly StampedDecision[], rule: string) {
  return events.filter((event) => event.kind === 'fired' && event.rule === rule) as Extract<
    StampedDecision,
    { kind: 'fired' }
  >[];
}

/** How often a rule fired in each lap. */
function perLap(events: readonly StampedDecision[], rule: string): number[] {
  const counts = new Map<number, number>();
  for (const { lap } of fired(events, rule)) counts.set(lap, (counts.get(lap) ?? 0) + 1);
  return [...counts.values()];
}

async function replayed(folder: string): Promise<string> {
  const { status, out, err } = await finished(lapwing('replay', folder));
  expect(err + out).toContain('identical');
  expect(status).toBe(0);
  return out;
}

describe('a session on a real pseudo-terminal', { timeout: 120_000 }, () => {
  it('fires at its places on every lap, ends by its own rules, and replays identically', async () => {
    rig = await LiveRig.start({ rules: EACH_LAP.replace('>= 400', '>= 4') });
    rig.watch();
    const { status, out } = await finished(rig.run());
    expect(status, rig.output).toBe(0);
    expect(out).toContain('its `end` is true');
    const water = fired(rig.events, 'water');
    expect(water.length).toBeGreaterThanOrEqual(4);
    expect(perLap(rig.events, 'water').every((times) => times === 1)).toBe(true);
    // A machine that stalls for 150 ms loses its slots, and the host has to ask instead.
    const armed = water.filter((firing) => firing.armed);
    expect(armed.length).toBeGreaterThan(0);
    for (const { errorMm } of water) expect(Math.abs(errorMm!)).toBeLessThanOrEqual(10);
    // One count of this belt is 0.4 mm.
    for (const { errorMm } of armed) expect(Math.abs(errorMm!)).toBeLessThanOrEqual(0.4);
    const description = readDescription(rig.session);
    expect(description.ended?.how).toBe('rules');
    expect(description.water?.givenUl).toBeCloseTo(4 * water.length, 1);
    expect(description.record?.state).toBe('whole');
    expect(readFileSync(join(rig.session, 'rules.yaml'), 'utf8')).toContain('Each lap');
    await replayed(rig.session);
  });

  it('is followed by another on the same board, whose commands are taken for its own', async () => {
    rig = await LiveRig.start({ rules: EACH_LAP });
    const client = rig.watch();
    const folders = ['--rules', rig.folder, '--records', rig.recordFolder];
    rig.adopt(rig.lapwing('serve', '--rig', 'RIG', '--port', '0', ...folders));
    await until(
      'the board',
      () => rig!.state?.link.state === 'up',
      60_000,
      () => rig!.output,
    );
    for (const seed of ['one', 'two']) {
      rig.events.length = 0;
      const numbers = seed === 'one' ? { protocolNumber: 'P-2026-014', sessionNumber: 12 } : {};
      await client.begin({ rules: 'rules.yaml', subject: 'm1', seed, ...numbers });
      const firings = () => fired(rig!.events, 'water').length + fired(rig!.events, 'gate').length;
      await until(
        'four firings',
        () => firings() >= 4,
        60_000,
        () => rig!.output,
      );
      const mistaken = rig.events.filter(
        (event) => event.kind === 'refused' && /oldId|busy|slotTaken/.test(event.reason),
      );
      expect(mistaken).toEqual([]);
      await client.end('enough');
      await until(
        'the end',
        () => rig!.state?.session === 'ended',
        30_000,
        () => rig!.output,
      );
    }
    const day = readdirSync(rig.recordFolder).map((name) =>
      readDescription(join(rig!.recordFolder, name)),
    );
    expect(day.map(({ seed }) => seed).sort()).toEqual(['one', 'two']);
    // The lab counts this animal's sessions from 12; the second goes on from there.
    expect(day.map(({ sessionNumber }) => sessionNumber).sort()).toEqual([12, 13]);
    expect(day.find(({ seed }) => seed === 'one')!.protocolNumber).toBe('P-2026-014');
    // What the first gave counts against the day's limit of the second.
    const second = day.find(({ seed }) => seed === 'two')!;
    expect(second.waterEarlierUl).toBeCloseTo(
      day.find(({ seed }) => seed === 'one')!.water!.givenUl,
    );
    await rig.end('SIGINT');
    expect(rig.status, rig.output).toBe(0);
  });

  it('ends in order on Ctrl-C: outputs idle, the record closed, status 0', async () => {
    const live = await started(EACH_LAP, '--protocol', 'P-2026-014');
    await live.end('SIGINT');
    expect(live.status, live.output).toBe(0);
    expect(await live.outputs()).toBe(0);
    expect(readDescription(live.session)).toMatchObject({
      ...{ ended: { how: 'operator' }, protocolNumber: 'P-2026-014', sessionNumber: 1 },
    });
    await replayed(live.session);
  });

  it('goes on after the cable was pulled and put back under another name', async () => {
    const live = await started(EACH_LAP);
    await live.simulated.unplug();
    await until('the link to be down', () => live.state?.link.state !== 'up');
    const lap = live.state!.lap;
    await live.simulated.replug();
    await until('the link to be up', () => live.state?.link.state === 'up');
    await until(
      'more laps',
      () => live.state!.lap >= lap + 3,
      30_000,
      () => live.output,
    );
    const before = fired(live.events, 'gate').length;
    await until('more firings', () => fired(live.events, 'gate').length > before);
    expect(Math.max(...perLap(live.events, 'gate'))).toBe(1);
    await live.end('SIGINT');
    await replayed(live.session);
  });

  it('keeps stimulation back after the board was reset, until the operator allows it', async () => {
    const live = await started(EACH_LAP);
    await live.simulated.reset();
    await until(
      'the hold',
      () => live.state?.held.stimulus !== null,
      30_000,
      () => live.output,
    );
    const alarm = () => live.state?.alarms.find((one) => one.alarm === 'restart');
    await until('the alarm', () => alarm() !== undefined);
    await live.client.act({ act: 'acknowledge', alarm: 'restart' }, 'a test', 'here');
    await until('that it was seen', () => alarm()?.seenBy?.who === 'a test');
    const lap = live.state!.lap;
    await until('laps with a known position', () => live.state!.lap >= lap + 3);
    const after = live.events.slice(
      live.events.findLastIndex((event) => event.kind === 'link' && event.state === 'up'),
    );
    expect(fired(after, 'gate')).toHaveLength(0);
    expect(fired(after, 'water').length).toBeGreaterThan(0);
    await live.client.act({ act: 'allow stimulation' }, 'a test', 'here');
    const firings = fired(live.events, 'gate').length;
    await until('the gate again', () => fired(live.events, 'gate').length > firings);
    await until('the alarm to be over', () => alarm() === undefined);
    await live.end('SIGINT');
    await replayed(live.session);
    const told = (await live.recorded()).flatMap((one) =>
      one.kind === 'alarm' && one.alarm === 'restart' ? [one.state] : [],
    );
    expect(told).toEqual(['raised', 'cleared']);
  });

  it('goes idle while the loop is stopped for 3 s, refuses what is stale, and shakes hands anew', async () => {
    const live = await started(EACH_LAP);
    const connections = () =>
      live.events.filter((event) => event.kind === 'link' && event.state === 'up').length;
    const before = connections();
    live.signalLoop('SIGSTOP');
    await new Promise((resolve) => setTimeout(resolve, 3_000));
    expect(await live.outputs()).toBe(0);
    live.signalLoop('SIGCONT');
    await until(
      'a new handshake',
      () => connections() > before,
      30_000,
      () => live.output,
    );
    await until('the alarm', () => live.state!.alarms.some((one) => one.alarm === 'silence'));
    const lap = live.state!.lap;
    await until('more laps', () => live.state!.lap >= lap + 2);
    expect(Math.max(...perLap(live.events, 'gate'))).toBe(1);
    await live.end('SIGINT');
    await replayed(live.session);
  });
});

describe('a loop that is killed', { timeout: 180_000 }, () => {
  it('is started again and goes on with its laps, counts, water and limits', async () => {
    const live = await started(EACH_LAP.replace('1 per lap', '1 per lap, 12 per session'));
    // Moments spread over the lap, so that a kill falls between decide, send and append at times.
    for (const waitMs of [450, 730, 1010]) {
      await new Promise((resolve) => setTimeout(resolve, waitMs));
      const lap = live.state!.lap;
      const firings = live.ruleFirings('gate');
      live.state = undefined;
      live.signalLoop('SIGKILL');
      await until(
        'the loop to be back',
        () => live.state?.link.state === 'up',
        30_000,
        () => live.output,
      );
      expect(live.state!.session).toBe('running');
      expect(live.state!.lap).toBeGreaterThanOrEqual(lap);
      expect(live.ruleFirings('gate')).toBeGreaterThanOrEqual(firings);
      await until(
        'another lap',
        () => live.state!.lap >= lap + 2,
        30_000,
        () => live.output,
      );
    }
    await until('the limit of the session', () => live.ruleFirings('gate') >= 12, 60_000);
    const lap = live.state!.lap;
    await until('two laps more', () => live.state!.lap >= lap + 2);
    await live.end('SIGINT');
    const decisions = await live.recorded();
    const gate = fired(decisions, 'gate');
    expect(Math.max(...perLap(decisions, 'gate'))).toBe(1);
    // Together with what nobody could account for, never beyond the limit.
    expect(gate.length).toBeLessThanOrEqual(12);
    // Every drop that the board gave is in the book, those of a loop that died included.
    const given = readDescription(live.session).water!;
    const drops = await live.rises(0);
    expect(given.givenUl + given.uncertainUl).toBeGreaterThanOrEqual(drops * 4 - 0.5);
    expect(given.givenUl).toBeLessThanOrEqual(drops * 4 + 0.5);
    await replayed(live.session);
  });
});
