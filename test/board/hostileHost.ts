import { Dice } from '../../hardware-sim/animal/dice.js';
import { type Arm, PROTOCOL_VERSION, type Pulse } from '../../server/wire/messages.js';
import type { LimitObserver } from './limitObserver.js';
import type { TestHost } from './testHost.js';

const OUTPUTS = 4;

/**
 * A host that says anything: half of it sensible, so that much gets through, and the rest stale,
 * repeated, out of range, under another tag, or no frame at all.
 */
export class HostileHost {
  readonly #host: TestHost;
  readonly #observer: LimitObserver;
  readonly #dice: Dice;
  readonly #earlier: { name: 'pulse' | 'arm'; message: object; tag: number }[] = [];
  #id = 1;
  #tag = 1;

  constructor(host: TestHost, observer: LimitObserver, seed: number) {
    this.#host = host;
    this.#observer = observer;
    this.#dice = new Dice(seed);
  }

  /** One command, after some time and some movement. */
  act(): void {
    const dice = this.#dice;
    const { board } = this.#host;
    board.advanceTo(board.worldUs + this.#upTo(3000));
    if (dice.chance(0.5)) board.move(this.#upTo(60) - 25);
    const kind = this.#upTo(1000);
    if (kind < 380) this.#pulse();
    else if (kind < 580) this.#arm();
    else if (kind < 860) this.#beat();
    else if (kind < 940) this.#configure();
    else if (kind < 955) this.#repeat();
    else if (kind < 970) board.receiveBytes(Uint8Array.from({ length: 20 }, () => this.#upTo(4)));
    else if (kind < 978) this.#host.send('quiet', { outputs: this.#upTo(16) }, this.#upTo(3));
    else if (kind < 983) this.#sync();
    else if (kind < 993) this.#identify();
    else if (kind < 996) board.skipCounts(this.#upTo(20) - 10);
    else if (kind < 998) board.advanceTo(board.worldUs + 300_000);
    else if (kind < 999) this.#host.board.reset();
  }

  #upTo(most: number): number {
    return Math.floor(this.#dice.unit() * most);
  }

  /** Mostly the current tag. */
  #someTag(): number {
    return this.#dice.chance(0.97) ? this.#tag : this.#upTo(0x1_0000);
  }

  /** Mostly small; now and then as large as the field takes. */
  #number(most: number): number {
    return this.#dice.chance(0.02) ? 0xffff_ffff - this.#upTo(3) : this.#upTo(most);
  }

  #pulse(): void {
    const { boardUs, count } = this.#host.board;
    const startUs = boardUs + this.#upTo(8000) - 1000;
    const message = {
      id: this.#id++,
      output: this.#upTo(OUTPUTS + 1),
      flags: this.#upTo(4),
      widthUs: this.#number(3000),
      periodUs: this.#number(8000),
      repeats: this.#upTo(5),
      startUs,
      expiryUs: boardUs + this.#number(20_000) - 500,
      countFrom: count - this.#upTo(60),
      countTo: count + this.#upTo(60),
    };
    this.#send('pulse', message);
  }

  #arm(): void {
    const rising = this.#upTo(2);
    const ahead = this.#upTo(60) - 5;
    this.#send('arm', {
      id: this.#id++,
      slot: this.#upTo(17),
      output: this.#upTo(OUTPUTS + 1),
      rising,
      count: this.#host.board.count + (rising === 1 ? ahead : -ahead),
      widthUs: this.#number(3000),
      periodUs: this.#number(8000),
      repeats: this.#upTo(5),
    });
  }

  #send(name: 'pulse' | 'arm', message: Pulse | Arm): void {
    const tag = this.#someTag();
    this.#observer.asked(message.id, message.repeats);
    this.#earlier.push({ name, message, tag });
    if (this.#earlier.length > 200) this.#earlier.shift();
    this.#host.send(name, message as never, tag);
  }

  #repeat(): void {
    const one = this.#earlier[this.#upTo(this.#earlier.length)];
    if (one !== undefined) this.#host.send(one.name, one.message as never, one.tag);
  }

  #beat(): void {
    const finishedUs = this.#host.board.boardUs - this.#number(40_000) + this.#upTo(500);
    const wanted = this.#dice.chance(0.8) ? 0xffff_ffff : this.#upTo(0x1_0000);
    this.#host.send('beat', { finishedUs, wanted }, this.#someTag());
  }

  #configure(): void {
    const message = {
      output: this.#upTo(OUTPUTS + 1),
      flags: this.#upTo(4),
      longestOnUs: this.#dice.chance(0.05) ? 0 : this.#number(4000),
      leastGapUs: this.#upTo(4000),
      allowanceUs: this.#upTo(30_000),
      allowanceRises: this.#upTo(30),
      leastCounts: this.#upTo(40),
    };
    const tag = this.#someTag();
    if (tag === this.#host.board.tag && tag !== 0) this.#observer.configured(message);
    this.#host.send('configure', message, tag);
  }

  #sync(): void {
    const message = {
      output: OUTPUTS - 1,
      running: this.#upTo(2),
      widthUs: this.#number(3000),
      leastGapUs: this.#upTo(5000),
      mostGapUs: this.#number(9000),
      seed: this.#upTo(1000),
    };
    this.#host.send('sync', message, this.#someTag());
  }

  #identify(): void {
    const newTag = this.#upTo(20) === 0 ? this.#tag : this.#upTo(0x1_0000);
    const protocol = this.#dice.chance(0.9) ? PROTOCOL_VERSION : 9;
    this.#host.send('identify', { nonce: 1, protocol, newTag }, this.#someTag());
    this.#tag = this.#host.board.tag;
  }
}
