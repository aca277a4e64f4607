import type { Group } from 'h5wasm/node';
import { firingsOf } from '../../analysis/firings.js';
import type { SessionData } from '../../analysis/readSession.js';
import { TRUSTS } from '../../analysis/sampleColumns.js';
import { type NwbBuilder, text } from './hdf5.js';

/** Counts as acquired; place, speed, lap and trust as found from them and the mark. */
export function putBelt(
  nb: NwbBuilder,
  acquisition: Group,
  processing: Group,
  session: SessionData,
  progress: (done: number) => void,
): void {
  const { samples: s, beganUs, rig } = session;
  const n = s.length;
  const timestamps = Float64Array.from({ length: n }, (_, i) => (s.boardUs[i]! - beganUs) / 1e6);
  nb.series(acquisition, 'belt_encoder', {
    ...{ data: s.count.slice(0, n), timestamps, unit: 'counts', resolution: 1 },
    description: "The encoder's own count at each sample, signed 32 bits",
    continuity: 'continuous',
  });
  progress(0.4);
  const behavior = nb.group(processing, 'behavior', 'ProcessingModule');
  text(
    behavior,
    'description',
    'Place on the belt and running speed, from the encoder and the mark',
  );
  const timestampsOf = '/acquisition/belt_encoder';
  const position = nb.group(behavior, 'Position', 'Position');
  const place = nb.series(position, 'belt_position', {
    ...{ type: 'SpatialSeries', timestampsOf, unit: 'meters', continuity: 'continuous' },
    data: s.positionCm.slice(0, n).map((cm) => cm / 100),
    description: 'Place along the belt, [0, length); NaN while it is not known',
    resolution: 0.01 / rig.belt.countsPerCm,
  });
  nb.text(place, 'reference_frame', "Metres from the belt's 0 cm, along the running direction");
  progress(0.7);
  const behavioral = nb.group(behavior, 'BehavioralTimeSeries', 'BehavioralTimeSeries');
  nb.series(behavioral, 'speed', {
    ...{ timestampsOf, unit: 'm/s', continuity: 'continuous' },
    data: s.speedCmPerS.slice(0, n).map((cm) => cm / 100),
    description: `Signed speed over the last ${rig.belt.speedWindowUs / 1000} ms`,
  });
  progress(0.9);
  nb.series(behavioral, 'lap', {
    ...{ timestampsOf, unit: 'laps', continuity: 'step', resolution: 1 },
    data: s.lap.slice(0, n),
    description: 'Lap number; 0 before the first mark',
  });
  nb.series(behavioral, 'position_trust', {
    ...{ timestampsOf, unit: 'n/a', continuity: 'step' },
    data: s.trust.slice(0, n),
    description: `How far position is to be trusted: ${TRUSTS.map((t, i) => `${i} ${t}`).join(', ')}`,
  });
}

/** On and off times of each output that is no valve. */
export function putStimuli(nb: NwbBuilder, presentation: Group, session: SessionData): void {
  const { beganUs, rig } = session;
  const firings = firingsOf(session);
  for (const output of rig.outputs) {
    if (output.kind === 'valve') continue;
    const changes = firings
      .filter((f) => f.output === output.name)
      .flatMap(({ spans }) => spans)
      .flatMap(({ fromUs, toUs }) => [
        { us: fromUs, level: 1 },
        { us: toUs, level: 0 },
      ])
      .sort((a, b) => a.us - b.us);
    if (changes.length === 0) continue;
    nb.series(presentation, output.name, {
      ...{ data: Uint8Array.from(changes, (c) => c.level), unit: 'n/a', continuity: 'step' },
      timestamps: Float64Array.from(changes, (c) => (c.us - beganUs) / 1e6),
      description:
        `Output ${output.name} on (1) and off (0). The first rise and the time on are the board's; ` +
        'the pulses of a train between them are as commanded',
    });
  }
}
