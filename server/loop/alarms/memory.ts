import type { StampedDecision } from '../../session/decisions.js';
import { ValveWatch } from './valveWatch.js';

/** Ids of the valve in a row that the board never accounted for. */
const SILENT_DROPS = 3;

/** What alarms must remember of a session's decisions from one look to the next. */
export class AlarmMemory {
  /** Drops given since the last lick. */
  dropsUntouched = 0;
  lickSensor: 'stuck' | 'too fast' | undefined;
  seamMissed = false;
  /** The board restarted in this session, and nobody has allowed stimulation since. */
  restarted = false;
  valve = new ValveWatch();
  #silentDrops = 0;
  readonly #kindOf: (output: string) => string | undefined;
  readonly #gives: (rule: string) => boolean;

  /**
   * @param kindOf what an output is for: `valve`, `stimulus`, `mark`
   * @param gives whether a rule gives water
   */
  constructor(kindOf: (output: string) => string | undefined, gives: (rule: string) => boolean) {
    this.#kindOf = kindOf;
    this.#gives = gives;
  }

  get valveSilent(): boolean {
    return this.#silentDrops >= SILENT_DROPS;
  }

  hear(decision: StampedDecision): void {
    switch (decision.kind) {
      case 'lick':
        if (decision.artefact) return;
        this.dropsUntouched = 0;
        this.valve.lick(decision.boardUs);
        return;
      case 'lick sensor':
        this.lickSensor = decision.state === 'released' ? undefined : decision.state;
        return;
      case 'seam':
        this.seamMissed = decision.event === 'missed';
        return;
      case 'fired':
        if (decision.output === null || this.#kindOf(decision.output) !== 'valve') return;
        this.dropsUntouched++;
        this.#silentDrops = 0;
        this.valve.drop(decision.riseUs ?? decision.boardUs);
        return;
      case 'uncertain':
        if (this.#gives(decision.rule)) this.#silentDrops++;
        return;
      case 'link':
        if (decision.state === 'up' && decision.reason !== '') this.restarted = true;
        return;
      case 'operator':
        if (decision.act.act === 'allow stimulation') this.restarted = false;
        return;
    }
  }
}
