import type { BeltConfig } from '../../server/track/beltConfig.js';
import type { TrackEvent } from '../../server/track/events.js';
import { blankInstant, Tracker } from '../../server/track/tracker.js';
import type { Edge, Sample } from '../../server/wire/messages.js';
import { BeltModel, type BeltModelOptions } from './beltModel.js';

export const LICK = 0;
export const SEAM = 1;

/** 180 cm at 20 counts a centimetre: one millimetre is two counts. */
export const BELT: BeltConfig = {
  lengthCm: 180,
  countsPerCm: 20,
  direction: 1,
  seam: { input: SEAM, offsetCm: 0 },
  lick: { input: LICK },
};
export const LAP = 3600;

/** A model belt with a tracker at the other end of its wire. */
export class TrackedBelt {
  readonly tracker: Tracker;
  readonly belt: BeltModel;
  readonly instant = blankInstant();
  readonly events: TrackEvent[] = [];
  /** Licks seen in instants. */
  licks = 0;
  /** Set to lose frames on the way. */
  lose: (kind: 'sample' | 'edge', message: Sample | Edge) => boolean = () => false;
  /** Called after every instant. */
  after: () => void = () => {};

  constructor(config: Partial<BeltConfig> = {}, model: Partial<BeltModelOptions> = {}) {
    const full = { ...BELT, ...config };
    this.tracker = new Tracker(full, { tracked: (event) => this.events.push(event) });
    this.belt = new BeltModel(
      { lapCounts: this.tracker.lapCounts, direction: full.direction, seamInput: SEAM, ...model },
      (kind, message) => {
        if (this.lose(kind, message)) return;
        if (kind === 'sample') this.tracker.sample(message as Sample, this.instant);
        else this.tracker.edge(message as Edge, this.instant);
        if (this.instant.lick) this.licks++;
        this.after();
      },
    );
  }

  /** Seam events so far, each as `event` or `event slip`. */
  get seams(): string[] {
    return this.events.flatMap((event) => {
      if (event.kind !== 'seam') return [];
      return event.slipMm === null
        ? [event.event]
        : [`${event.event} ${Math.round(event.slipMm * 10) / 10}`];
    });
  }

  get laps(): number[] {
    return this.events.flatMap((event) => (event.kind === 'lap began' ? [event.lap] : []));
  }

  /** What the lick sensor told: `lick`, `artefact`, or its state. */
  get touches(): string[] {
    return this.events.flatMap((event) => {
      if (event.kind === 'lick') return [event.artefact ? 'artefact' : 'lick'];
      return event.kind === 'lick sensor' ? [event.state] : [];
    });
  }

  /** Runs to the first mark and `cm` beyond it. */
  begin(cm = 0): this {
    this.belt.sample();
    this.belt.run(-this.belt.belt + cm * 20, 4);
    return this;
  }
}
