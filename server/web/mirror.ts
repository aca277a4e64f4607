import { randomUUID } from 'node:crypto';
import type { NumberedEvent, Setup, Snapshot } from '../loop/protocol.js';
import type { StreamMessage } from './streamMessages.js';

/**
 * What the web process knows of the loop: the newest setup and state, and the newest events, each
 * already in the text that goes out. Serialising once however many watch keeps two hundred viewers
 * as cheap as one.
 */
export class Mirror {
  setup: Setup | undefined;
  state: Snapshot | undefined;
  loop: Extract<StreamMessage, { tell: 'loop' }> = {
    tell: 'loop',
    state: 'away',
    life: '',
    reason: 'Not connected yet.',
    remedy: '',
  };
  /** Counts states, so that a client knows whether it has this one. */
  stateCount = 0;
  private stateText: Buffer | undefined;
  /** The newest message of events that was made, and of which: most clients lack the same. */
  private eventsText = { first: -1, until: -1, message: Buffer.alloc(0) };
  private stateTextOf = -1;
  private readonly texts: (string | undefined)[];
  private readonly numbers: Float64Array;
  private oldest = 0;
  private newest = 0;

  constructor(private readonly keepEvents: number) {
    this.texts = new Array(keepEvents);
    this.numbers = new Float64Array(keepEvents);
  }

  /** Number of the newest event, 0 when there is none. */
  get lastNumber(): number {
    return this.newest > this.oldest ? this.numbers[(this.newest - 1) % this.keepEvents]! : 0;
  }

  takeState(state: Snapshot): void {
    this.state = state;
    this.stateCount++;
  }

  takeEvents(events: readonly NumberedEvent[]): void {
    for (const event of events) {
      const slot = this.newest % this.keepEvents;
      this.texts[slot] = JSON.stringify(event);
      this.numbers[slot] = event.number;
      this.newest++;
      if (this.newest - this.oldest > this.keepEvents) this.oldest++;
    }
  }

  /**
   * The loop is there (again): a restarted one numbers its events anew, so those kept are forgotten,
   * and every client is told all over.
   */
  beginLife(): void {
    this.oldest = this.newest;
    this.loop = { tell: 'loop', state: 'up', life: randomUUID(), reason: '', remedy: '' };
  }

  loseLoop(reason: string, remedy: string): void {
    this.loop = { ...this.loop, state: 'away', reason, remedy };
  }

  /** The newest state as a message; made once, whoever asks. */
  stateMessage(): Buffer | undefined {
    if (!this.state) return undefined;
    if (this.stateTextOf !== this.stateCount) {
      const message: StreamMessage = { tell: 'state', state: this.state };
      this.stateText = Buffer.from(JSON.stringify(message));
      this.stateTextOf = this.stateCount;
    }
    return this.stateText;
  }

  /**
   * The messages that bring a client that has events up to `after` further on, `most` events at a
   * time, and where it then is. A gap comes first when what follows `after` is no longer kept.
   */
  eventsAfter(after: number, most: number): { messages: Buffer[]; upTo: number } {
    // A client ahead of us cannot be of this life of the loop.
    const from = after > this.lastNumber ? 0 : after;
    let index = this.oldest;
    let low = this.oldest;
    let high = this.newest;
    while (low < high) {
      const middle = (low + high) >>> 1;
      if (this.numbers[middle % this.keepEvents]! > from) high = middle;
      else low = middle + 1;
    }
    index = low;
    if (index >= this.newest) return { messages: [], upTo: Math.min(after, this.lastNumber) };
    const messages: Buffer[] = [];
    const first = this.numbers[index % this.keepEvents]!;
    if (from > 0 && index === this.oldest && first > from + 1) {
      const gap: StreamMessage = { tell: 'gap', from: from + 1, to: first - 1 };
      messages.push(Buffer.from(JSON.stringify(gap)));
    }
    const until = Math.min(this.newest, index + most);
    messages.push(this.eventsMessage(index, until));
    return { messages, upTo: this.numbers[(until - 1) % this.keepEvents]! };
  }

  /** Of the events kept from `first` up to `until`, counted since the beginning. */
  private eventsMessage(first: number, until: number): Buffer {
    const made = this.eventsText;
    if (made.first === first && made.until === until) return made.message;
    const parts: string[] = [];
    for (let index = first; index < until; index++) {
      parts.push(this.texts[index % this.keepEvents]!);
    }
    const message = Buffer.from(`{"tell":"events","events":[${parts.join(',')}]}`);
    this.eventsText = { first, until, message };
    return message;
  }
}
