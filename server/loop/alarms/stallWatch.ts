/** A stall is remembered so long. */
const KEPT_MS = 60_000;

/** How long this computer has held the loop up, by how late the loop's own tick comes. */
export class StallWatch {
  #tickedMs = Number.NaN;
  #worst = { ms: 0, atMs: Number.NEGATIVE_INFINITY };

  constructor(private readonly tickMs: number) {}

  /** The longest within the last minute, milliseconds. */
  get worstMs(): number {
    return this.#worst.ms;
  }

  tick(nowMs: number): void {
    const lateMs = Number.isNaN(this.#tickedMs) ? 0 : nowMs - this.#tickedMs - this.tickMs;
    this.#tickedMs = nowMs;
    const old = nowMs - this.#worst.atMs > KEPT_MS;
    if (old || lateMs > this.#worst.ms) this.#worst = { ms: Math.max(0, lateMs), atMs: nowMs };
  }

  /** What it took to begin a session is no stall of it. */
  restart(): void {
    this.#tickedMs = Number.NaN;
    this.#worst = { ms: 0, atMs: Number.NEGATIVE_INFINITY };
  }
}
