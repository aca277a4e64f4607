import { setTimeout as delay } from 'node:timers/promises';
import type { FastifyBaseLogger } from 'fastify';
import type { Notice } from './body.js';

export interface SenderTimes {
  /** What comes within this goes into one request. */
  readonly gatherMs: number;
  /** No answer for so long is a failure. */
  readonly timeoutMs: number;
  readonly firstRetryMs: number;
  readonly mostRetryMs: number;
  /** The stretch within which at most so many requests are made. */
  readonly windowMs: number;
}

export const SENDER_TIMES: SenderTimes = {
  gatherMs: 500,
  timeoutMs: 5_000,
  firstRetryMs: 1_000,
  mostRetryMs: 60_000,
  windowMs: 60_000,
};

/** After so many tries of the same notices somebody has to look at the address. */
const MOST_TRIES = 12;

export interface Target {
  readonly url: string;
  readonly contentType: string;
  /** Most requests in a window. */
  readonly most: number;
  body(notices: readonly Notice[]): string;
}

/**
 * Sends notices to one HTTP address, one request at a time, tried again with growing pauses. What
 * comes meanwhile waits and goes out together, an alarm once, as it then stands: no storm of alarms
 * becomes a storm of requests. Nothing here is ever waited for by anybody.
 */
export class Sender {
  /** By alarm: the newest of each. */
  #waiting = new Map<string, Notice>();
  #busy = false;
  #sentMs: number[] = [];
  readonly #stop = new AbortController();

  constructor(
    private readonly target: Target,
    private readonly log: Pick<FastifyBaseLogger, 'info' | 'warn'>,
    private readonly times: SenderTimes = SENDER_TIMES,
  ) {}

  add(notice: Notice): void {
    this.#waiting.set(notice.alarm, notice);
    if (this.#busy || this.#stop.signal.aborted) return;
    this.#busy = true;
    void this.#work().finally(() => {
      this.#busy = false;
    });
  }

  /** Gives up what waits. */
  close(): void {
    this.#stop.abort();
    this.#waiting.clear();
  }

  async #work(): Promise<void> {
    let tries = 0;
    let pauseMs = this.times.gatherMs;
    while (this.#waiting.size > 0) {
      if (!(await this.#rest(Math.max(pauseMs, this.#untilAllowedMs())))) return;
      const notices = [...this.#waiting.values()];
      const failure = await this.#post(notices);
      if (failure === undefined) {
        this.#sent(notices);
        tries = 0;
        pauseMs = this.times.gatherMs;
        continue;
      }
      tries++;
      pauseMs = Math.min(this.times.firstRetryMs * 2 ** (tries - 1), this.times.mostRetryMs);
      this.log.warn({ tries }, `a notice of alarms was not taken: ${failure.why}`);
      if (!failure.final && tries < MOST_TRIES) continue;
      this.log.warn({ notices: notices.length }, 'given up: look at `notify` in the rig file');
      this.#sent(notices);
      tries = 0;
    }
  }

  /** @returns false when everything ends */
  async #rest(ms: number): Promise<boolean> {
    try {
      await delay(ms, undefined, { ref: false, signal: this.#stop.signal });
      return true;
    } catch {
      return false;
    }
  }

  #untilAllowedMs(): number {
    const earliest = this.#sentMs.at(-this.target.most);
    if (earliest === undefined) return 0;
    return Math.max(0, earliest + this.times.windowMs - performance.now());
  }

  /** What has not changed meanwhile waits no longer. */
  #sent(notices: readonly Notice[]): void {
    for (const notice of notices) {
      if (this.#waiting.get(notice.alarm) === notice) this.#waiting.delete(notice.alarm);
    }
  }

  async #post(notices: readonly Notice[]): Promise<{ why: string; final: boolean } | undefined> {
    this.#sentMs = [...this.#sentMs, performance.now()].slice(-this.target.most);
    try {
      const response = await fetch(this.target.url, {
        method: 'POST',
        headers: { 'content-type': this.target.contentType },
        body: this.target.body(notices),
        redirect: 'error',
        signal: AbortSignal.any([AbortSignal.timeout(this.times.timeoutMs), this.#stop.signal]),
      });
      // The answer is of no interest, but a socket that is not read is not used again.
      await response.body?.cancel();
      if (response.ok) return undefined;
      const { status } = response;
      // Asked wrongly it would be asked wrongly again; too early or too often passes.
      const final = status >= 400 && status < 500 && status !== 408 && status !== 429;
      return { why: `it answered ${status}`, final };
    } catch (error) {
      const cause = (error as Error).cause as Error | undefined;
      return { why: (cause ?? (error as Error)).message, final: false };
    }
  }
}
