/** Everything the page knows, and how each message changes it. Nothing here touches the screen. */
import type { NumberedEvent, Setup, Snapshot } from '../../server/loop/protocol.js';
import type { StampedDecision } from '../../server/session/decisions.js';
import type { StreamMessage } from '../../server/web/streamMessages.js';
import { type Access, noAccess } from './access.js';
import { FiringErrors } from './firingErrors.js';
import { LapStore, MARK, type Mark } from './laps.js';
import { Profile } from './profile.js';
import { type Stop, stopIdle } from './stop.js';
import { SpeedTrace } from './trace.js';

export const EVENTS_KEPT = 200;

export type PredictedField = Extract<StampedDecision, { kind: 'field predicted' }>;

export interface Live {
  access: Access;
  stream: 'opening' | 'open' | 'lost';
  loop: { state: 'up' | 'away'; reason: string; remedy: string } | undefined;
  /** Which life of the loop the events shown are of; empty before any. */
  life: string;
  setup: Setup | undefined;
  state: Snapshot | undefined;
  /** Page time at which board time was last seen to move; NaN before any state. */
  movedAtMs: number;
  /** Page time of the last look, and until when a page that was held up is given grace. */
  awakeMs: number;
  graceUntilMs: number;
  readonly laps: LapStore;
  readonly trace: SpeedTrace;
  readonly profile: Profile;
  readonly errors: FiringErrors;
  /** The newest events that are told in words (licks are only drawn), oldest first. */
  readonly events: NumberedEvent[];
  lastEvent: number;
  /** What the last induction is predicted to leave. */
  field: PredictedField | undefined;
  /** Events that were never sent to this page. */
  unseen: number;
  /** By choice: the lap in which the board was armed by its last change. */
  readonly armedAnew: Map<string, number>;
  stop: Stop;
  /** The answer to the last thing asked. */
  notice:
    | { readonly kind: 'good' | 'bad'; readonly text: string; readonly remedy: string }
    | undefined;
}

export function emptyLive(): Live {
  return {
    access: noAccess,
    stream: 'opening',
    loop: undefined,
    life: '',
    setup: undefined,
    state: undefined,
    movedAtMs: Number.NaN,
    awakeMs: 0,
    graceUntilMs: 0,
    laps: new LapStore(),
    trace: new SpeedTrace(),
    profile: new Profile(),
    errors: new FiringErrors(),
    events: [],
    lastEvent: 0,
    field: undefined,
    unseen: 0,
    armedAnew: new Map(),
    stop: stopIdle,
    notice: undefined,
  };
}

/** Takes one message of the stream; `nowMs` is page time. */
export function take(live: Live, message: StreamMessage, nowMs: number): void {
  switch (message.tell) {
    case 'welcome':
      live.access = { you: message.you, controls: undefined };
      return;
    case 'controls':
      live.access = { ...live.access, controls: message.controls };
      return;
    case 'loop':
      live.loop = { state: message.state, reason: message.reason, remedy: message.remedy };
      // Empty: a web process that has not met the loop yet; what is shown stays, as stale.
      if (message.life !== '' && message.life !== live.life) forgetLife(live, message.life);
      return;
    case 'setup':
      takeSetup(live, message.setup);
      return;
    case 'state':
      takeState(live, message.state, nowMs);
      return;
    case 'events':
      for (const event of message.events) takeEvent(live, event);
      return;
    case 'gap':
      live.unseen += message.to - message.from + 1;
      live.lastEvent = Math.max(live.lastEvent, message.to);
      return;
    default:
      return;
  }
}

function takeSetup(live: Live, setup: Setup): void {
  const before = live.setup?.session;
  const after = setup.session;
  const another =
    before && after && (before.folder !== after.folder || before.startedAt !== after.startedAt);
  if (another) forgetSession(live);
  live.setup = setup;
}

function takeState(live: Live, state: Snapshot, nowMs: number): void {
  if (state.boardUs !== live.state?.boardUs) live.movedAtMs = nowMs;
  live.state = state;
  live.trace.add(state.boardUs, state.speedCmPerS);
  if (state.session !== 'running' || state.positionCm === null) return;
  live.laps.reach(state.lap);
  const lengthCm = live.setup?.beltLengthCm ?? 0;
  if (lengthCm > 0)
    live.profile.addSpeed(state.lap, state.positionCm / lengthCm, state.speedCmPerS);
}

function takeEvent(live: Live, numbered: NumberedEvent): void {
  const { number, event } = numbered;
  // Told already: each is counted once.
  if (number <= live.lastEvent) return;
  if (live.lastEvent > 0 && number > live.lastEvent + 1) {
    live.unseen += number - live.lastEvent - 1;
  }
  live.lastEvent = number;
  if (event.kind === 'session began') forgetSession(live);
  if (event.kind === 'field predicted') live.field = event;
  if (event.kind === 'fired' && event.errorMm !== null) live.errors.add(event.armed, event.errorMm);
  if (event.kind === 'lap began') live.laps.reach(event.lap);
  if (event.kind === 'choice') {
    if (event.state === 'armed anew') live.armedAnew.set(event.name, event.lap);
    else live.armedAnew.delete(event.name);
  }
  // A page that joined late learns the speeds of the laps before from the events' own stamps.
  const lengthCm = live.setup?.beltLengthCm ?? 0;
  if (lengthCm > 0 && event.positionCm !== null) {
    live.profile.addSpeed(event.lap, event.positionCm / lengthCm, event.speedCmPerS);
  }
  const mark = markOf(live, event);
  const at = event.kind === 'fired' ? (event.riseCm ?? event.placeCm) : event.positionCm;
  const positionCm = at ?? event.positionCm;
  if (mark !== undefined && positionCm !== null && event.lap >= 0) {
    live.laps.add(event.lap, positionCm, mark);
    if (mark === MARK.lick && lengthCm > 0) live.profile.addLick(event.lap, positionCm / lengthCm);
  }
  if (event.kind === 'lick') return;
  live.events.push(numbered);
  if (live.events.length > EVENTS_KEPT) live.events.shift();
}

function markOf(live: Live, event: NumberedEvent['event']): Mark | undefined {
  switch (event.kind) {
    case 'lick':
      return event.artefact ? MARK.artefact : MARK.lick;
    case 'missed':
      return MARK.missed;
    case 'withheld':
    case 'refused':
      return MARK.withheld;
    case 'fired': {
      if (event.sham) return MARK.sham;
      // A rule that only notes something, or moves to another phase, drives nothing.
      if (event.output === null) return undefined;
      const kind = outputKind(live, event.output);
      if (kind === 'valve') return MARK.water;
      return kind === 'mark' ? undefined : MARK.stimulus;
    }
    default:
      return undefined;
  }
}

/** What an output is for; undefined when it is not known. */
export function outputKind(live: Live, name: string | null): string | undefined {
  return live.setup?.outputs.find((output) => output.name === name)?.kind;
}

/** The loop's events are told anew from the oldest kept. */
function forgetLife(live: Live, life: string): void {
  live.life = life;
  live.lastEvent = 0;
  live.unseen = 0;
  forgetSession(live);
}

function forgetSession(live: Live): void {
  live.laps.clear();
  live.profile.clear();
  live.errors.clear();
  live.armedAnew.clear();
  live.field = undefined;
  live.events.length = 0;
}
