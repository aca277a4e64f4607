import type { BenchItem, BenchNow } from '../../server/loop/protocol.js';

/** What is shown of the past, and what is kept beyond it. */
export const STRIP_S = 10;
const KEPT_US = (STRIP_S + 2) * 1_000_000;
/** The picture runs this far behind, so that what is polled comes in at its right edge, not jumps. */
const BEHIND_US = 250_000;

export interface StripLine {
  readonly name: string;
  readonly line: number;
  readonly kind: 'input' | 'valve' | 'stimulus' | 'mark';
}

/** Changes of one line, oldest first, and its level now. */
export interface StripTrace {
  readonly atUs: number[];
  readonly on: boolean[];
}

/** Levels of inputs and outputs over the last seconds, in board time; bounded in memory. */
export class Strip {
  readonly inputs = new Map<number, StripTrace>();
  readonly outputs = new Map<number, StripTrace>();
  private now: BenchNow | undefined;
  private heardMs = 0;

  /** @param nowMs the page's own clock, by which the picture runs on until the next word */
  take(now: BenchNow, items: readonly BenchItem[], nowMs: number): void {
    // The board began anew, or another one answers: what was is of another time.
    if (this.now !== undefined && now.atUs < this.now.atUs - 1_000_000) this.forget();
    this.now = now;
    this.heardMs = nowMs;
    for (const item of items) {
      if (item.is === 'edge') this.add(this.inputs, item.line, item.atUs, item.level === 1);
      else if (item.is === 'output') this.add(this.outputs, item.line, item.atUs, item.on);
    }
    for (const traces of [this.inputs, this.outputs]) {
      for (const trace of traces.values()) drop(trace, now.atUs - KEPT_US);
    }
  }

  /** Board time at the picture's right edge; undefined before anything was heard. */
  edgeUs(nowMs: number): number | undefined {
    if (this.now === undefined) return undefined;
    const sinceUs = Math.min(1_000, nowMs - this.heardMs) * 1_000;
    return this.now.atUs + sinceUs - BEHIND_US;
  }

  forget(): void {
    this.inputs.clear();
    this.outputs.clear();
  }

  private add(traces: Map<number, StripTrace>, line: number, atUs: number, on: boolean): void {
    const trace = traces.get(line) ?? { atUs: [], on: [] };
    traces.set(line, trace);
    trace.atUs.push(atUs);
    trace.on.push(on);
  }
}

/** Keeps the newest change before the limit: it says what the level was there. */
function drop(trace: StripTrace, beforeUs: number): void {
  let gone = 0;
  while (gone + 1 < trace.atUs.length && trace.atUs[gone + 1]! < beforeUs) gone++;
  trace.atUs.splice(0, gone);
  trace.on.splice(0, gone);
}

/** Stretches in which a line was on, within `fromUs` to `toUs`. */
export function stretchesOf(
  trace: StripTrace | undefined,
  fromUs: number,
  toUs: number,
  onNow: boolean,
): { fromUs: number; toUs: number }[] {
  if (trace === undefined || trace.atUs.length === 0) return onNow ? [{ fromUs, toUs }] : [];
  const stretches: { fromUs: number; toUs: number }[] = [];
  let sinceUs = trace.on[0] === false ? Number.NEGATIVE_INFINITY : Number.NaN;
  trace.atUs.forEach((atUs, n) => {
    if (trace.on[n]) {
      if (Number.isNaN(sinceUs)) sinceUs = atUs;
    } else if (!Number.isNaN(sinceUs)) {
      stretches.push({ fromUs: sinceUs, toUs: atUs });
      sinceUs = Number.NaN;
    }
  });
  if (!Number.isNaN(sinceUs)) stretches.push({ fromUs: sinceUs, toUs: Number.POSITIVE_INFINITY });
  return stretches
    .filter((one) => one.toUs > fromUs && one.fromUs < toUs)
    .map((one) => ({ fromUs: Math.max(fromUs, one.fromUs), toUs: Math.min(toUs, one.toUs) }));
}
