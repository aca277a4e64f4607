import { ageDays, isOld } from '../../session/rig/calibration.js';
import { turnedWay } from '../belt/beltFit.js';
import { type Pass, passesOf } from '../belt/passes.js';
import { type Desk, figures, textFrom } from '../guides/guide.js';
import { collectEdges, gap, lineOf, lookAnew, pulse } from '../guides/waiting.js';
import { contactsOf } from '../lick/contacts.js';
import {
  type Computer,
  clockIsSane,
  diskHasRoom,
  type Finding,
  failed,
  notPossible,
  passed,
  willNotSleep,
} from './computer.js';

/** What a check may use besides the rig. */
export interface Facts {
  readonly computer: Computer;
  /** Where sessions are recorded: bytes free, and the largest session so far. */
  readonly freeBytes: number;
  readonly largestBytes: number;
  /** The newest time that a file of this rig carries. */
  readonly newest: Date | undefined;
}

export interface Check {
  readonly id: string;
  readonly title: string;
  /** What the person is to do; empty where nothing. */
  readonly text: string;
  run(desk: Desk, facts: Facts): Promise<Finding> | Finding;
}

/** A person has this long for each thing that hands do, of board time. */
const HANDS_US = 45_000_000;
const CHATTER_CM = 0.3;
const TOUCHES = 3;
const DROPS = 5;
const DROP_GAP_MS = 250;
const WIRE_PULSES = 5;
const WIRE_US = 20_000;

/** In this order: what needs no hands first, so that a missing disk is known before a belt is turned. */
export const CHECKS: readonly Check[] = [
  { id: 'board', title: 'The board is the right one', text: '', run: board },
  { id: 'disk', title: 'The disk has room for two sessions', text: '', run: disk },
  {
    ...{ id: 'sleep', title: 'This computer will not sleep', text: '' },
    run: (_, { computer }) => willNotSleep(computer),
  },
  {
    ...{ id: 'clock', title: "This computer's clock is right", text: '' },
    run: (_, { computer, newest }) => clockIsSane(computer, newest),
  },
  { id: 'calibrations', title: 'Calibrations are young enough', text: '', run: calibrations },
  { id: 'loopback', title: 'An output is seen at its input', text: '', run: loopback },
  {
    ...{ id: 'lap', title: 'A lap by hand ends at the seam mark' },
    text: 'Turn the belt by hand, the way the animal runs, twice past the seam mark.',
    run: lap,
  },
  {
    ...{ id: 'spout', title: 'The lick sensor feels the spout' },
    text: `Touch the spout ${TOUCHES} times with a wet finger.`,
    run: spout,
  },
  {
    ...{ id: 'inputs', title: 'Every other input has been seen to change' },
    text: 'Make each of the other inputs change once: press, cover, or send a pulse.',
    run: inputs,
  },
  {
    ...{ id: 'drops', title: 'Five drops come' },
    text: `Watch the spout: ${DROPS} drops, no animal on the rig.`,
    run: drops,
  },
];

function board(desk: Desk): Finding {
  const { model, boardId, firmware } = desk.bench.board;
  const found = `${model}, board ${boardId}, firmware ${firmware}`;
  const wanted = desk.rig.boardId;
  if (wanted === undefined) return passed(`${found}; the rig file names no \`board_id\`.`);
  if (wanted === boardId) return passed(`${found}, as the rig file says.`);
  return failed(`${found}; the rig file is for board ${wanted}.`, 'Connect the right board.');
}

function disk(_: Desk, { freeBytes, largestBytes }: Facts): Finding {
  return diskHasRoom(freeBytes, largestBytes);
}

function calibrations(desk: Desk): Finding {
  const now = desk.now();
  const used = desk.rig.calibrations.map(({ calibration }) => calibration);
  const old = used.filter((one) => isOld(one, now));
  const days = (one: (typeof used)[number]) => `${one.name}: ${Math.floor(ageDays(one, now))} days`;
  if (old.length > 0) {
    const detail = `Older than they may be: ${old.map(days).join(', ')}.`;
    return failed(detail, 'Measure again: `lapwing calibrate`, or on the Rig page.');
  }
  if (used.length === 0) {
    return notPossible(
      'The rig file refers to no stored calibration, so nobody knows their age.',
      'Calibrate belt and valve, and put the results in force.',
    );
  }
  return passed(`${used.map(days).join(', ')}.`);
}

async function loopback(desk: Desk): Promise<Finding> {
  const wire = desk.rig.loopback;
  if (wire === undefined) {
    return notPossible(
      'The rig file names no loopback wire.',
      'A wire from a spare mark output to a spare input, and `loopback:` in the rig file, show that outputs truly rise.',
    );
  }
  const line = lineOf(desk, wire.input);
  const output = desk.rig.outputs.find(({ name }) => name === wire.output)!;
  const seenUs: number[] = [];
  const stop = desk.bench.listen((item) => {
    if (item.is === 'edge' && item.line === line && item.level === 1) seenUs.push(item.atUs);
  });
  const riseUs: number[] = [];
  try {
    for (let n = 0; n < WIRE_PULSES; n++) {
      const tried = await pulse(desk, {
        ...{ output: output.name, widthUs: Math.min(2_000, output.longestOnUs), into: 'spout' },
      });
      if (tried.riseUs !== null) riseUs.push(tried.riseUs);
      await gap(desk, output, 20);
    }
    await lookAnew(desk);
  } finally {
    stop();
  }
  const seen = riseUs.filter((us) => seenUs.some((at) => Math.abs(at - us) < WIRE_US)).length;
  const detail = `${seen} of ${WIRE_PULSES} pulses of ${wire.output} seen at ${wire.input}.`;
  if (seen === WIRE_PULSES) return passed(detail);
  return failed(detail, 'Look at the wire, and at the lines that the rig file names.');
}

async function lap(desk: Desk): Promise<Finding> {
  const { belt } = desk.rig;
  if (belt.seam === undefined) {
    return notPossible('The rig file names no seam mark.', 'Check by eye that the belt runs true.');
  }
  const chatter = Math.max(2, CHATTER_CM * belt.countsPerCm);
  await desk.hands?.('speed 60');
  let passes: Pass[] = [];
  await collectEdges(
    desk,
    belt.seam.line,
    (edges) => {
      passes = passesOf(edges, chatter);
      return passes.length >= 2;
    },
    HANDS_US,
  );
  await desk.hands?.('speed off');
  const [first, second] = passes;
  if (first === undefined || second === undefined) {
    return failed(
      `The mark was seen ${passes.length === 1 ? 'once' : 'not at all'}.`,
      'Look at the mark, at the sensor and its distance, and at the line that the rig file names.',
    );
  }
  const way = turnedWay(passes);
  const counts = (second.fromCount - first.fromCount) * way;
  const offCm = counts / belt.countsPerCm - belt.lengthCm;
  const detail = `${counts} counts from mark to mark, ${figures(offCm * 10, 2)} mm off the belt's length.`;
  if ((way === -1) !== belt.reversed) {
    return failed(
      `${detail} Counts went the other way than the rig file says.`,
      'Turn it the way the animal runs; if you did, change `direction` in the rig file or swap the encoder wires.',
    );
  }
  if (Math.abs(offCm) <= belt.seam.warnCm) return passed(detail);
  return failed(detail, 'Look for a slipping encoder wheel or a second mark; calibrate the belt.');
}

async function spout(desk: Desk): Promise<Finding> {
  const { lick } = desk.rig;
  if (lick === undefined) return notPossible('The rig file names no lick sensor.', '');
  await desk.hands?.(`touch ${TOUCHES + 2}`);
  const edges = await collectEdges(
    desk,
    lick.line,
    (some) => contactsOf(some).length >= TOUCHES,
    HANDS_US,
  );
  const contacts = contactsOf(edges);
  const detail = `${contacts.length} contacts.`;
  if (contacts.length >= TOUCHES) return passed(detail);
  return failed(detail, 'Look at the wire to the spout, at the ground, and at the sensor itself.');
}

/** Those that no other check makes change. */
async function inputs(desk: Desk): Promise<Finding> {
  const { rig } = desk;
  const others = rig.inputs.filter(
    ({ name, line }) =>
      line !== rig.lick?.line && line !== rig.belt.seam?.line && name !== rig.loopback?.input,
  );
  if (others.length === 0) return passed('There are no others.');
  const seen = new Set<number>();
  const stop = desk.bench.listen((item) => {
    if (item.is === 'edge') seen.add(item.line);
  });
  const fromUs = desk.bench.now.atUs;
  const missing = () => others.filter(({ line }) => !seen.has(line)).map(({ name }) => name);
  try {
    for (const { line } of others) await desk.hands?.(`tap ${line}`);
    while (missing().length > 0 && desk.bench.now.atUs - fromUs < HANDS_US) await desk.pause(50);
  } finally {
    stop();
  }
  const left = missing();
  if (left.length === 0) return passed(`${others.map(({ name }) => name).join(', ')}.`);
  return failed(
    `Nothing was seen of ${left.join(', ')}.`,
    'Check the wires and the lines in the rig file; an input that this session does not use can be overridden.',
  );
}

async function drops(desk: Desk): Promise<Finding> {
  const output = desk.rig.outputs.find(({ kind }) => kind === 'valve');
  if (output === undefined) return notPossible('The rig file names no valve.', '');
  const { valve } = output;
  if (valve === undefined) {
    return failed(`${output.name} is not calibrated.`, 'Calibrate it: `lapwing calibrate valve`.');
  }
  const middleNl = (valve.leastNl + valve.mostNl) / 2;
  const widthUs = Math.round(valve.deadUs + middleNl * valve.usPerNl);
  await desk.hands?.('vial on');
  for (let n = 0; n < DROPS; n++) {
    await pulse(desk, { output: output.name, widthUs, into: 'spout' });
    await gap(desk, output, DROP_GAP_MS);
  }
  await desk.hands?.('vial off');
  const answer = await desk.ask({
    go: 'Go on',
    fields: [
      {
        ...{ kind: 'choice', name: 'drops', label: `Did ${DROPS} even drops come` },
        ...{ options: ['yes', 'no'], value: 'yes' },
      },
    ],
  });
  const detail = `${DROPS} drops of ${figures(middleNl / 1_000)} uL asked of ${output.name}.`;
  if (textFrom(answer, 'drops') === 'yes') return passed(detail);
  return failed(
    detail,
    'Look for air in the line, an empty bottle, a closed clamp, a stuck valve.',
  );
}
