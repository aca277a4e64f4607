import type { FieldPrediction } from '../../plasticity/fieldPrediction.js';
import type { OutputOrder } from '../instant.js';
import type { ActionSpec, RuleSpec } from './program.js';
import type { RowTracker } from './reachTracker.js';
import type { StretchStamp } from './tally.js';

/** A firing that was agreed to and whose outcome the board has not told. */
export interface PendingFiring {
  readonly serial: number;
  readonly at: StretchStamp;
  readonly sham: boolean;
  /** When the rule had fired before, should this one turn out not to have been. */
  beforeUs: number;
  beforeLap: number;
  /** Per draw that this firing renews: the index and value it used. */
  readonly used: readonly UsedDraw[];
  readonly usedChance: boolean;
}
export interface UsedDraw {
  readonly draw: number;
  readonly index: number;
  readonly value: number;
  readonly option: number;
}

/** A slot that was asked for and not yet accounted for. */
export interface OutstandingSlot {
  readonly serial: number;
  readonly placeTravel: number;
  /** The animal was seen to cross the place; board time of the crossing, else NaN. */
  crossedUs: number;
  /** Whether `if` held on the last frame before that crossing. */
  heldAtCrossing: boolean;
  /** Armed since the operator asked for it: no chance was thrown. */
  readonly byHand: boolean;
}

/** What one rule remembers. */
export class RuleState {
  /** Moments of this instant that wait to be asked: cause and place. */
  readonly causes: number[] = [];
  readonly causePlaces: number[] = [];
  readonly causeSerials: number[] = [];
  /** Running delays of an `after`, soonest first, and the firing that began each (0: none). */
  readonly timers: number[] = [];
  readonly timerSerials: number[] = [];
  /** For `every` and tables of times: when it is next due. */
  nextUs = Number.POSITIVE_INFINITY;
  everyFromUs = 0;
  timeRow = 0;
  /** For a condition as moment. */
  wasTrue = false;
  trueSinceUs = 0;
  lastingDone = false;

  serial = 0;
  lastUs = Number.NEGATIVE_INFINITY;
  lastLap = Number.NEGATIVE_INFINITY;
  chanceIndex = 0;
  /** The chance at `chanceKnown`, kept since a rule that is armed asks it every frame. */
  chanceKnown = -1;
  chanceUp = false;
  readonly pending: PendingFiring[] = [];

  /** The field that its last firing is predicted to leave, and the cell that it was in. */
  field: FieldPrediction | undefined;
  fieldCell = -1;

  /** Arming: the slot now wanted, and every slot not yet accounted for. */
  wantedSerial = 0;
  /** Where its place lies ahead, as last looked up. */
  targetTravel = Number.POSITIVE_INFINITY;
  wantedTravel = Number.NaN;
  wantedOrders: readonly OutputOrder[] = [];
  /** The version of phases, draws and choices under which those orders were last right. */
  wantedVersion = -1;
  retryUs = Number.NEGATIVE_INFINITY;
  readonly slots: OutstandingSlot[] = [];
  /** What `if` was at the end of the last frame, and which frame that was. */
  heldFrame = -1;
  held = false;
  /** The place at which the board fired before the crossing was seen here. */
  firedTravel = Number.NaN;

  /** The laps in which the operator has asked for it; none while `askedTo` is the lesser. */
  askedFrom = 0;
  askedTo = -1;
  /** Asked for at once, and when; NaN otherwise. */
  askedUs = Number.NaN;

  withheld = 0;
  missed = 0;

  constructor(
    readonly spec: RuleSpec,
    readonly rows: RowTracker | undefined,
  ) {}

  /** The operator has asked for it in this lap: its `if` and `chance` are taken as true. */
  isAsked(lap: number): boolean {
    return lap >= this.askedFrom && lap <= this.askedTo;
  }
}

/** An action that waits for its delay. */
export interface DelayedAction {
  readonly dueUs: number;
  readonly rule: number;
  readonly serial: number;
  readonly action: ActionSpec;
  readonly sham: boolean;
}

/** An output that a `while` may end. */
export interface Held {
  readonly output: number;
  readonly rule: number;
  readonly serial: number;
  readonly during: NonNullable<(ActionSpec & { kind: 'order' })['during']>;
}
