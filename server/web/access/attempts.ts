/**
 * How often sign-in may be tried. A wrong secret makes the same name from the same address wait, twice
 * as long each time; an address that tries many names waits too; and no name takes more than a hundred
 * failures an hour from all addresses together (the figure of OWASP ASVS 4.0.3, 2.2.1, from memory),
 * but for an address from which that person has signed in before: nobody can lock the operator out.
 */

/** Free of waiting: fingers slip. */
const FREE = { pair: 3, address: 12 };
const FIRST_WAIT_MS = 1000;
const MOST_WAIT_MS = 5 * 60_000;
const FORGET_MS = 60 * 60_000;
const NAME_FAILURES = 100;
const MOST_KEYS = 10_000;

interface Tally {
  failures: number;
  firstMs: number;
  lastMs: number;
}

export class Attempts {
  private readonly tallies = new Map<string, Tally>();
  private readonly trusted = new Set<string>();

  constructor(private readonly nowMs: () => number = () => performance.now()) {}

  /** How many milliseconds this name must wait at this address; 0 when it may try now. */
  waitMs(name: string, address: string): number {
    this.forgetOld();
    const pair = pairOf(name, address);
    const waits = [this.left(pair, FREE.pair)];
    // Of an address that is known for this name, only this name's own failures count.
    if (!this.trusted.has(pair)) {
      waits.push(this.left(`address ${address}`, FREE.address));
      const all = this.tallies.get(`name ${name}`);
      if (all && all.failures >= NAME_FAILURES) waits.push(all.firstMs + FORGET_MS - this.nowMs());
      if (this.tallies.size >= MOST_KEYS) waits.push(MOST_WAIT_MS);
    }
    return Math.max(0, ...waits);
  }

  failed(name: string, address: string): void {
    this.forgetOld();
    const now = this.nowMs();
    for (const key of [pairOf(name, address), `address ${address}`, `name ${name}`]) {
      const tally = this.tallies.get(key) ?? { failures: 0, firstMs: now, lastMs: now };
      if (key.startsWith('name') && now - tally.firstMs > FORGET_MS) {
        tally.failures = 0;
        tally.firstMs = now;
      }
      tally.failures++;
      tally.lastMs = now;
      this.tallies.set(key, tally);
    }
  }

  /** The right secret: what was mistyped before is forgiven to this name at this address. */
  succeeded(name: string, address: string): void {
    const pair = pairOf(name, address);
    this.tallies.delete(pair);
    this.trusted.delete(pair);
    this.trusted.add(pair);
    if (this.trusted.size > MOST_KEYS) this.trusted.delete(this.trusted.values().next().value!);
  }

  private left(key: string, free: number): number {
    const tally = this.tallies.get(key);
    if (!tally || tally.failures < free) return 0;
    const waitMs = Math.min(MOST_WAIT_MS, FIRST_WAIT_MS * 2 ** (tally.failures - free));
    return tally.lastMs + waitMs - this.nowMs();
  }

  private forgetOld(): void {
    const oldest = this.nowMs() - FORGET_MS;
    for (const [key, { lastMs }] of this.tallies) if (lastMs < oldest) this.tallies.delete(key);
  }
}

function pairOf(name: string, address: string): string {
  return `pair ${address} ${name}`;
}
