import type { AlarmLevel } from '../../session/inputs.js';

/** What each alarm is: how grave, what to do, and how long it must last to be raised or cleared. */
export interface AlarmKind {
  readonly level: AlarmLevel;
  readonly remedy: string;
  /** The condition has to last so long before it is raised, milliseconds. */
  readonly lastsMs: number;
  /** It has to be gone so long before it is cleared: what flickers is one alarm, not many. */
  readonly goneMs: number;
}

const kind = (level: AlarmLevel, remedy: string, lastsMs = 0, goneMs = 5_000): AlarmKind => ({
  ...{ level, remedy, lastsMs, goneMs },
});

/**
 * Every alarm of a rig. What is over is cleared by itself; the laps and times are common practice,
 * no source.
 */
export const ALARMS = {
  link: kind(
    'bad',
    'Look at the cable and the power of the board; it is tried again by itself.',
    500,
  ),
  frames: kind(
    'bad',
    'Look at the board; if nothing comes for 250 ms it is connected anew.',
    1_000,
  ),
  restart: kind('bad', 'Look for a loose supply. Then allow stimulation under Steer.'),
  record: kind('bad', 'Make room, or mend the disk. Stimuli are held until you release them.'),
  behind: kind('warn', 'The disk is slow: end copies and backups, and look at its health.', 2_000),
  disk: kind('warn', 'Move old sessions elsewhere.', 0, 30_000),
  'disk full': kind('bad', 'Make room now: a full disk ends stimulation.', 0, 30_000),
  host: kind(
    'warn',
    'End other programs on this computer; look for backups and updates.',
    0,
    30_000,
  ),
  silence: kind('bad', 'The board idled its outputs meanwhile. End other programs now.', 0, 30_000),
  trust: kind('warn', 'Stimuli wait for the seam mark. Look at the belt and its sensor.', 200),
  seam: kind('warn', 'Look at the seam sensor and at the mark on the belt.'),
  'lick stuck': kind('bad', 'Dry the spout and its holder, and look at the wire.'),
  'lick fast': kind('warn', 'Look for noise: grounding, a loose wire.'),
  'no lick': kind('warn', 'Touch the spout to try the sensor.'),
  drops: kind('warn', 'Is the spout in reach? Hold the water until drops are taken.'),
  'valve empty': kind(
    'warn',
    'Look at the reservoir, the tube and the spout; give a drop by hand.',
  ),
  'valve drips': kind(
    'warn',
    'Look at the spout: if it drips, hold the water and clean the valve.',
  ),
  'valve on': kind('bad', 'Close the tap, then look at the valve driver.', 500),
  'valve silent': kind('bad', 'Look at the board. These drops count as given.'),
  still: kind('warn', 'Look at the animal.'),
  'water session': kind(
    'warn',
    'Beyond the limit water is withheld. The protocol decides what is due.',
  ),
  'water day': kind(
    'warn',
    'Beyond the limit water is withheld. The protocol decides what is due.',
  ),
  unsure: kind('warn', 'They count as given. The record says which drops.'),
  end: kind('note', 'Put it off under Session, or let it end.'),
} as const satisfies Record<string, AlarmKind>;

export type AlarmName = keyof typeof ALARMS;

/** An alarm that is on, as pages, notices and the record show it. */
export interface AlarmView {
  readonly alarm: AlarmName;
  readonly level: AlarmLevel;
  readonly text: string;
  readonly remedy: string;
  /** Extended board time at which it was raised, microseconds. */
  readonly sinceUs: number;
  /** Who has seen it, and from where; null: nobody yet. */
  readonly seenBy: null | { readonly who: string; readonly from: string };
}
