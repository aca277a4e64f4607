import type { RulesEngine } from '../../rules/engine/rulesEngine.js';
import type { Instant } from '../../rules/instant.js';
import type { Tracker } from '../../track/tracker.js';
import type { Decision } from '../decisions.js';
import type { Actor, OperatorAct } from '../inputs.js';
import type { Rig, RigOutput } from '../rig/rig.js';
import { ButtonBox } from './buttonBox.js';
import type { CoreOutput } from './coreOutput.js';
import type { Firings } from './firings.js';
import type { Holds } from './holds.js';
import { Marks } from './marks.js';

/** What the rest of the session core is to whoever steers it. */
export interface SteeringContext {
  readonly instant: Instant;
  readonly tracker: Tracker;
  readonly holds: Holds;
  readonly firings: Firings;
  readonly rig: Rig;
  readonly out: CoreOutput;
  engine(): RulesEngine;
  tell(decision: Decision): void;
  end(reason: string): void;
}

export const EVERYTHING = 0xffff;
const HAND = 'nothing can be done at once while a hand is on the belt';

/** What an operator does to a session, from a page or by a button on an input of the board. */
export class Steering {
  readonly marks = new Marks();
  readonly #buttons: ButtonBox;
  readonly #context: SteeringContext;
  #handOnBelt = false;

  constructor(context: SteeringContext) {
    this.#context = context;
    const { instant, holds, rig } = context;
    const state = {
      get lap() {
        return instant.lap;
      },
      isHeld: (what: 'stimulus' | 'water') => holds.isHeldBy(what, 'operator'),
    };
    this.#buttons = new ButtonBox(rig.buttons, state, (act, from) =>
      this.take(act, { who: 'button box', from }),
    );
  }

  /** A hand turns the belt: rules are not asked, and nothing counts. */
  get handOnBelt(): boolean {
    return this.#handOnBelt;
  }

  begin(): void {
    this.#buttons.begin(this.#context.instant);
  }

  /** At each instant, before the rules. */
  step(): void {
    this.#buttons.step(this.#context.instant);
  }

  take(act: OperatorAct, by: Actor): void {
    const { tell, holds, instant } = this.#context;
    const engine = this.#context.engine();
    tell({ kind: 'operator', act, who: by.who, from: by.from });
    switch (act.act) {
      case 'press':
        if (this.#handOnBelt) this.remark(HAND);
        else engine.press(act.button);
        return;
      case 'choose':
        engine.choose(act.name, act.value);
        return;
      case 'hold':
        this.#hold(act.what, act.on, `held by ${by.who}`);
        if (act.on) this.#quietKind(act.what === 'water' ? 'valve' : 'stimulus');
        return;
      case 'phase':
        engine.goTo(act.to);
        return;
      case 'new cell':
        engine.newCell();
        tell({ kind: 'cell began', index: engine.cell, fields: act.fields });
        return;
      case 'exclude lap':
      case 'controls':
      case 'acknowledge':
        return;
      case 'note': {
        const { mark = null, boardUs: markedUs = null } = this.marks.word(act.mark) ?? {};
        tell({ kind: 'note', text: act.text, mark, markedUs });
        return;
      }
      case 'mark': {
        const { nowUs: boardUs, lap, placed, positionCm } = instant;
        const { mark } = this.marks.make({ boardUs, lap, positionCm: placed ? positionCm : null });
        tell({ kind: 'note', text: '', mark, markedUs: boardUs });
        return;
      }
      case 'ask':
        if (this.#handOnBelt && act.laps === 0) this.remark(HAND);
        else if (!engine.ask(act.rule, act.laps)) {
          this.remark(`the rules file does not let ${act.rule} be asked for so`);
        }
        return;
      case 'withdraw':
        engine.withdraw(act.rule);
        return;
      case 'put off':
        if (!engine.putOff(act.laps, act.minutes)) {
          this.remark('the end has been put off as far as it may be');
        }
        return;
      case 'stop everything':
        this.#quiet();
        this.#hold('stimulus', true, `everything stopped by ${by.who}`);
        this.#hold('water', true, `everything stopped by ${by.who}`);
        return;
      case 'allow stimulation':
        holds.release('stimulus', 'restart');
        return;
      case 'hand on belt':
        if (act.on !== this.#handOnBelt) this.#hand(act.on, by.who);
        return;
      case 'end':
        this.#context.end(act.reason);
        return;
    }
  }

  /** What Lapwing says of itself among the notes. */
  remark(text: string): void {
    this.#context.tell({ kind: 'note', text, mark: null, markedUs: null });
  }

  /** The sync train goes on: it harms nobody, and without it the record cannot be aligned. */
  #quiet(): void {
    const { rig, out } = this.#context;
    const syncBit = rig.sync === undefined ? 0 : 1 << rig.sync.line;
    out.command('quiet', { outputs: EVERYTHING & ~syncBit });
  }

  /** What has begun ends now, too. */
  #quietKind(kind: RigOutput['kind']): void {
    const { rig, out } = this.#context;
    const outputs = rig.outputs
      .filter((output) => output.kind === kind)
      .reduce((mask, { line }) => mask | (1 << line), 0);
    if (outputs !== 0) out.command('quiet', { outputs });
  }

  #hand(on: boolean, who: string): void {
    const { tracker, instant, holds, firings } = this.#context;
    this.#handOnBelt = on;
    tracker.hand(on);
    tracker.unmoved(instant);
    if (on) {
      const reason = `the hand of ${who} is on the belt`;
      holds.set('stimulus', 'hand', reason);
      holds.set('water', 'hand', reason);
      firings.disarmAll(reason);
      this.#quiet();
    } else {
      holds.release('stimulus', 'hand');
      holds.release('water', 'hand');
    }
  }

  #hold(what: 'stimulus' | 'water', on: boolean, reason: string): void {
    const { holds, firings } = this.#context;
    if (!on) {
      holds.release(what, 'operator');
      return;
    }
    holds.set(what, 'operator', reason);
    firings.disarmKind(what === 'water', reason);
  }
}
