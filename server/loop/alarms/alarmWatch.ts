import type { StampedDecision } from '../../session/decisions.js';
import type { Actor } from '../../session/inputs.js';
import type { Rig } from '../../session/rig/rig.js';
import type { Snapshot } from '../protocol.js';
import { ALARMS, type AlarmName, type AlarmView } from './alarms.js';
import { conditionsOf, type HostHealth } from './conditions.js';
import { AlarmMemory } from './memory.js';

/** What a look changed: to be told and recorded. */
export interface AlarmChange {
  readonly alarm: AlarmName;
  readonly raised: boolean;
  readonly text: string;
}

interface Following {
  /** Since when the condition holds, or has been gone; the host's clock, milliseconds. */
  sinceMs: number;
  holds: boolean;
  on: AlarmView | undefined;
}

/** What of the host the loop measures by itself; the rest is reckoned here from state to state. */
export type Measured = Pick<HostHealth, 'stallMs' | 'behindMs'>;

const STILL_CM_PER_S = 1;

/**
 * Judges, a few times a second, what is wrong with rig and session. Decides nothing: the loop
 * records what is raised and cleared, and pages and notices show it. A condition has to last to be
 * raised and to be gone for a while to be cleared, so that what flickers is one alarm.
 */
export class AlarmWatch {
  readonly #rig: Rig;
  #memory: AlarmMemory;
  /** Rules that have asked for the valve; learned from what fired. */
  #waterRules = new Set<string>();
  readonly #following = new Map<AlarmName, Following>();
  #boardUs = Number.NaN;
  #movedMs = Number.NaN;
  #beltMovedUs = Number.NaN;
  #valveOnMs = Number.NaN;

  constructor(rig: Rig) {
    this.#rig = rig;
    this.#memory = this.#newMemory();
  }

  /** The alarms that are on, the gravest first. */
  get on(): AlarmView[] {
    const grave = { bad: 0, warn: 1, note: 2 };
    return [...this.#following.values()]
      .flatMap(({ on }) => on ?? [])
      .sort((a, b) => grave[a.level] - grave[b.level] || a.sinceUs - b.sinceUs);
  }

  /** Every decision of the session, a resumed one's from its record included. */
  hear(decision: StampedDecision): void {
    if (decision.kind === 'session began') this.#forget();
    if (decision.kind === 'fired' && this.#kindOf(decision.output) === 'valve') {
      this.#waterRules.add(decision.rule);
    }
    this.#memory.hear(decision);
    if (decision.kind === 'alarm') this.#recorded(decision);
    if (decision.kind === 'operator' && decision.act.act === 'acknowledge') {
      this.#seen(decision.act.alarm, decision);
    }
  }

  /**
   * Looks at the state now.
   * @param nowMs the host's monotonic clock
   * @returns what was raised and cleared by it
   */
  look(state: Snapshot, measured: Measured, nowMs: number): AlarmChange[] {
    const host = { ...measured, ...this.#follow(state, nowMs) };
    const found = new Map(
      conditionsOf(state, this.#memory, host).map((one) => [one.alarm, one.text]),
    );
    const changes: AlarmChange[] = [];
    for (const alarm of Object.keys(ALARMS) as AlarmName[]) {
      const change = this.#judge(alarm, found.get(alarm), state.boardUs, nowMs);
      if (change !== undefined) changes.push(change);
    }
    return changes;
  }

  #judge(
    alarm: AlarmName,
    text: string | undefined,
    boardUs: number,
    nowMs: number,
  ): AlarmChange | undefined {
    const holds = text !== undefined;
    let one = this.#following.get(alarm);
    if (one === undefined) {
      if (!holds) return undefined;
      one = { sinceMs: nowMs, holds, on: undefined };
      this.#following.set(alarm, one);
    }
    if (one.holds !== holds) {
      one.holds = holds;
      one.sinceMs = nowMs;
    }
    const { level, remedy, lastsMs, goneMs } = ALARMS[alarm];
    const forMs = nowMs - one.sinceMs;
    if (holds && one.on !== undefined) one.on = { ...one.on, text };
    else if (holds && forMs >= lastsMs) {
      one.on = { alarm, level, text, remedy, sinceUs: boardUs, seenBy: null };
      return { alarm, raised: true, text };
    } else if (!holds && (one.on === undefined || forMs >= goneMs)) {
      this.#following.delete(alarm);
      if (one.on !== undefined) return { alarm, raised: false, text: one.on.text };
    }
    return undefined;
  }

  /** What a restarted loop finds in its record: an alarm that was on is still on, until it is gone. */
  #recorded({ alarm, state, text, boardUs }: Extract<StampedDecision, { kind: 'alarm' }>): void {
    const name = alarm as AlarmName;
    if (!(name in ALARMS)) return;
    if (state === 'cleared') {
      this.#following.delete(name);
      return;
    }
    if (this.#following.get(name)?.on !== undefined) return;
    const { level, remedy } = ALARMS[name];
    const on: AlarmView = { alarm: name, level, text, remedy, sinceUs: boardUs, seenBy: null };
    this.#following.set(name, { sinceMs: Number.NEGATIVE_INFINITY, holds: true, on });
  }

  #seen(alarm: string, { who, from }: Actor): void {
    for (const one of this.#following.values()) {
      if (one.on === undefined || one.on.seenBy !== null) continue;
      if (alarm === 'all' || alarm === one.on.alarm) one.on = { ...one.on, seenBy: { who, from } };
    }
  }

  #follow(state: Snapshot, nowMs: number): Omit<HostHealth, keyof Measured> {
    const { boardUs, speedCmPerS, handOnBelt } = state;
    if (boardUs !== this.#boardUs) this.#movedMs = nowMs;
    // A board that restarted counts from the start again.
    const back = boardUs < this.#boardUs;
    this.#boardUs = boardUs;
    const moves = speedCmPerS >= STILL_CM_PER_S || speedCmPerS <= -STILL_CM_PER_S;
    const idle = state.session !== 'running' || handOnBelt;
    if (moves || back || idle || Number.isNaN(this.#beltMovedUs)) this.#beltMovedUs = boardUs;
    const valves = this.#rig.outputs.flatMap((output, n) => (output.kind === 'valve' ? [n] : []));
    const open = valves.filter((n) => ((state.outputs >> n) & 1) === 1);
    if (open.length === 0) this.#valveOnMs = Number.NaN;
    else if (Number.isNaN(this.#valveOnMs)) this.#valveOnMs = nowMs;
    const longestMs = Math.max(...open.map((n) => this.#rig.outputs[n]!.longestOnUs / 1000));
    const overMs = nowMs - this.#valveOnMs - longestMs;
    return {
      frozenMs: nowMs - this.#movedMs,
      stillUs: boardUs - this.#beltMovedUs,
      valveOverMs: open.length === 0 ? 0 : Math.max(0, overMs),
    };
  }

  #kindOf(output: string | null): string | undefined {
    return this.#rig.outputs.find(({ name }) => name === output)?.kind;
  }

  #newMemory(): AlarmMemory {
    return new AlarmMemory(
      (output) => this.#kindOf(output),
      (rule) => this.#waterRules.has(rule),
    );
  }

  /** A session begins: what is still wrong is raised again, in its own record. */
  #forget(): void {
    this.#memory = this.#newMemory();
    this.#waterRules = new Set();
    this.#following.clear();
    this.#beltMovedUs = Number.NaN;
  }
}
