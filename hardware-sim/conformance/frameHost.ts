import { blank } from '../../server/wire/codec.js';
import {
  type Arm,
  type Configure,
  type Edge,
  type Fault,
  type HostMessageName,
  type Identity,
  type MessageOf,
  nameOf,
  OUTCOME,
  type Outcome,
  type Pulse,
  REASON,
  type Sample,
} from '../../server/wire/messages.js';

export type Tagged<T> = T & { readonly tag: number };

/** What a script expected and the board did not do. */
export class NotConforming extends Error {}

/**
 * A host that tries a board out: keeps all that it hears, says what it is told to and beats only then.
 * How frames come and go, and how time passes, is for those that extend it.
 */
export abstract class FrameHost {
  readonly identities: Tagged<Identity>[] = [];
  readonly samples: Tagged<Sample>[] = [];
  readonly edges: Tagged<Edge>[] = [];
  readonly outcomes: Tagged<Outcome>[] = [];
  readonly faults: Tagged<Fault>[] = [];
  tag = 0;
  /** The slots that the next beat wants: bit n for slot n. */
  wanted = 0xffff_ffff;
  protected nextId = 1;

  /** Board time as this host knows it: what a beat has finished with. */
  abstract readonly boardUs: number;
  abstract send<N extends HostMessageName>(name: N, message: MessageOf[N], tag?: number): void;

  beat(finishedUs = this.boardUs): void {
    this.send('beat', { finishedUs, wanted: this.wanted });
  }

  /** Output 0, generously, but for the changes. */
  configure(changes: Partial<Configure>): void {
    this.send('configure', {
      output: 0,
      flags: 0,
      longestOnUs: 1_000_000,
      leastGapUs: 0,
      allowanceUs: 100_000_000,
      allowanceRises: 10_000,
      leastCounts: 0,
      ...changes,
    });
  }

  newId(): number {
    return this.nextId++;
  }

  pulseMessage(changes: Partial<Pulse> = {}): Pulse {
    const expiryUs = this.boardUs + 100_000;
    const usual = { ...blank('pulse'), widthUs: 10_000, repeats: 1, expiryUs };
    return { ...usual, ...changes, id: changes.id ?? this.newId() };
  }

  /** Asks for a pulse of 10 ms on output 0, now. @returns its id */
  pulse(changes: Partial<Pulse> = {}): number {
    const pulse = this.pulseMessage(changes);
    this.send('pulse', pulse);
    return pulse.id;
  }

  armMessage(changes: Partial<Arm> = {}): Arm {
    const usual = { ...blank('arm'), rising: 1, widthUs: 10_000, repeats: 1 };
    return { ...usual, ...changes, id: changes.id ?? this.newId() };
  }

  /** Arms slot 0 to pulse output 0 for 10 ms. @returns its id */
  arm(changes: Partial<Arm> = {}): number {
    const arm = this.armMessage(changes);
    this.send('arm', arm);
    return arm.id;
  }

  /** What was told of an id, in words: `fired`, `done`, `refused busy`, `done silence again`. */
  words(id: number): string[] {
    return this.outcomes
      .filter((outcome) => outcome.id === id)
      .map((outcome) => {
        const words = [nameOf(OUTCOME, outcome.kind)];
        if (outcome.reason !== REASON.none) words.push(nameOf(REASON, outcome.reason));
        if (outcome.repeated === 1) words.push('again');
        return words.join(' ');
      });
  }

  outcome(id: number, kind: keyof typeof OUTCOME): Tagged<Outcome> {
    const found = this.outcomes.find((one) => one.id === id && one.kind === OUTCOME[kind]);
    if (!found) throw new NotConforming(`id ${id} was never ${kind}; told "${this.words(id)}"`);
    return found;
  }
}
