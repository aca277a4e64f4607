import {
  type Arm,
  type Beat,
  CONFIGURE_FLAG,
  type Configure,
  FAULT,
  type HostMessageName,
  type Identify,
  type MessageOf,
  OUTCOME,
  PROTOCOL_VERSION,
  PULSE_FLAG,
  type Pulse,
  type Quiet,
  REASON,
  type Sync,
  WIRE_TIMES,
} from '../../server/wire/messages.js';
import type { OutputBank } from './outputBank.js';
import type { Shape } from './outputLine.js';
import { SeenIds } from './seenIds.js';
import { Silence } from './silence.js';
import { slotAhead } from './slots.js';
import type { Voice } from './voice.js';

/** Refused frames of another tag are told in one fault at most this often. */
const WRONG_TAG_EVERY_US = 100_000;

/** What the host says, checked: tags, ids, expiry, and then handed to the outputs. */
export class Commands {
  readonly #voice: Voice;
  readonly #bank: OutputBank;
  readonly #silence: Silence;
  readonly #ids = new SeenIds();
  #wrongTags = 0;
  #wrongTagToldUs = Number.NEGATIVE_INFINITY;

  constructor(voice: Voice, bank: OutputBank) {
    this.#voice = voice;
    this.#bank = bank;
    this.#silence = new Silence(voice, bank);
  }

  /** One host message. `identify` and `quiet` are obeyed under any tag, all else under the current. */
  obey(name: HostMessageName, message: MessageOf[HostMessageName], tag: number): void {
    if (name === 'identify') {
      this.#identify(message as Identify);
    } else if (name === 'quiet') {
      this.#bank.endAll((message as Quiet).outputs, REASON.cut);
    } else if (tag === 0 || tag !== this.#voice.tag) {
      this.#wrongTags++;
      this.#tellWrongTags();
    } else {
      this.#obeyTagged(name, message);
    }
  }

  /** A thousand times a second: silence, and slots that were left behind. */
  tick(): void {
    if (this.#voice.tag !== 0) this.#silence.watch();
    if (this.#bank.slots.leftBehind > 0) this.#bank.sweep();
    if (this.#wrongTags > 0) this.#tellWrongTags();
  }

  reset(): void {
    this.#ids.clear();
    this.#wrongTags = 0;
    this.#wrongTagToldUs = Number.NEGATIVE_INFINITY;
  }

  #obeyTagged(name: HostMessageName, message: MessageOf[HostMessageName]): void {
    switch (name) {
      case 'configure':
        this.#configure(message as Configure);
        break;
      case 'pulse':
        this.#pulse(message as Pulse);
        break;
      case 'arm':
        this.#arm(message as Arm);
        break;
      case 'beat':
        this.#silence.beat(message as Beat);
        break;
      case 'sync':
        this.#sync(message as Sync);
        break;
    }
  }

  #identify({ nonce, protocol, newTag }: Identify): void {
    const voice = this.#voice;
    if (protocol !== PROTOCOL_VERSION || newTag === 0) {
      voice.identity(nonce, newTag, 0);
      voice.fault(FAULT.badProtocol, protocol, newTag);
      return;
    }
    if (newTag !== voice.tag) {
      if (voice.tag !== 0) {
        this.#bank.endForSilence(REASON.newTag);
        voice.previousTag = voice.tag;
      }
      for (const line of this.#bank.lines) line.unconfigure();
      this.#ids.clear();
      voice.tag = newTag;
      this.#silence.begin();
    }
    voice.identityAndOutcomes(nonce);
  }

  #configure(message: Configure): void {
    const line = this.#bank.lines[message.output];
    if (line === undefined) return;
    const idleHigh = (message.flags & CONFIGURE_FLAG.idleHigh) !== 0;
    // A changed idle level is a change at the pin, and 0 is never: the owner ends first.
    const ends = line.idleHigh !== idleHigh || message.longestOnUs === 0;
    if (line.owner !== 'none' && (ends || line.syncForbidden(message))) {
      this.#bank.stop(message.output, REASON.cut);
    }
    line.configure(message);
    this.#bank.schedule();
  }

  #pulse(message: Pulse): void {
    const { id, output } = message;
    if (!this.#takeId(id, output)) return;
    const { nowUs } = this.#voice;
    const aheadUs = (message.expiryUs - nowUs) | 0;
    const delayUs = message.flags & PULSE_FLAG.startAt ? (message.startUs - nowUs) | 0 : 0;
    let reason = this.#shapeReason(output, message);
    if (reason === REASON.none && aheadUs < 0) {
      this.#voice.outcome(id, OUTCOME.expired, REASON.none, output, 0);
      return;
    }
    if (reason === REASON.none && (aheadUs >= WIRE_TIMES.expiryMostUs || delayUs > aheadUs)) {
      reason = REASON.badExpiry;
    }
    if (reason !== REASON.none) {
      this.#refuse(id, output, reason);
    } else if (delayUs <= 0) {
      this.#bank.rise(id, output, message, message.flags, message.countFrom, message.countTo);
    } else if (!this.#bank.waiting.add(message, nowUs + delayUs)) {
      this.#refuse(id, output, REASON.busy);
      this.#voice.fault(FAULT.queueFull, id);
    }
    this.#bank.schedule();
  }

  #arm(message: Arm): void {
    const { id, output } = message;
    if (!this.#takeId(id, output)) return;
    const reason = this.#armReason(message);
    if (reason !== REASON.none) {
      this.#refuse(id, output, reason);
      return;
    }
    const { slots } = this.#bank;
    const slot = slots.slots[message.slot]!;
    slot.id = id;
    slot.output = output;
    slot.rising = message.rising !== 0;
    slot.target = message.count | 0;
    slot.widthUs = message.widthUs;
    slot.periodUs = message.periodUs;
    slot.repeats = message.repeats;
    if (slotAhead(slot, this.#voice.count) <= 0) {
      this.#voice.outcome(id, OUTCOME.passed, REASON.none, output, 0);
      return;
    }
    slot.armed = true;
    slots.refresh(this.#voice.count);
  }

  #armReason(message: Arm): number {
    const slot = this.#bank.slots.slots[message.slot];
    if (slot === undefined) return REASON.badSlot;
    const reason = this.#shapeReason(message.output, message);
    if (reason !== REASON.none) return reason;
    if (this.#silence.forSlots) return REASON.silence;
    if (slot.armed) return REASON.slotTaken;
    if (this.#bank.slots.sharesLowByte(message.count)) return REASON.sharedLowByte;
    return REASON.none;
  }

  #sync(message: Sync): void {
    const { output, widthUs, leastGapUs, mostGapUs, seed } = message;
    const line = this.#bank.lines[output];
    if (line?.owner === 'sync') this.#bank.stop(output, REASON.cut);
    if (message.running === 0) return;
    if (line?.owner === 'none' && line.syncAllowed(widthUs, leastGapUs, mostGapUs)) {
      line.beginSync(widthUs, leastGapUs, mostGapUs, seed, this.#voice.nowUs);
      this.#bank.schedule();
    } else {
      this.#voice.fault(FAULT.syncRefused, output);
    }
  }

  /** True for an id that is new under this tag; otherwise answers what may be answered. */
  #takeId(id: number, output: number): boolean {
    if (id === 0) {
      this.#refuse(0, output, REASON.badShape);
      return false;
    }
    const seen = this.#ids.take(id);
    if (seen === 'new') return true;
    // Known: what is kept of it is told again; if it has not ended, there is nothing to tell.
    if (!this.#voice.repeat(id) && seen === 'old' && !this.#bank.pending(id)) {
      this.#refuse(id, output, REASON.oldId);
    }
    return false;
  }

  #shapeReason(output: number, shape: Shape): number {
    const line = this.#bank.lines[output];
    if (line === undefined) return REASON.badShape;
    if (!this.#silence.beaten) return REASON.silence;
    return line.shapeReason(shape);
  }

  #refuse(id: number, output: number, reason: number): void {
    this.#voice.outcome(id, OUTCOME.refused, reason, output, 0);
  }

  #tellWrongTags(): void {
    const { nowUs } = this.#voice;
    if (nowUs - this.#wrongTagToldUs < WRONG_TAG_EVERY_US) return;
    this.#wrongTagToldUs = nowUs;
    this.#voice.fault(FAULT.wrongTag, this.#wrongTags);
    this.#wrongTags = 0;
  }
}
