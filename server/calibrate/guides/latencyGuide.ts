import { LapwingError } from '../../errors/codes.js';
import type { BenchItem, Tried } from '../../loop/protocol.js';
import type { RigOutput } from '../../session/rig/rig.js';
import { fitLatencies, type LatencyFit, latenessUs } from '../latency/latencyFit.js';
import type { Distribution } from '../statistics/distribution.js';
import { type Desk, type Draft, figures, numberField, numberFrom, type Picture } from './guide.js';
import { gap, lineOf, pulse } from './waiting.js';

const WARN_DAYS = 90;
const TITLE = 'Latency';
const PULSE_US = 2_000;
/** An edge that belongs to a rise comes this soon after it, or a count of clock before. */
const ECHO_US = { before: 200, after: 20_000 } as const;

/** Times the way to the board and back, the computer's stalls, and an output by a loopback wire. */
export async function latencyGuide(desk: Desk): Promise<Draft> {
  const { loopback } = desk.rig;
  const output = markOf(desk);
  const wire =
    loopback === undefined
      ? 'Without a `loopback` wire in the rig file only the way to the board and back is timed.'
      : `A wire leads from ${loopback.output} to ${loopback.input}.`;
  desk.show({
    title: TITLE,
    text: `${output.name} is pulsed, and every frame is timed. ${wire}`,
    done: null,
    pictures: [],
  });
  const wish = await desk.ask({
    go: 'Begin',
    fields: [
      numberField('pulses', 'Pulses', '', 20, 5_000, 200),
      numberField('seconds', 'At least', 's', 2, 3_600, 20),
    ],
  });
  const pulses = numberFrom(wish, 'pulses');
  const endUs = desk.bench.now.atUs + numberFrom(wish, 'seconds') * 1_000_000;
  const wireLine = loopback === undefined ? -1 : lineOf(desk, loopback.input);
  const frames: { boardUs: number; hostUs: number }[] = [];
  const seenUs: number[] = [];
  const stop = desk.bench.listen((item: BenchItem) => {
    if (item.is === 'edge' && item.line === wireLine && item.level === 1) seenUs.push(item.atUs);
    if (item.is !== 'frames') return;
    for (let i = 0; i + 1 < item.us.length; i += 2) {
      frames.push({ boardUs: item.us[i]!, hostUs: item.us[i + 1]! });
    }
  });
  const tried: Tried[] = [];
  const reckon = (): LatencyFit =>
    fitLatencies({
      roundTripUs: tried.flatMap(({ roundTripUs }) => (roundTripUs === null ? [] : [roundTripUs])),
      frameLateUs: latenessUs(frames),
      outputUs: tried.flatMap(({ riseUs }) => echoOf(riseUs, seenUs)),
    });
  const show = (n: number) =>
    desk.show({
      title: TITLE,
      text: `${n} of ${pulses} pulses, ${frames.length} frames.`,
      done: Math.min(n / pulses, 1),
      pictures: n > 0 && n % 50 === 0 ? latencyPictures(reckon()) : [],
    });
  await desk.bench.timeFrames(true);
  try {
    for (let n = 1; n <= pulses; n++) {
      const widthUs = Math.min(PULSE_US, output.longestOnUs);
      tried.push(await pulse(desk, { output: output.name, widthUs, into: 'spout' }));
      show(n);
      await gap(desk, output, 10);
    }
    while (desk.bench.now.atUs < endUs) {
      show(pulses);
      await desk.pause(250);
    }
  } finally {
    stop();
    await desk.bench.timeFrames(false);
  }
  return draftOf(output, reckon(), tried.length);
}

/** The loopback's output, or any mark that the board does not pulse by itself. */
function markOf(desk: Desk): RigOutput {
  const { outputs, loopback, sync } = desk.rig;
  const marks = outputs.filter(({ kind, line }) => kind === 'mark' && line !== sync?.line);
  const found = marks.find(({ name }) => name === loopback?.output) ?? marks[0];
  if (found !== undefined) return found;
  throw new LapwingError(
    'calibrateCannot',
    'The rig file has no output of kind mark, and nothing else may be pulsed some hundred times.',
  );
}

/** The edge that came of a rise, less the rise; nothing where none was seen. */
function echoOf(riseUs: number | null, seenUs: readonly number[]): number[] {
  if (riseUs === null) return [];
  const at = seenUs.find((us) => us >= riseUs - ECHO_US.before && us <= riseUs + ECHO_US.after);
  return at === undefined ? [] : [at - riseUs];
}

function draftOf(output: RigOutput, fit: LatencyFit, pulses: number): Draft {
  const { roundTripUs, frameLateUs, outputUs, stalls } = fit;
  const lost = outputUs === null ? 0 : pulses - outputUs.n;
  return {
    kind: 'latency',
    of: output.name,
    warnAfterDays: WARN_DAYS,
    values: {
      roundTripMedianUs: roundTripUs.median,
      roundTripP99Us: roundTripUs.p99,
      roundTripMostUs: roundTripUs.most,
      frameLateP99Us: frameLateUs.p99,
      frameLateMostUs: frameLateUs.most,
      stalls,
      ...(outputUs === null
        ? {}
        : { outputMedianUs: outputUs.median, outputMostUs: outputUs.most }),
    },
    uncertainty: {},
    method: `${pulses} pulses and ${frameLateUs.n} frames; the board's clock for the output, the computer's for the rest`,
    measured: fit,
    says: [
      `To the board and back: ${words(roundTripUs)}.`,
      `Frames taken late by ${words(frameLateUs)}.`,
      outputUs === null
        ? 'No loopback wire was seen, so true output latency is not known.'
        : `Output to its input by the wire: ${words(outputUs)}.`,
    ],
    warnings: [
      ...(stalls > 0
        ? [
            `${stalls} frames came 150 ms late or more: armed slots end then. Close other programs, and let the computer neither sleep nor save power.`,
          ]
        : []),
      ...(lost > 0 ? [`${lost} of ${pulses} pulses were not seen at the input.`] : []),
    ],
    pictures: latencyPictures(fit),
    usable: false,
  };
}

function words({ median, p99, most }: Distribution): string {
  const us = (value: number) =>
    value >= 10_000 ? `${figures(value / 1_000)} ms` : `${figures(value)} us`;
  return `median ${us(median)}, 99 of 100 within ${us(p99)}, most ${us(most)}`;
}

function latencyPictures({ roundTripUs, frameLateUs, outputUs }: LatencyFit): Picture[] {
  const histogram = (title: string, { edges, counts, median, p99 }: Distribution): Picture => ({
    ...{ draw: 'histogram', title, unit: 'us', edges, counts },
    marks: [
      { at: median, label: 'median' },
      { at: p99, label: '99 %' },
    ],
  });
  return [
    histogram('To the board and back', roundTripUs),
    histogram('How late frames were taken', frameLateUs),
    ...(outputUs === null ? [] : [histogram('Output to input by the wire', outputUs)]),
  ];
}
