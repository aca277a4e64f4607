import { median } from '../../analysis/align/robustLine.js';
import { LapwingError } from '../../errors/codes.js';
import {
  backlashCounts,
  fitLaps,
  type LapFit,
  offsetCm,
  scaleOf,
  turnedWay,
} from '../belt/beltFit.js';
import { type MarkEdge, type Pass, passesOf } from '../belt/passes.js';
import {
  type Desk,
  type Draft,
  figures,
  numberField,
  numberFrom,
  type Picture,
  textFrom,
} from './guide.js';
import { collectEdges, lookAnew } from './waiting.js';

/** An edge that comes again within this much belt bounces: as the tracker has it. */
const CHATTER_CM = 0.3;
const BACKS = 3;
/** As a hand turns, cm/s. */
const HAND_CM_PER_S = 60;
/** By eye, under the animal, cm (standard uncertainty): common practice, no source. */
const BY_EYE_CM = 0.2;
const WARN_DAYS = 90;
const TITLE = 'Belt';

/**
 * Turns the belt by hand past its mark: counts a lap, length, direction, play, the mark's width and
 * the offset from sensor to animal.
 */
export async function beltGuide(desk: Desk): Promise<Draft> {
  const { belt } = desk.rig;
  const { seam } = belt;
  if (seam === undefined) {
    throw new LapwingError('calibrateCannot', 'The rig file names no seam mark to count laps by.');
  }
  desk.show({
    title: TITLE,
    text: 'Measure the belt once round with a tape, along the middle of its upper side. Then turn it by hand: no animal on it.',
    done: null,
    pictures: [],
  });
  const wish = await desk.ask({
    go: 'Begin',
    fields: [
      numberField('laps', 'Laps to turn', '', 3, 100, 10),
      numberField('lengthCm', 'Length once round', 'cm', 5, 2_000, belt.lengthCm),
      numberField('lengthErrorMm', 'How well that is known', 'mm', 0.1, 50, 2),
    ],
  });
  const laps = numberFrom(wish, 'laps');
  const lengthCm = numberFrom(wish, 'lengthCm');
  const chatter = Math.max(2, CHATTER_CM * belt.countsPerCm);
  const turned = await turnLaps(desk, seam.line, laps, chatter);
  const { fit } = turned;
  const passes = await turnBack(desk, seam.line, turned, lengthCm, chatter);
  const play = backlashCounts(passes, fit.sign, fit.lapCounts);
  const scale = scaleOf(fit, lengthCm, numberFrom(wish, 'lengthErrorMm') / 10);
  const offset = await placeSeam(desk, passes, fit, scale.countsPerCm);
  const mm = (counts: number) => (10 * counts) / scale.countsPerCm;
  const direction = fit.sign === 1 ? 'forward' : 'reversed';
  const outlying = fit.laps.filter((lap) => lap.outlying).length;
  const difference = scale.countsPerCm / belt.countsPerCm - 1;
  return {
    kind: 'belt',
    of: 'belt',
    warnAfterDays: WARN_DAYS,
    values: {
      lengthCm,
      lapCounts: fit.lapCounts,
      countsPerCm: scale.countsPerCm,
      direction,
      offsetCm: offset.cm,
      backlashMm: mm(median(play)),
      markWidthMm: mm(fit.markCounts),
      lapSdMm: mm(fit.lapSd),
    },
    uncertainty: {
      lengthCm: numberFrom(wish, 'lengthErrorMm') / 10,
      lapCounts: fit.lapCountsError,
      countsPerCm: scale.countsPerCmError,
      ...(offset.measured ? { offsetCm: BY_EYE_CM } : {}),
    },
    method: `${fit.laps.length} laps by hand; median and median absolute deviation; length by tape`,
    measured: { laps: fit.laps, passes, play },
    says: [
      `${figures(fit.lapCounts, 6)} counts a lap, so ${figures(scale.countsPerCm, 5)} counts a cm (standard uncertainty ${figures(scale.countsPerCmError, 2)}).`,
      `Counts ${fit.sign === 1 ? 'rise' : 'fall'} as the animal runs: direction ${direction}.`,
      `Laps differ by ${figures(mm(fit.lapSd), 2)} mm (standard deviation); the mark is ${figures(mm(fit.markCounts), 2)} mm wide.`,
      `Turned back, the mark's edge shows ${figures(mm(median(play)), 2)} mm off: play, less the sensor's own.`,
      offset.measured
        ? `The animal is ${figures(Math.abs(offset.cm), 3)} cm ${offset.cm < 0 ? 'before' : 'beyond'} the seam when the sensor meets the mark.`
        : 'The offset from sensor to animal was kept.',
    ],
    warnings: [
      ...(outlying > 0
        ? [
            `${outlying} of ${fit.laps.length} laps lie out and were left out: look for a missed mark.`,
          ]
        : []),
      ...(mm(fit.lapSd) > 5
        ? ['Laps differ by more than 5 mm: the encoder slips. Clean belt and wheel, then again.']
        : []),
      ...(Math.abs(difference) > 0.01
        ? [
            `The rig file has ${figures(belt.countsPerCm, 5)} counts a cm: ${figures(100 * difference, 2)} % off.`,
          ]
        : []),
    ],
    pictures: [lapPicture(fit)],
    usable: true,
  };
}

interface Turned {
  readonly fit: LapFit;
  readonly passes: readonly Pass[];
}

/** Counts laps as they come, and shows each. */
async function turnLaps(desk: Desk, line: number, laps: number, chatter: number): Promise<Turned> {
  const show = (fit: LapFit | undefined, found: number) =>
    desk.show({
      title: TITLE,
      text: `Turn the belt by hand the way the animal runs, steadily, until ${laps} laps are counted.`,
      done: Math.min(1, found / laps),
      pictures: fit === undefined ? [] : [lapPicture(fit)],
    });
  show(undefined, 0);
  await desk.hands?.(`speed ${HAND_CM_PER_S}`);
  let turned: Turned | undefined;
  await collectEdges(desk, line, (edges) => {
    const passes = passesOf(edges, chatter);
    const fit = fitLaps(passes, turnedWay(passes));
    show(fit, fit?.laps.length ?? 0);
    if (fit === undefined || fit.laps.length < laps) return false;
    turned = { fit, passes };
    return true;
  });
  await desk.hands?.('speed 0');
  return turned!;
}

/** Over the mark and back, so that both ways of meeting its edge are seen. */
async function turnBack(
  desk: Desk,
  line: number,
  { fit, passes }: Turned,
  lengthCm: number,
  chatter: number,
): Promise<Pass[]> {
  const show = (backs: number) =>
    desk.show({
      title: TITLE,
      text: `Now turn it back over the mark and forward over it again, ${BACKS} times.`,
      done: backs / BACKS,
      pictures: [lapPicture(fit)],
    });
  show(0);
  let enough = false;
  const rocking = rock(desk, fit, passes, lengthCm, () => enough);
  let all: Pass[] = [];
  await collectEdges(desk, line, (edges) => {
    all = [...passes, ...passesOf(edges as readonly MarkEdge[], chatter)];
    const backs = backlashCounts(all, fit.sign, fit.lapCounts).length;
    show(Math.min(BACKS, backs));
    enough = backs >= BACKS;
    return enough;
  });
  await rocking;
  return all;
}

/** The simulated rig's hands do it: 4 cm beyond the mark, and 4 cm before it. */
async function rock(
  desk: Desk,
  fit: LapFit,
  passes: readonly Pass[],
  lengthCm: number,
  enough: () => boolean,
): Promise<void> {
  if (desk.hands === undefined) return;
  await lookAnew(desk);
  const perCm = fit.lapCounts / lengthCm;
  const beyond = ((desk.bench.now.count - passes.at(-1)!.fromCount) * fit.sign) / perCm;
  const away = 4;
  await desk.hands(`turn ${-(beyond + away)} ${HAND_CM_PER_S}`);
  await lookAnew(desk);
  while (!enough()) {
    for (const cm of [2 * away, -2 * away]) {
      await desk.hands(`turn ${cm} ${HAND_CM_PER_S}`);
      await lookAnew(desk);
    }
  }
}

/** Where the seam is when it lies under the animal, against where the sensor met the mark. */
async function placeSeam(
  desk: Desk,
  passes: readonly Pass[],
  fit: LapFit,
  countsPerCm: number,
): Promise<{ readonly cm: number; readonly measured: boolean }> {
  const leading = passes.filter((pass) => Math.sign(pass.toCount - pass.fromCount) === fit.sign);
  const from = leading.at(-1)!.fromCount;
  desk.show({
    title: TITLE,
    text: 'Turn the belt on, forwards only, until the seam lies exactly under where the animal stands, and leave it there.',
    done: null,
    pictures: [lapPicture(fit)],
  });
  if (desk.hands !== undefined) {
    await lookAnew(desk);
    const beyond = ((desk.bench.now.count - from) * fit.sign) / countsPerCm;
    await desk.hands(`turn ${fit.lapCounts / countsPerCm - beyond} ${HAND_CM_PER_S}`);
    await lookAnew(desk);
  }
  const answer = await desk.ask({
    go: 'Go on',
    fields: [
      {
        ...{ kind: 'choice', name: 'offset', label: 'Offset from sensor to animal' },
        ...{ options: ['the seam lies under the animal now', 'keep it'] },
        value: 'the seam lies under the animal now',
      },
    ],
  });
  if (textFrom(answer, 'offset') === 'keep it') {
    return { cm: desk.rig.belt.seam?.offsetCm ?? 0, measured: false };
  }
  const turned = (desk.bench.now.count - from) * fit.sign;
  await desk.hands?.('speed off');
  return { cm: offsetCm(turned, fit.lapCounts, countsPerCm), measured: true };
}

function lapPicture(fit: LapFit): Picture {
  return {
    draw: 'laps',
    title: 'Counts of each lap',
    unit: 'counts',
    laps: fit.laps,
    median: fit.lapCounts,
  };
}
