import { LapwingError } from '../../errors/codes.js';
import type { RigOutput } from '../../session/rig/rig.js';
import { mean } from '../statistics/straightLine.js';
import {
  ALARM_PERCENT,
  checkValve,
  fitValve,
  NoLine,
  type ValveFit,
  type Weighing,
} from '../valve/valveFit.js';
import { ROOM_C } from '../valve/water.js';
import {
  type Answers,
  type Desk,
  type Draft,
  figures,
  numberField,
  numberFrom,
  textFrom,
} from './guide.js';
import { gap, pulse } from './waiting.js';

const WARN_DAYS = 30;
/** A check of one point is due every week. */
const CHECK_DAYS = 7;
/** Open times where nothing is known of a valve, ms: common practice, no source. */
const USUAL_MS = [15, 30, 60, 100];
/** From the end of one drop to the next, ms. */
const GAP_MS = 100;
const CAUTION =
  'No animal on the rig: the valve opens hundreds of times. Put a dry vial under the spout.';

/** Opens a valve for a few times, weighs what came, and draws its line. */
export async function valveGuide(desk: Desk, name: string): Promise<Draft> {
  const output = valveOf(desk, name);
  const title = `Valve ${name}`;
  const text =
    'A few open times, a hundred drops each, weighed on a balance that shows tenths of a milligram. Flush the line first, until no air comes.';
  desk.show({ title, text, done: null, pictures: [], caution: CAUTION });
  const wish = await desk.ask({
    go: 'The vial is there: begin',
    fields: [
      {
        ...{ kind: 'text', name: 'times', label: 'Open times, ms, three or more' },
        value: offeredTimes(output).join(' '),
      },
      numberField('drops', 'Drops of each', '', 5, 1_000, 100),
      numberField('repeats', 'Weighings of each', '', 1, 5, 1),
      ...temperature,
    ],
  });
  const timesMs = openTimes(textFrom(wish, 'times'), output);
  const weighings: Weighing[] = [];
  await desk.hands?.('vial on');
  const runs = Array.from({ length: numberFrom(wish, 'repeats') }, () => timesMs).flat();
  for (const [n, ms] of runs.entries()) {
    const shown = { title, pictures: pointPictures(weighings, numberFrom(wish, 'celsius')) };
    weighings.push(await weigh(desk, output, ms, wish, { ...shown, from: n, of: runs.length }));
  }
  await desk.hands?.('vial off');
  const celsius = numberFrom(wish, 'celsius');
  let fit: ValveFit;
  try {
    fit = fitValve(weighings, celsius);
  } catch (error) {
    if (!(error instanceof NoLine)) throw error;
    throw new LapwingError('calibrateNoLine', `${name}: ${error.message}.`);
  }
  return draftOf(output, fit, celsius);
}

/** One open time against the calibration in force: the weekly check. */
export async function valveCheckGuide(desk: Desk, name: string): Promise<Draft> {
  const output = valveOf(desk, name);
  const { valve } = output;
  if (valve === undefined) {
    throw new LapwingError('calibrateCannot', `\`${name}\` has no calibration to be checked yet.`);
  }
  const middleNl = (valve.leastNl + valve.mostNl) / 2;
  const ms = (valve.deadUs + middleNl * valve.usPerNl) / 1_000;
  const title = `Weekly check of ${name}`;
  const text = `A hundred drops of ${figures(middleNl / 1_000)} uL, weighed: are they still what the calibration says?`;
  desk.show({ title, text, done: null, pictures: [], caution: CAUTION });
  const wish = await desk.ask({
    go: 'The vial is there: begin',
    fields: [numberField('drops', 'Drops', '', 5, 1_000, 100), ...temperature],
  });
  await desk.hands?.('vial on');
  const weighing = await weigh(desk, output, ms, wish, { title, pictures: [], from: 0, of: 1 });
  await desk.hands?.('vial off');
  const found = checkValve(weighing, numberFrom(wish, 'celsius'), valve);
  const off = `${found.offPercent >= 0 ? '+' : ''}${figures(found.offPercent, 2)} %`;
  return {
    kind: 'valve check',
    of: name,
    warnAfterDays: CHECK_DAYS,
    values: {
      openUs: weighing.openUs,
      expectedNl: found.expectedNl,
      foundNl: found.foundNl,
      offPercent: found.offPercent,
      verdict: found.verdict,
    },
    uncertainty: {},
    method: `${weighing.drops} drops weighed against the calibration in force`,
    measured: weighing,
    says: [
      `Drops of ${figures(found.foundNl / 1_000)} uL where ${figures(found.expectedNl / 1_000)} uL are expected: ${off}.`,
    ],
    warnings:
      found.verdict === 'alarm'
        ? [
            'More than 10 % off: calibrate the valve anew before the next animal. Look for air, a leak, a worn seat, another height of the bottle.',
          ]
        : found.verdict === 'warn'
          ? ['More than 5 % off: look for air in the line, and check again tomorrow.']
          : [],
    pictures: [],
    usable: false,
  };
}

const temperature = [
  numberField('celsius', 'Temperature of the water', 'C', ROOM_C.least, ROOM_C.most, 21),
] as const;

function valveOf(desk: Desk, name: string): RigOutput {
  const output = desk.rig.outputs.find((one) => one.name === name);
  if (output?.kind === 'valve') return output;
  const valves = desk.rig.outputs.filter(({ kind }) => kind === 'valve').map((one) => one.name);
  throw new LapwingError(
    'calibrateCannot',
    `\`${name}\` is no valve of this rig: there is ${valves.join(', ') || 'none'}.`,
  );
}

/** Over the range in force, or what is usual; never longer than the output may be on. */
function offeredTimes({ valve, longestOnUs }: RigOutput): number[] {
  const longestMs = Math.floor(longestOnUs / 1_000);
  if (valve === undefined) return USUAL_MS.filter((ms) => ms <= longestMs);
  return [0, 1, 2, 3].map((n) => {
    const nl = valve.leastNl + ((valve.mostNl - valve.leastNl) * n) / 3;
    return Math.min(longestMs, Math.round((valve.deadUs + nl * valve.usPerNl) / 1_000));
  });
}

function openTimes(text: string, output: RigOutput): number[] {
  const times = text.split(/[\s,;]+/).filter((word) => word !== '');
  const ms = times.map(Number);
  const longestMs = output.longestOnUs / 1_000;
  const bad = times.find((_, i) => !(ms[i]! > 0 && ms[i]! <= longestMs));
  if (bad !== undefined) {
    throw new LapwingError(
      'calibrateAnswer',
      `open time \`${bad}\`: expected ms up to ${longestMs}, the longest that ${output.name} may be on.`,
    );
  }
  if (new Set(ms.map(Math.round)).size < 3) {
    throw new LapwingError('calibrateAnswer', 'Expected three open times that differ, or more.');
  }
  return ms;
}

/** Drops of one open time into the vial, then what the balance shows. */
async function weigh(
  desk: Desk,
  output: RigOutput,
  ms: number,
  wish: Answers,
  shown: Pick<Parameters<Desk['show']>[0], 'title' | 'pictures'> & { from: number; of: number },
): Promise<Weighing> {
  const drops = numberFrom(wish, 'drops');
  const { title, pictures, from, of } = shown;
  const show = (text: string, n: number) =>
    desk.show({ title, text, done: (from + n / drops) / of, pictures, caution: CAUTION });
  show(`Put the empty vial on the balance, set it to zero, and put it under the spout.`, 0);
  await desk.hands?.('vial on');
  await desk.ask({ go: 'It is there', fields: [] });
  const openUs: number[] = [];
  for (let n = 1; n <= drops; n++) {
    const widthUs = Math.round(ms * 1_000);
    const tried = await pulse(desk, { output: output.name, widthUs, into: 'vial' });
    openUs.push(tried.onUs);
    show(`${figures(ms)} ms open: drop ${n} of ${drops}.`, n);
    await gap(desk, output, GAP_MS);
  }
  const balance = await desk.hands?.('weigh');
  show(`Weigh the vial: what do ${drops} drops of ${figures(ms)} ms weigh?`, drops);
  const answer = await desk.ask({
    go: 'Weighed',
    fields: [
      {
        ...{ kind: 'number', name: 'massMg', label: 'On the balance', unit: 'mg', least: 0.1 },
        ...{ most: 1_000_000 },
        ...(balance === undefined ? {} : { value: Number(balance.mg) }),
      },
    ],
  });
  return { openUs: mean(openUs), drops, massMg: numberFrom(answer, 'massMg') };
}

function pointPictures(weighings: readonly Weighing[], celsius: number) {
  try {
    return [linePicture(fitValve(weighings, celsius))];
  } catch {
    // Too few points for a line yet.
    return [];
  }
}

function linePicture(fit: ValveFit) {
  return {
    draw: 'line',
    title: 'Volume of a drop against open time',
    xUnit: 'ms',
    yUnit: 'uL',
    points: fit.points.map((point) => ({
      x: point.openUs / 1_000,
      y: point.dropNl / 1_000,
      residual: point.residualNl / 1_000,
      band: point.bandNl / 1_000,
    })),
    offset: fit.line.offset / 1_000,
    slope: fit.line.slope,
  } as const;
}

function draftOf(output: RigOutput, fit: ValveFit, celsius: number): Draft {
  const { deadUs, usPerNl, leastNl, mostNl, scatterPercent, repeatPercent } = fit;
  const before = output.valve;
  const middleNl = (leastNl + mostNl) / 2;
  // What the calibration in force says of the time that now gives the middle of the range.
  const beforeNl = before && (deadUs + middleNl * usPerNl - before.deadUs) / before.usPerNl;
  const changedPercent = beforeNl === undefined ? 0 : 100 * (middleNl / beforeNl - 1);
  const says = [
    `A drop of v uL takes ${figures(deadUs / 1_000)} ms and ${figures(usPerNl)} ms a uL (standard uncertainty ${figures(fit.deadErrorUs / 1_000, 2)} ms and ${figures(fit.usPerNlError, 2)} ms a uL).`,
    `Measured from ${figures(leastNl / 1_000)} to ${figures(mostNl / 1_000)} uL: volumes outside are refused.`,
    `Points lie ${figures(scatterPercent, 2)} % off the line (standard deviation over the mean).`,
  ];
  if (repeatPercent !== null) {
    says.push(`Coefficient of variation between weighings: ${figures(repeatPercent, 2)} %.`);
  }
  const warnings: string[] = [];
  if (scatterPercent > 5) {
    warnings.push('Points lie more than 5 % off the line: look for air in the line, then again.');
  }
  if (Math.abs(changedPercent) > ALARM_PERCENT) {
    warnings.push(
      `Drops are ${figures(changedPercent, 2)} % off what the calibration in force says: animals were given that much more or less.`,
    );
  }
  return {
    kind: 'valve',
    of: output.name,
    warnAfterDays: WARN_DAYS,
    values: {
      ...{ deadUs, usPerNl, leastNl, mostNl, scatterPercent },
      ...(repeatPercent === null ? {} : { repeatPercent }),
      celsius,
    },
    uncertainty: { deadUs: fit.deadErrorUs, usPerNl: fit.usPerNlError },
    method:
      'weighed drops; density by Tanaka and others 2001, buoyancy by ISO 8655-6; least squares of volume on open time',
    measured: fit.points,
    says,
    warnings,
    pictures: [linePicture(fit)],
    usable: true,
  };
}
