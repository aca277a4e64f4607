/**
 * One operator holds the controls at a time: one sign-in, that is, one browser. Nobody has them until
 * somebody takes them; who wants them from somebody else says so, and everybody is told.
 *
 * A change is an ordered act of the session that runs, and in force once the loop has recorded it.
 * Without sign-in there is nothing to hold: whoever reaches the page is at the rig's own machine.
 */
import { LapwingError } from '../../errors/codes.js';
import type { Actor, OperatorAct } from '../../session/inputs.js';
import type { Held } from './accessMessages.js';
import type { SignIn } from './signIns.js';
import type { Holder, Visitor } from './visitor.js';

export interface ControlsPort {
  /** Records the act if a session runs; rejects when one runs and could not take it. */
  record(act: Extract<OperatorAct, { act: 'controls' }>, by: Actor): Promise<void>;
  /** Tells everybody, and keeps it for a web process that is started again. */
  changed(held: Held): void;
}

const LAPWING = { who: 'Lapwing', from: 'the web process' };

export class Controls implements Holder {
  private changing = false;

  constructor(
    private readonly port: ControlsPort,
    private readonly signInUsed: boolean,
    private held: Held = { change: 0, holder: null },
    private readonly nowMs: () => number = () => Date.now(),
  ) {}

  get now(): Held {
    return this.held;
  }

  get words(): string {
    const { holder } = this.held;
    return holder ? `${holder.name} holds them since ${holder.since}.` : 'Nobody holds them now.';
  }

  isHeldBy({ signIn }: Visitor): boolean {
    return !this.signInUsed || (signIn !== undefined && this.held.holder?.id === signIn.id);
  }

  /**
   * Takes the controls, from whoever has them. To take them from somebody, `seen` is the change that
   * was on the screen.
   * @throws LapwingError WEB_CONTROLS_CHANGED, or the loop's reason for not recording it
   */
  async take(signIn: SignIn, from: string, seen: number | undefined): Promise<void> {
    const { holder, change } = this.held;
    if (holder?.id === signIn.id) return;
    if (this.changing || (holder && seen !== change)) {
      const asked = seen === undefined ? '`seen` was not given' : `\`seen\` was ${seen}`;
      throw new LapwingError('webControlsChanged', `${this.words} ${asked}; it is ${change}.`);
    }
    const since = new Date(this.nowMs()).toISOString();
    const next = { id: signIn.id, name: signIn.name, since };
    await this.change(next, { who: signIn.name, from });
  }

  /** Gives them up; nothing when this sign-in does not have them. */
  async giveUp(signIn: SignIn, from: string): Promise<void> {
    if (this.held.holder?.id !== signIn.id) return;
    await this.change(null, { who: signIn.name, from });
  }

  /** The holder's sign-in has ended: nobody has them, whether the loop could record it or not. */
  freeFrom(ids: readonly string[]): void {
    const { holder } = this.held;
    if (!holder || !ids.includes(holder.id)) return;
    const act = this.actFor(null);
    this.set(null);
    this.port.record(act, LAPWING).catch(() => undefined);
  }

  /** What a session that has just begun, or was found running, is told first. */
  announceTo(record: ControlsPort['record']): Promise<void> {
    const { holder } = this.held;
    if (!holder) return Promise.resolve();
    return record({ act: 'controls', holder: holder.name, before: holder.name }, LAPWING);
  }

  private async change(next: Held['holder'], by: Actor): Promise<void> {
    this.changing = true;
    const { change } = this.held;
    try {
      await this.port.record(this.actFor(next), by);
      // The holder may have signed out meanwhile, which frees them at once.
      if (this.held.change === change) this.set(next);
    } finally {
      this.changing = false;
    }
  }

  private actFor(next: Held['holder']): Extract<OperatorAct, { act: 'controls' }> {
    return {
      act: 'controls',
      holder: next?.name ?? null,
      before: this.held.holder?.name ?? null,
    };
  }

  private set(holder: Held['holder']): void {
    this.held = { change: this.held.change + 1, holder };
    this.port.changed(this.held);
  }
}
