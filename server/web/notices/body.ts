import type { Setup, Snapshot } from '../../loop/protocol.js';
import type { AlarmLevel } from '../../session/inputs.js';
import { NAME_IN_BRACES, type NoticeName } from '../../session/rig/noticeNames.js';
import type { RigNotify } from '../../session/rig/rig.js';

/** One alarm that was raised or is over. */
export interface Notice {
  readonly alarm: string;
  readonly level: AlarmLevel;
  readonly state: 'raised' | 'cleared';
  readonly text: string;
  readonly remedy: string;
  /** Wall time, RFC 3339. */
  readonly at: string;
}

/** Where the rig was when it was sent. */
export interface Scene {
  readonly rig: string;
  readonly subject: string;
  readonly title: string;
  readonly lap: number;
  readonly phase: string;
}

export function sceneOf(setup: Setup | undefined, state: Snapshot | undefined): Scene {
  return {
    rig: setup?.rig ?? '',
    subject: setup?.session?.subject ?? '',
    title: setup?.session?.title ?? '',
    lap: state?.lap ?? 0,
    phase: state?.phase ?? '',
  };
}

const GRAVE: Record<AlarmLevel, number> = { bad: 0, warn: 1, note: 2 };

/**
 * The body of one request for some notices, the gravest first: the rig file's own with its names
 * filled in, or all there is as JSON.
 */
export function bodyOf(
  notices: readonly Notice[],
  scene: Scene,
  { body, contentType }: Pick<RigNotify, 'body' | 'contentType'>,
): string {
  const sorted = [...notices].sort((a, b) => GRAVE[a.level] - GRAVE[b.level]);
  const [worst] = sorted;
  if (body === undefined) return JSON.stringify({ ...scene, alarms: sorted });
  const all = (of: (notice: Notice) => string): string => sorted.map(of).join('; ');
  const values: Record<NoticeName, string> = {
    ...scene,
    lap: String(scene.lap),
    alarm: all(({ alarm }) => alarm),
    level: worst?.level ?? 'note',
    state: sorted.some(({ state }) => state === 'raised') ? 'raised' : 'cleared',
    text: all(({ text, state }) => (state === 'raised' ? text : `Over: ${text}`)),
    remedy: all(({ remedy, state }) => (state === 'raised' ? remedy : '')).replace(/^(; )+/, ''),
    at: worst?.at ?? '',
    count: String(sorted.length),
  };
  const json = contentType.includes('json');
  return body.replace(NAME_IN_BRACES, (whole, name: string) => {
    const value = values[name as NoticeName];
    if (value === undefined) return whole;
    // Within the quotes that the template has around it.
    return json ? JSON.stringify(value).slice(1, -1) : value;
  });
}
