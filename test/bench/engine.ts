import { compile } from '../../server/rules/engine/compile.js';
import { RulesEngine } from '../../server/rules/engine/rulesEngine.js';
import type { RigFacts } from '../../server/rules/facts.js';
import type { Actuator, ArmRequest, Instant, Journal } from '../../server/rules/instant.js';
import { parseRules } from '../../server/rules/text/parseRules.js';

/** What one frame costs the rules engine. */
export interface EngineRow {
  /** What kind of rules, and whether events happened. */
  readonly what: string;
  readonly rules: number;
  readonly nsPerFrame: number;
  readonly bytesPerFrame: number;
}

const LAP = 4500;
const WARM_FRAMES = 200_000;
const FRAMES = 1_000_000;
const ROUNDS = 5;

/**
 * Nanoseconds and bytes a frame at 1 kHz frames and 20 cm/s (a count every other frame), for 1, 10
 * and 100 rules: the mix of a usual session, rules that wait for places alone, and conditions that
 * must be looked at each frame. The quickest of five rounds, since a shared machine only adds.
 */
export async function benchEngine(): Promise<EngineRow[]> {
  const rows: EngineRow[] = [];
  for (const rules of [1, 10, 100]) {
    rows.push(measure('usual mix, running', rules, usualRule, 1));
    rows.push(measure('waiting for places, standing', rules, placeRule, 0));
    rows.push(measure('conditions each frame', rules, conditionRule, 1));
  }
  return rows;
}

function placeRule(n: number): string {
  return `  r${n}:\n    when: reaches ${60 + ((n * 7) % 110)} cm\n    if: speed >= 8 cm/s\n    do: pulse laser for 20 ms\n    limit: 1 per lap\n`;
}
function conditionRule(n: number): string {
  return `  r${n}:\n    when: speed > ${30 + n} cm/s and lap >= 2 for 500 ms\n    do: note\n`;
}
function lickRule(n: number): string {
  return `  r${n}:\n    when: lick in ${10 + n} to ${20 + n} cm\n    if: licks this lap >= 2\n    do: give 4 uL\n    limit: 1 per lap\n`;
}
/** Of ten rules: six at places, two at licks, one timer, one condition. */
function usualRule(n: number): string {
  if (n % 10 < 6) return placeRule(n);
  if (n % 10 < 8) return lickRule(n);
  if (n % 10 === 8)
    return `  r${n}:\n    when: every ${2 + (n % 7)} s\n    do: pulse sync for 10 ms\n`;
  return conditionRule(n);
}

function measure(
  what: string,
  rules: number,
  rule: (n: number) => string,
  moving: number,
): EngineRow {
  const text = `title: bench\nbelt: 180 cm\nrules:\n${Array.from({ length: rules }, (_, n) => rule(n)).join('')}`;
  const { file, problems } = parseRules('bench.yaml', text);
  if (!file) throw new Error(JSON.stringify(problems));
  const agree = (): undefined => undefined;
  const nothing = (): void => {};
  const slots: (ArmRequest | undefined)[] = new Array(rules).fill(undefined);
  const actuator: Actuator = {
    ...{ fire: agree, stop: nothing, endSession: nothing },
    arm(request) {
      slots[request.rule] = request;
      return undefined;
    },
    disarm(rule) {
      const serial = slots[rule]?.serial ?? 0;
      slots[rule] = undefined;
      engine.settle(rule, serial, 'not fired', instant);
    },
  };
  const journal: Journal = {
    ...{ fired: nothing, withheld: nothing, missed: nothing, drawn: nothing },
    ...{
      phaseBegan: nothing,
      cellBegan: nothing,
      noted: nothing,
      endForeseen: nothing,
      chosen: nothing,
    },
    fieldPredicted: nothing,
  };
  const engine = new RulesEngine(compile(file, FACTS), 'bench', actuator, journal);
  const instant = firstInstant();
  engine.begin(instant);
  run(engine, instant, slots, WARM_FRAMES, moving);
  let nsPerFrame = Number.POSITIVE_INFINITY;
  let bytesPerFrame = Number.POSITIVE_INFINITY;
  for (let round = 0; round < ROUNDS; round++) {
    const heap = process.memoryUsage().heapUsed;
    const start = process.hrtime.bigint();
    run(engine, instant, slots, FRAMES / ROUNDS, moving);
    const ns = Number(process.hrtime.bigint() - start);
    const grown = process.memoryUsage().heapUsed - heap;
    nsPerFrame = Math.min(nsPerFrame, (ns * ROUNDS) / FRAMES);
    // A round in which garbage was collected says nothing about what was allocated.
    if (grown >= 0) bytesPerFrame = Math.min(bytesPerFrame, (grown * ROUNDS) / FRAMES);
  }
  return { what, rules, nsPerFrame, bytesPerFrame };
}

/** The tracker's part, kept as small as can be: its own cost is in these numbers. */
function run(
  engine: RulesEngine,
  i: Instant,
  slots: (ArmRequest | undefined)[],
  frames: number,
  moving: number,
): void {
  for (let n = 0; n < frames; n++) {
    i.nowUs += 1000;
    i.travelFrom = i.travelTo;
    i.progressFrom = i.progressTo;
    i.travelTo += n & moving;
    i.progressTo = i.travelTo;
    const lap = Math.floor(i.travelTo / LAP);
    i.lapBegan = lap > i.lap;
    i.lap = lap;
    i.positionCm = (i.travelTo - lap * LAP) / 25;
    i.speedCmPerS = moving * 20;
    i.lick = moving === 1 && (n & 127) === 0;
    engine.step(i);
    if ((n & 15) === 0 && moving === 1) answer(engine, i, slots);
  }
}

/** The board's word on the slots whose places have been passed. */
function answer(engine: RulesEngine, i: Instant, slots: (ArmRequest | undefined)[]): void {
  for (let rule = 0; rule < slots.length; rule++) {
    const slot = slots[rule];
    if (slot === undefined || slot.placeTravel > i.travelTo) continue;
    slots[rule] = undefined;
    engine.settle(rule, slot.serial, 'fired', i);
  }
}

function firstInstant(): Instant {
  return {
    ...{ nowUs: 1_000_000, trust: 'trusted' as const, placed: true, lapCounts: LAP },
    ...{ travelFrom: LAP, travelTo: LAP, progressFrom: LAP, progressTo: LAP, positionCm: 0 },
    ...{ speedCmPerS: 0, lap: 1, lapBegan: true, lick: false, inputs: 0, rose: 0, fell: 0 },
  };
}

const FACTS: RigFacts = {
  ...{ beltLengthCm: 180, beltToleranceCm: 0.5, countsPerCm: 25, seamMark: true },
  ...{ slipAllowedCm: 3, stillBelowCmPerS: 1, hysteresisCm: 0.5, inputs: [] },
  outputs: [
    {
      ...{ name: 'valve', index: 0, kind: 'valve', longestOnUs: 250_000, leastGapUs: 100_000 },
      valve: { deadUs: 8_000, usPerNl: 12, leastNl: 1_000, mostNl: 12_000 },
    },
    { name: 'laser', index: 1, kind: 'stimulus', longestOnUs: 500_000, leastGapUs: 0 },
    { name: 'sync', index: 2, kind: 'mark', longestOnUs: 100_000, leastGapUs: 0 },
  ],
};
