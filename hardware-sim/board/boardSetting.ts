import { CAPABILITY, WIRE_TIMES } from '../../server/wire/messages.js';

/** What a board has and is. */
export interface BoardSetting {
  readonly outputs: number;
  readonly inputs: number;
  readonly slots: number;
  /** Places for pulses that start at a time still ahead. */
  readonly waiting: number;
  /** Outcomes kept until reset. */
  readonly outcomesKept: number;
  readonly model: string;
  readonly firmware: number;
  readonly boardId: number;
  readonly capabilities: number;
  /** Boot ids are drawn from it. */
  readonly seed: number;
  /** What the board's clock shows when it is first switched on: for tests of its wrap. */
  readonly startUs: number;
  /** What the encoder shows when it is first switched on: for tests of its wrap. */
  readonly startCount: number;
  /** Inputs that are active when it is first switched on, bit n for input n: no edge is told. */
  readonly startInputs: number;
  /**
   * How often it looks whether there is a sample to send, microseconds. More than the wire's own
   * (WIRE.md) is no real board's: for rehearsing many sessions quickly, beside `Board.look`.
   */
  readonly reportUs: number;
}
export type BoardOptions = Partial<BoardSetting>;

export function settingOf(options: BoardOptions): BoardSetting {
  return {
    outputs: 8,
    inputs: 8,
    slots: 16,
    waiting: 16,
    outcomesKept: 64,
    model: 'simulated',
    firmware: 1,
    boardId: 0,
    capabilities: CAPABILITY.simulated | CAPABILITY.slots | CAPABILITY.sync,
    seed: 1,
    startUs: 0,
    startCount: 0,
    startInputs: 0,
    reportUs: WIRE_TIMES.sampleLeastUs,
    ...options,
  };
}
