import type { Logger } from 'pino';
import type { BoardLink } from '../link/boardLink.js';
import type { Rig } from '../session/rig/rig.js';
import { ALARMS } from './alarms/alarms.js';
import { AlarmWatch } from './alarms/alarmWatch.js';
import { StallWatch } from './alarms/stallWatch.js';
import type { Snapshot } from './protocol.js';
import type { Sessions } from './sessions.js';

/** How often the loop minds what no frame brings up. */
export const TICK_MS = 20;
const LOOK_MS = 250;

/** What the loop minds by the clock, whether or not frames come: stalls, alarms, the frame rate. */
export class Minder {
  readonly alarms: AlarmWatch;
  readonly stalls = new StallWatch(TICK_MS);
  readonly #link: BoardLink;
  readonly #log: Logger;
  #lookedMs = 0;
  #framesBefore = 0;
  #framesAtMs = performance.now();
  #framesPerS = 0;

  constructor(rig: Rig, link: BoardLink, log: Logger) {
    this.alarms = new AlarmWatch(rig);
    this.#link = link;
    this.#log = log;
  }

  /** Over the last second or so. */
  get framesPerS(): number {
    return this.#framesPerS;
  }

  tick(sessions: Sessions, snapshot: () => Snapshot): void {
    const nowMs = performance.now();
    sessions.tick(nowMs);
    this.#look(sessions, snapshot, nowMs);
    const seconds = (nowMs - this.#framesAtMs) / 1000;
    if (seconds < 1) return;
    const { frames } = this.#link.counters;
    this.#framesPerS = (frames - this.#framesBefore) / seconds;
    this.#framesBefore = frames;
    this.#framesAtMs = nowMs;
  }

  /** How long this computer held the loop up; and, now and then, every alarm. */
  #look(sessions: Sessions, snapshot: () => Snapshot, nowMs: number): void {
    this.stalls.tick(nowMs);
    if (nowMs - this.#lookedMs < LOOK_MS) return;
    this.#lookedMs = nowMs;
    const behindMs = sessions.record.recorder?.behindMs ?? 0;
    const measured = { stallMs: this.stalls.worstMs, behindMs };
    const changes = this.alarms.look(snapshot(), measured, nowMs);
    for (const { alarm, raised, text } of changes) {
      const { level, remedy } = ALARMS[alarm];
      this.#log.warn({ alarm }, `${raised ? 'alarm' : 'alarm over'}: ${text}`);
      if (sessions.session !== undefined) {
        sessions.take({ kind: 'alarm', alarm, raised, level, text, remedy });
      }
    }
    if (changes.length > 0) sessions.batchEnd();
  }
}
