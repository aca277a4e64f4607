import type { WriteStream } from 'node:tty';
import type { Snapshot } from '../loop/protocol.js';
import type { StampedDecision } from '../session/decisions.js';
import { eventLine } from './eventLine.js';

/** How often a pipe gets a line of the state. */
const PLAIN_EVERY_MS = 10_000;

/** A live line at the bottom of a terminal; plain lines where the output is piped. */
export class StatusLine {
  readonly #out: WriteStream | NodeJS.WriteStream;
  readonly #live: boolean;
  #line = '';
  #plainDueMs = 0;

  constructor(out: NodeJS.WriteStream) {
    this.#out = out;
    this.#live = out.isTTY === true;
  }

  /** Prints a line of its own above the live one. */
  say(text: string): void {
    this.#clear();
    this.#out.write(`${text}\n`);
    this.#draw();
  }

  event(event: StampedDecision): void {
    const line = eventLine(event);
    if (line !== undefined) this.say(line);
  }

  show(state: Snapshot): void {
    const line = stateLine(state);
    if (this.#live) {
      this.#clear();
      this.#line = line;
      this.#draw();
      return;
    }
    const now = performance.now();
    if (now < this.#plainDueMs) return;
    this.#plainDueMs = now + PLAIN_EVERY_MS;
    this.#out.write(`${line}\n`);
  }

  close(): void {
    this.#clear();
    this.#line = '';
  }

  #clear(): void {
    if (this.#live && this.#line !== '') this.#out.write('\r\x1b[K');
  }

  #draw(): void {
    if (!this.#live || this.#line === '') return;
    const width = (this.#out as WriteStream).columns ?? 80;
    this.#out.write(this.#line.slice(0, width - 1));
  }
}

function stateLine(state: Snapshot): string {
  const { link, held } = state;
  if (link.state !== 'up') return `board: ${link.state}${link.reason ? ` (${link.reason})` : ''}`;
  const place = state.positionCm === null ? 'place unknown' : `${state.positionCm.toFixed(1)} cm`;
  const parts = [
    state.session === 'running' ? `${Math.floor(state.sessionS)} s` : state.session,
    `lap ${state.lap}`,
    ...(state.phase === null ? [] : [state.phase]),
    place,
    `${state.speedCmPerS.toFixed(0)} cm/s`,
    `${state.licks} licks`,
    `${state.waterUl.toFixed(0)} of ${state.waterLimitUl.toFixed(0)} uL`,
  ];
  if (state.trust === 'doubtful') parts.push(`doubtful: ${state.trustReason}`);
  if (held.stimulus !== null) parts.push(`stimulus held: ${held.stimulus}`);
  if (held.water !== null) parts.push(`water held: ${held.water}`);
  if (state.record.state === 'failed') parts.push(`RECORD FAILED: ${state.record.reason}`);
  return parts.join(' | ');
}
