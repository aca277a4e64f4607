/**
 * What an experimenter should look at, in words with the remedy. Reckoned on the page from what the
 * loop says; the loop decides nothing by it.
 */
import type { NumberedEvent, Snapshot } from '../../server/loop/protocol.js';
import { fixed } from './format.js';
import { LOW_DISK_GB } from './health.js';

export interface Alarm {
  /** Names the condition: an alarm that was acknowledged comes back only after it had gone. */
  readonly id: string;
  readonly level: 'warn' | 'bad';
  readonly text: string;
  readonly remedy: string;
}

/** What must be remembered from one message to the next. */
export interface AlarmWatch {
  /** Drops given since the last lick. */
  dropsUntouched: number;
  lickSensor: 'stuck' | 'too fast' | undefined;
  /** The lap in which a seam mark was last missed; -1 for never. */
  seamMissedLap: number;
  /** Board time at which the belt was last seen to move. */
  beltMovedUs: number;
  readonly acknowledged: Set<string>;
}

export function newAlarmWatch(): AlarmWatch {
  return {
    dropsUntouched: 0,
    lickSensor: undefined,
    seamMissedLap: -1,
    beltMovedUs: Number.NaN,
    acknowledged: new Set(),
  };
}

/** A new session: what was remembered is of another one. */
export function forgetAlarms(watch: AlarmWatch): void {
  Object.assign(watch, { ...newAlarmWatch(), acknowledged: watch.acknowledged });
  watch.acknowledged.clear();
}

const STILL_CM_PER_S = 1;
const STILL_MIN = 5;
const UNTOUCHED_DROPS = 3;
const LAPS_WITHOUT_LICK = 3;
const NEAR_LIMIT = 0.9;

export function watchEvent(watch: AlarmWatch, event: NumberedEvent['event'], water: boolean): void {
  if (event.kind === 'lick' && !event.artefact) watch.dropsUntouched = 0;
  if (event.kind === 'fired' && water && !event.sham) watch.dropsUntouched++;
  if (event.kind === 'seam' && event.event === 'missed') watch.seamMissedLap = event.lap;
  if (event.kind === 'lick sensor') {
    watch.lickSensor = event.state === 'released' ? undefined : event.state;
  }
}

export function watchState(watch: AlarmWatch, state: Snapshot): void {
  const moving = Math.abs(state.speedCmPerS) >= STILL_CM_PER_S;
  if (moving || Number.isNaN(watch.beltMovedUs) || state.boardUs < watch.beltMovedUs) {
    watch.beltMovedUs = state.boardUs;
  }
}

/** Every alarm that is on now, the worst first; the acknowledged ones are left out. */
export function alarmsOf(watch: AlarmWatch, state: Snapshot | undefined): Alarm[] {
  if (!state) return [];
  const found = [...rigAlarms(watch, state), ...sessionAlarms(watch, state)];
  const on = new Set(found.map((alarm) => alarm.id));
  for (const id of watch.acknowledged) if (!on.has(id)) watch.acknowledged.delete(id);
  return found
    .filter((alarm) => !watch.acknowledged.has(alarm.id))
    .sort((a, b) => Number(b.level === 'bad') - Number(a.level === 'bad'));
}

function rigAlarms(watch: AlarmWatch, state: Snapshot): Alarm[] {
  const alarms: Alarm[] = [];
  const say = (id: string, level: Alarm['level'], text: string, remedy: string) =>
    alarms.push({ id, level, text, remedy });
  const { record } = state;
  if (record.state === 'failed') {
    say(
      'record',
      'bad',
      `The record failed: ${record.reason}`,
      'Make room or mend the disk; stimuli wait.',
    );
  }
  const free = record.diskFreeGb as number | null;
  if (free !== null && free < LOW_DISK_GB) {
    say(
      'disk',
      'warn',
      `Only ${fixed(free, 1)} GB of disk are free`,
      'Move old sessions elsewhere.',
    );
  }
  if (watch.lickSensor === 'stuck') {
    say(
      'lick',
      'bad',
      'The lick sensor is stuck',
      'Dry the spout and its holder, and look at the wire.',
    );
  } else if (watch.lickSensor === 'too fast') {
    say(
      'lick',
      'warn',
      'Licks come faster than an animal can',
      'Look for noise: grounding, a loose wire.',
    );
  }
  return alarms;
}

function sessionAlarms(watch: AlarmWatch, state: Snapshot): Alarm[] {
  if (state.session !== 'running') return [];
  const alarms: Alarm[] = [];
  const say = (id: string, level: Alarm['level'], text: string, remedy: string) =>
    alarms.push({ id, level, text, remedy });
  if (state.trust === 'doubtful') {
    say(
      'trust',
      'warn',
      `Position is doubtful: ${state.trustReason}`,
      'Stimuli wait for the seam mark. Look at belt and sensor.',
    );
  }
  if (watch.seamMissedLap >= 0 && state.lap - watch.seamMissedLap <= 1) {
    say(
      'seam',
      'warn',
      'A seam mark was missed',
      'Look at the seam sensor and the mark on the belt.',
    );
  }
  const { stimulus, water } = state.held;
  const release = 'Release under Steer when ready.';
  if (stimulus !== null && stimulus === water) {
    say('held both', 'warn', `Stimulus and water are held: ${stimulus}`, release);
  } else {
    if (stimulus !== null) say('held stimulus', 'warn', `Stimulus is held: ${stimulus}`, release);
    if (water !== null) say('held water', 'warn', `Water is held: ${water}`, release);
  }
  if (watch.dropsUntouched >= UNTOUCHED_DROPS) {
    say(
      'drops',
      'warn',
      `${watch.dropsUntouched} drops were given and not licked`,
      'Is the spout in reach? Hold the water.',
    );
  }
  if (state.licks === 0 && state.lap > LAPS_WITHOUT_LICK) {
    say('no lick', 'warn', `No lick in ${state.lap} laps`, 'Touch the spout to try the sensor.');
  }
  const stillMin = (state.boardUs - watch.beltMovedUs) / 60e6;
  if (stillMin >= STILL_MIN) {
    say(
      'still',
      'warn',
      `The belt has not moved for ${Math.floor(stillMin)} min`,
      'Look at the animal.',
    );
  }
  return [...alarms, ...waterAlarms(state)];
}

function waterAlarms(state: Snapshot): Alarm[] {
  const alarms: Alarm[] = [];
  const near = (id: string, given: number, limit: number, when: string) => {
    if (limit <= 0 || given < NEAR_LIMIT * limit) return;
    const left = Math.max(0, limit - given);
    alarms.push({
      id,
      level: 'warn',
      text: `${fixed(left, 0)} µL of water are left ${when}`,
      remedy: 'Beyond the limit water is withheld.',
    });
  };
  const unsure = state.waterUncertainUl;
  near('water session', state.waterUl + unsure, state.waterLimitUl, 'in this session');
  near('water day', state.waterTodayUl + unsure, state.waterDayLimitUl, 'today');
  if (unsure > 0) {
    alarms.push({
      id: 'unsure',
      level: 'warn',
      text: `${fixed(unsure, 1)} µL may or may not have been given`,
      remedy: 'They count as given. The record says which drops.',
    });
  }
  return alarms;
}
