import type { Snapshot } from '../protocol.js';
import type { AlarmName } from './alarms.js';
import type { AlarmMemory } from './memory.js';

/** What the loop knows of its own computer. */
export interface HostHealth {
  /** The longest that the loop was held up within the last minute, milliseconds. */
  readonly stallMs: number;
  /** How far the disk is behind with the record, milliseconds. */
  readonly behindMs: number;
  /** How long board time has stood still, milliseconds of the host's clock. */
  readonly frozenMs: number;
  /** How long the belt has stood still, microseconds of board time. */
  readonly stillUs: number;
  /** How long a valve has been on without a break, beyond the longest that it may, milliseconds. */
  readonly valveOverMs: number;
}

export interface Found {
  readonly alarm: AlarmName;
  readonly text: string;
}

/** A tick is 20 ms: beyond this the computer, and not the loop, was busy. */
const STALL_MS = 100;
/** The board idles its outputs when it hears nothing for so long. */
const SILENCE_MS = 250;
const BEHIND_MS = 2_000;
export const LOW_DISK_GB = 5;
const FULL_DISK_GB = 1;
const STILL_US = 300_000_000;
const UNTOUCHED_DROPS = 3;
const LAPS_WITHOUT_LICK = 3;
const NEAR_LIMIT = 0.9;
const NEAR_END_LAPS = 5;
const NEAR_END_S = 300;

/** Every condition that is worth an alarm now; a pure function of what is shown and remembered. */
export function conditionsOf(state: Snapshot, memory: AlarmMemory, host: HostHealth): Found[] {
  const found: Found[] = [];
  const say = (alarm: AlarmName, when: boolean, text: () => string): void => {
    if (when) found.push({ alarm, text: text() });
  };
  aboutRig(state, memory, host, say);
  if (state.session === 'running') {
    aboutAnimal(state, memory, host, say);
    aboutWater(state, say);
    aboutEnd(state, say);
  }
  return found;
}

type Say = (alarm: AlarmName, when: boolean, text: () => string) => void;

function aboutRig(state: Snapshot, memory: AlarmMemory, host: HostHealth, say: Say): void {
  const { link, record } = state;
  say(
    'link',
    link.state !== 'up',
    () => `The board is not connected: ${link.reason || 'no word yet'}`,
  );
  say(
    'frames',
    link.state === 'up' && host.frozenMs >= 1_000,
    () => 'No frames come from the board',
  );
  say('record', record.state === 'failed', () => `The record failed: ${record.reason}`);
  say('behind', host.behindMs >= BEHIND_MS, () => `The record is ${seconds(host.behindMs)} behind`);
  const free = record.diskFreeGb;
  say(
    'disk full',
    free < FULL_DISK_GB,
    () => `Only ${Math.floor(free * 1000)} MB of disk are free`,
  );
  say(
    'disk',
    free >= FULL_DISK_GB && free < LOW_DISK_GB,
    () => `Only ${free.toFixed(1)} GB of disk are free`,
  );
  const stall = `${Math.round(host.stallMs)} ms`;
  const long = host.stallMs >= SILENCE_MS;
  say(
    'host',
    host.stallMs >= STALL_MS && !long,
    () => `This computer held Lapwing up for ${stall}`,
  );
  say(
    'silence',
    long,
    () => `This computer held Lapwing up for ${stall}, longer than the board waits`,
  );
  say('lick stuck', memory.lickSensor === 'stuck', () => 'The lick sensor is stuck');
  say('lick fast', memory.lickSensor === 'too fast', () => 'Licks come faster than an animal can');
}

function aboutAnimal(state: Snapshot, memory: AlarmMemory, host: HostHealth, say: Say): void {
  const { lap, licks, trust, trustReason } = state;
  const unsure = trust === 'doubtful' || (trust === 'unknown' && lap > 0);
  say('restart', memory.restarted, () => 'The board restarted; stimulation waits for you');
  say('trust', unsure && !state.handOnBelt, () => `Position is ${trust}: ${trustReason}`);
  say('seam', memory.seamMissed, () => 'A seam mark was missed');
  say('no lick', licks === 0 && lap > LAPS_WITHOUT_LICK, () => `No lick in ${lap} laps`);
  const drops = memory.dropsUntouched;
  say('drops', drops >= UNTOUCHED_DROPS, () => `${drops} drops were given and not licked`);
  say(
    'valve empty',
    memory.valve.empty,
    () => 'Drops are not drunk though the animal comes for them',
  );
  say('valve drips', memory.valve.drips(state.boardUs), () => 'Licking goes on without a pause');
  say('valve on', host.valveOverMs > 0, () => 'The valve is on for longer than it may be');
  say('valve silent', memory.valveSilent, () => 'The board does not say what becomes of drops');
  const minutes = Math.floor(host.stillUs / 60_000_000);
  say('still', host.stillUs >= STILL_US, () => `The belt has not moved for ${minutes} min`);
}

function aboutWater(state: Snapshot, say: Say): void {
  const unsure = state.waterUncertainUl;
  const near = (alarm: AlarmName, given: number, limit: number, when: string) => {
    const left = Math.max(0, limit - given);
    const text = () => `${left.toFixed(0)} uL of water are left ${when}`;
    say(alarm, limit > 0 && given >= NEAR_LIMIT * limit, text);
  };
  near('water session', state.waterUl + unsure, state.waterLimitUl, 'in this session');
  near('water day', state.waterTodayUl + unsure, state.waterDayLimitUl, 'today');
  say('unsure', unsure > 0, () => `${unsure.toFixed(1)} uL may or may not have been given`);
}

function aboutEnd({ end }: Snapshot, say: Say): void {
  if (end === null) return;
  const { laps, s, exact, what } = end;
  const near = laps === null ? s !== null && s <= NEAR_END_S : laps <= NEAR_END_LAPS;
  say('end', near, () => `The session ends ${endWords(laps, s, exact)} (${what})`);
}

/** `in 5 laps`, `in about 5 laps, 1 min`, `in 4 min`. */
export function endWords(laps: number | null, s: number | null, exact: boolean): string {
  const inLaps = laps === null ? '' : laps <= 1 ? 'with this lap' : `in ${laps} laps`;
  if (exact) return inLaps;
  const time =
    s === null ? '' : s < 90 ? `${Math.max(0, Math.round(s))} s` : `${Math.round(s / 60)} min`;
  if (laps === null) return `in ${time}`;
  return `${laps <= 1 ? inLaps : `in about ${laps} laps`}${time === '' ? '' : `, ${time}`}`;
}

function seconds(ms: number): string {
  return `${(ms / 1000).toFixed(1)} s`;
}
