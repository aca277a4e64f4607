import { type Configure, OUTCOME, type Outcome } from '../../server/wire/messages.js';
import type { TestHost } from './testHost.js';

/** The output that sync trains may use as well: no allowance is kept of those. */
const SYNC_OUTPUT = 3;

interface Watched {
  limits: Configure | undefined;
  longestEverUs: number;
  riseUs: number;
  riseLongestUs: number;
  on: boolean;
  lastFallUs: number;
  firstRiseCount: number | undefined;
  /** Since the last configure. */
  rises: number;
  onUs: number;
  countsFromConfigure: boolean;
  /** The command that the board says owns the output, and its rises so far. */
  owner: number;
  ownerRises: number;
  /** A rise whose `fired` has not come yet. */
  unexplained: number | undefined;
}

/**
 * Watches the outputs' levels as a logic analyser would, and holds them against the limits that were
 * configured. It knows nothing of how the board keeps them.
 */
export class LimitObserver {
  readonly broken: string[] = [];
  rises = 0;
  readonly #host: TestHost;
  readonly #repeats = new Map<number, number>();
  readonly #fired = new Set<string>();
  #outputs: Watched[] = [];
  #tag = 0;
  #boot = 0;

  constructor(host: TestHost) {
    this.#host = host;
    this.#forget();
    host.board.probe((output, on, us) => this.#changed(output, on, us));
    host.board.connect({
      identity: (message, tag) => {
        if (message.bootId !== this.#boot) this.#forget();
        else if (tag !== this.#tag && tag === host.board.tag) {
          for (const one of this.#outputs) one.limits = undefined;
        }
        this.#boot = message.bootId;
        this.#tag = host.board.tag;
      },
      sample: () => {},
      edge: (message) => {
        const one = this.#outputs[message.input & 0x7f];
        if (message.input >= 0x80 && one !== undefined) one.unexplained = undefined;
      },
      outcome: (message) => this.#outcome(message),
      fault: () => {},
      clock: () => {},
    });
  }

  asked(id: number, repeats: number): void {
    this.#repeats.set(id, repeats);
  }

  /** A configure that the board obeys is about to be sent. */
  configured(message: Configure): void {
    const one = this.#outputs[message.output];
    if (one === undefined) return;
    one.limits = message;
    one.longestEverUs = Math.max(one.longestEverUs, message.longestOnUs);
    // New limits hold at once: what is on already may not be on for longer than they say.
    const soFarUs = this.#host.nowUs - one.riseUs;
    one.riseLongestUs = Math.min(one.riseLongestUs, Math.max(soFarUs, message.longestOnUs));
    one.rises = 0;
    one.onUs = 0;
    one.countsFromConfigure = false;
  }

  /** Call between commands: every rise must have been explained by then. */
  settle(): void {
    this.#outputs.forEach((one, output) => {
      if (one.unexplained !== undefined) this.#break(output, 'rose without a command');
      one.unexplained = undefined;
      if (one.on && this.#host.nowUs - one.riseUs > one.riseLongestUs) {
        this.#break(output, 'is on for too long');
      }
    });
  }

  #forget(): void {
    this.#outputs = Array.from({ length: this.#host.board.setting.outputs }, () => ({
      limits: undefined,
      longestEverUs: 0,
      riseUs: 0,
      riseLongestUs: 0,
      on: false,
      lastFallUs: Number.NEGATIVE_INFINITY,
      firstRiseCount: undefined,
      rises: 0,
      onUs: 0,
      countsFromConfigure: false,
      owner: 0,
      ownerRises: 0,
      unexplained: undefined,
    }));
    this.#fired.clear();
  }

  #changed(output: number, on: boolean, us: number): void {
    const one = this.#outputs[output]!;
    if (one.on === on) this.#break(output, 'changed to what it was');
    one.on = on;
    if (on) this.#rose(output, one, us);
    else this.#fell(output, one, us);
  }

  #rose(output: number, one: Watched, us: number): void {
    this.rises++;
    one.riseUs = us;
    const { limits } = one;
    if (output === SYNC_OUTPUT) {
      one.riseLongestUs = one.longestEverUs;
      return;
    }
    if (limits === undefined || limits.longestOnUs === 0) {
      this.#break(output, 'rose without limits');
      return;
    }
    one.riseLongestUs = limits.longestOnUs;
    if (us - one.lastFallUs < limits.leastGapUs) this.#break(output, 'rose too soon');
    one.rises++;
    one.countsFromConfigure = true;
    if (one.rises > limits.allowanceRises) this.#break(output, 'rose more often than allowed');
    if (one.owner === 0) {
      one.unexplained = us;
    } else {
      one.ownerRises++;
      if (one.ownerRises > this.#repeats.get(one.owner)!) this.#break(output, 'rose once more');
    }
  }

  #fell(output: number, one: Watched, us: number): void {
    const onUs = us - one.riseUs;
    one.lastFallUs = us;
    if (onUs > one.riseLongestUs) this.#break(output, `was on for ${onUs} us`);
    if (output === SYNC_OUTPUT || one.limits === undefined || !one.countsFromConfigure) return;
    one.onUs += onUs;
    one.countsFromConfigure = false;
    if (one.onUs > one.limits.allowanceUs) this.#break(output, 'was on longer than allowed');
  }

  #outcome(message: Outcome): void {
    const one = this.#outputs[message.output];
    if (one === undefined || message.repeated === 1) return;
    if (message.kind === OUTCOME.done) {
      one.owner = 0;
    } else if (message.kind === OUTCOME.fired) {
      const name = `${this.#tag} ${message.id}`;
      if (this.#fired.has(name)) this.#break(message.output, `id ${message.id} fired twice`);
      this.#fired.add(name);
      one.owner = message.id;
      one.ownerRises = 1;
      one.unexplained = undefined;
      const { limits, firstRiseCount } = one;
      if (limits !== undefined && firstRiseCount !== undefined && message.output !== SYNC_OUTPUT) {
        const apart = Math.abs((message.count - firstRiseCount) | 0);
        if (apart < limits.leastCounts) this.#break(message.output, 'rose too near the last');
      }
      one.firstRiseCount = message.count;
    }
  }

  #break(output: number, what: string): void {
    this.broken.push(`output ${output} ${what} at ${this.#host.nowUs} us`);
  }
}
