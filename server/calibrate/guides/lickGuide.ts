import { LapwingError } from '../../errors/codes.js';
import type { BenchItem } from '../../loop/protocol.js';
import { contactsOf, type LickEdge } from '../lick/contacts.js';
import {
  type EchoRate,
  echoRate,
  fitLicks,
  LEAST_CONTACTS,
  type LickFit,
} from '../lick/lickFit.js';
import {
  type Desk,
  type Draft,
  figures,
  numberField,
  numberFrom,
  type Picture,
  textFrom,
} from './guide.js';
import { gap, pulse } from './waiting.js';

const WARN_DAYS = 30;
const TITLE = 'Lick sensor';
const ECHO_PULSES = 20;
const ECHO_MS = 20;
const SHOW_MS = 250;
const TOUCHES = 20;
const TOUCHES_US = 4_000_000;
/** Settling time after what was tried, before the next. */
const ECHO_GAP_MS = 150;

/** What one input and the outputs did while it was watched, in board time. */
export interface Watched {
  readonly edges: readonly LickEdge[];
  /** Changes of each output, by its name. */
  readonly changesUs: ReadonlyMap<string, readonly number[]>;
  readonly spanUs: number;
}

/** Watches live licking, and what outputs do to the sensor while nobody licks. */
export async function lickGuide(desk: Desk): Promise<Draft> {
  const sensor = sensorOf(desk.rig);
  desk.show({
    title: TITLE,
    text: 'An animal licks at the spout, or a wet finger taps it. Contacts are counted; a few hundred are better than fifty.',
    done: null,
    pictures: [],
  });
  const driven = desk.rig.outputs.filter(({ kind }) => kind !== 'mark').map(({ name }) => name);
  const wish = await desk.ask({
    go: 'Begin',
    fields: [
      numberField('contacts', 'Contacts', '', LEAST_CONTACTS, 5_000, 200),
      numberField('seconds', 'At most', 's', 10, 3_600, 300),
      {
        ...{ kind: 'choice', name: 'echo', label: 'Afterwards, with nobody at the spout, try' },
        ...{ options: ['nothing', ...driven], value: 'nothing' },
      },
    ],
  });
  const contacts = numberFrom(wish, 'contacts');
  const licked = await watchLicks(desk, sensor, contacts, numberFrom(wish, 'seconds'));
  const output = textFrom(wish, 'echo');
  const echoed = output === 'nothing' ? undefined : await watchEcho(desk, sensor, output);
  return lickDraft(desk.rig, licked, echoed);
}

/**
 * What a watched sensor says, from the bench or from a session's record.
 * @throws LapwingError CALIBRATE_CANNOT with fewer contacts than say anything
 */
export function lickDraft(rig: Desk['rig'], licked: Watched, echoed: Watched | undefined): Draft {
  const sensor = sensorOf(rig);
  const contacts = contactsOf(licked.edges);
  if (contacts.length < LEAST_CONTACTS) {
    throw new LapwingError(
      'calibrateCannot',
      `${contacts.length} contacts were seen, and ${LEAST_CONTACTS} are needed to say anything.`,
    );
  }
  const fit = fitLicks(contacts);
  const rates = [licked, ...(echoed === undefined ? [] : [echoed])].flatMap(ratesOf(sensor));
  const bad = rates.filter((rate) => rate.echoes > 3 + 2 * rate.byChance);
  return {
    kind: 'lick',
    of: sensor.name,
    warnAfterDays: WARN_DAYS,
    values: {
      lockoutUs: fit.lockout.us,
      stuckUs: fit.stuck.us,
      lickHz: fit.lickHz,
      contactMedianMs: fit.contactMs.median,
    },
    uncertainty: {},
    method: `${fit.contacts} contacts: ${fit.lockout.because}; ${fit.stuck.because}`,
    measured: { contactMs: fit.contactMs, intervalMs: fit.intervalMs, echoes: rates },
    says: [
      `Lockout ${fit.lockout.us / 1_000} ms: ${fit.lockout.because}.`,
      `Stuck beyond ${fit.stuck.us / 1_000} ms: ${fit.stuck.because}.`,
      `Licks in bouts come at ${figures(fit.lickHz, 2)} a second; half of the contacts last under ${figures(fit.contactMs.median, 2)} ms; ${fit.bounces} bounces.`,
      ...rates.map(echoWords),
    ],
    warnings: bad.map(
      ({ output }) =>
        `${output} echoes in the sensor: part the wires, ground the spout, or lengthen \`artefact\`.`,
    ),
    pictures: lickPictures(fit),
    usable: true,
  };
}

function echoWords({ output, changes, echoes, byChance }: EchoRate): string {
  return `${output}: ${echoes} onsets within the artefact window of ${changes} changes (by chance ${figures(byChance, 2)}).`;
}

interface Sensor {
  readonly name: string;
  readonly line: number;
  readonly artefactUs: number;
}

function sensorOf(rig: Desk['rig']): Sensor {
  const { lick } = rig;
  const name = rig.inputs.find(({ line }) => line === lick?.line)?.name;
  if (lick === undefined || name === undefined) {
    throw new LapwingError('calibrateCannot', 'No input of the rig file has `use: lick`.');
  }
  return { name, line: lick.line, artefactUs: lick.artefactUs };
}

/** Collects what the bench shows of the sensor and the outputs, until stopped. */
function watch(desk: Desk, sensor: Sensor) {
  const edges: LickEdge[] = [];
  const changesUs = new Map<string, number[]>();
  const fromUs = desk.bench.now.atUs;
  const nameOf = (line: number) => desk.rig.outputs.find((one) => one.line === line)?.name ?? '';
  const stop = desk.bench.listen((item: BenchItem) => {
    if (item.is === 'edge' && item.line === sensor.line) edges.push(item);
    if (item.is !== 'output') return;
    const name = nameOf(item.line);
    changesUs.set(name, [...(changesUs.get(name) ?? []), item.atUs]);
  });
  return {
    edges,
    stop: (): Watched => {
      stop();
      return { edges, changesUs, spanUs: desk.bench.now.atUs - fromUs };
    },
  };
}

async function watchLicks(
  desk: Desk,
  sensor: Sensor,
  contacts: number,
  seconds: number,
): Promise<Watched> {
  const watching = watch(desk, sensor);
  const endUs = desk.bench.now.atUs + seconds * 1_000_000;
  let touchedUs = Number.NEGATIVE_INFINITY;
  try {
    for (;;) {
      const found = contactsOf(watching.edges);
      desk.show({
        title: TITLE,
        text: `Let it lick: ${found.length} of ${contacts} contacts.`,
        done: Math.min(1, found.length / contacts),
        pictures: found.length < LEAST_CONTACTS ? [] : lickPictures(fitLicks(found)),
      });
      const nowUs = desk.bench.now.atUs;
      if (found.length >= contacts || nowUs > endUs) return watching.stop();
      if (desk.hands && nowUs - touchedUs > TOUCHES_US) {
        touchedUs = nowUs;
        await desk.hands(`touch ${TOUCHES}`);
      }
      await desk.pause(SHOW_MS);
    }
  } finally {
    watching.stop();
  }
}

async function watchEcho(desk: Desk, sensor: Sensor, name: string): Promise<Watched> {
  const output = desk.rig.outputs.find((one) => one.name === name)!;
  const show = (n: number) =>
    desk.show({
      title: TITLE,
      text: `Nobody at the spout: ${name} is tried ${ECHO_PULSES} times, and the sensor should see nothing.`,
      done: n / ECHO_PULSES,
      pictures: [],
      caution:
        'No animal on the rig, nothing in the way of the light, a vial under the spout, everybody behind the shield that the local rules ask for.',
    });
  show(0);
  await desk.hands?.('speed 0');
  await desk.ask({ go: `Try ${name}`, fields: [] });
  const watching = watch(desk, sensor);
  try {
    for (let n = 1; n <= ECHO_PULSES; n++) {
      const widthUs = Math.min(output.longestOnUs, ECHO_MS * 1_000);
      await pulse(desk, { output: name, widthUs, into: 'vial' });
      show(n);
      await gap(desk, output, ECHO_GAP_MS);
    }
    return watching.stop();
  } finally {
    watching.stop();
    await desk.hands?.('speed off');
  }
}

const ratesOf =
  (sensor: Sensor) =>
  ({ edges, changesUs, spanUs }: Watched): EchoRate[] => {
    const onsets = contactsOf(edges).map(({ fromUs }) => fromUs);
    return [...changesUs].map(([output, at]) =>
      echoRate(output, at, onsets, sensor.artefactUs, spanUs),
    );
  };

function lickPictures(fit: LickFit): Picture[] {
  const { contactMs, intervalMs } = fit;
  return [
    {
      draw: 'histogram',
      title: 'How long contacts last',
      unit: 'ms',
      edges: contactMs.edges,
      counts: contactMs.counts,
      marks: [{ at: fit.stuck.us / 1_000, label: 'stuck' }],
    },
    {
      draw: 'histogram',
      title: 'From one onset to the next',
      unit: 'ms',
      edges: intervalMs.edges,
      counts: intervalMs.counts,
      marks: [{ at: fit.lockout.us / 1_000, label: 'lockout' }],
    },
  ];
}
