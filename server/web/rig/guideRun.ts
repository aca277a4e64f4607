import { setTimeout as delay } from 'node:timers/promises';
import type {
  Answers,
  Desk,
  GuideBench,
  GuideView,
  Hands,
  Question,
} from '../../calibrate/guides/guide.js';
import { checkedAnswer } from '../../calibrate/guides/guide.js';
import { type GuideName, runGuide } from '../../calibrate/guides/runGuide.js';
import { factsOf, runPreflight } from '../../calibrate/preflight/preflight.js';
import { asKnown } from '../../errors/asKnown.js';
import { LapwingError } from '../../errors/codes.js';
import type { Rig } from '../../session/rig/rig.js';
import { rowOf } from './calibrationRow.js';
import type { GuideTold } from './rigMessages.js';

export interface GuideWish {
  readonly rig: Rig;
  readonly guide: GuideName | 'preflight';
  readonly of: string;
  readonly by: string;
  readonly bench: GuideBench;
  readonly hands: Hands | undefined;
  readonly recordFolder: string | undefined;
}

const BLANK: GuideView = { title: '', text: '', done: null, pictures: [] };

/** One guide as a page goes through it: what it shows, what it asks, and its end. */
export class GuideRun implements Desk {
  readonly rig: Rig;
  readonly bench: GuideBench;
  readonly hands: Hands | undefined;
  readonly by: string;
  readonly finished: Promise<void>;
  readonly #wish: GuideWish;
  readonly #stop = new AbortController();
  #view: GuideView = BLANK;
  #question: Question | undefined;
  #number = 0;
  #answer: ((answers: Answers) => void) | undefined;
  #end: GuideTold | undefined;

  constructor(wish: GuideWish) {
    this.#wish = wish;
    this.rig = wish.rig;
    this.bench = wish.bench;
    this.hands = wish.hands;
    this.by = wish.by;
    this.finished = this.#run();
  }

  get told(): GuideTold {
    if (this.#end !== undefined) return this.#end;
    const { guide, of } = this.#wish;
    const state = this.#question === undefined ? 'going' : 'asking';
    const question = this.#question ?? null;
    return { state, guide, of, view: this.#view, question, number: this.#number };
  }

  get over(): boolean {
    return this.#end !== undefined;
  }

  /**
   * Answers the question that it asks now.
   * @throws LapwingError CALIBRATE_ANSWER for an answer that is none, or to another question
   */
  answer(number: number, answers: Answers): void {
    const question = this.#question;
    if (question === undefined || number !== this.#number) {
      throw new LapwingError('calibrateAnswer', 'That is not what is asked now.');
    }
    const checked: Record<string, number | string> = {};
    for (const field of question.fields) {
      const given = answers[field.name] ?? field.value;
      checked[field.name] = checkedAnswer(field, given ?? '');
    }
    this.#question = undefined;
    this.#answer?.(checked);
  }

  stop(why: string): void {
    this.#stop.abort(new LapwingError('calibrateStopped', why));
  }

  // ---- the desk ------------------------------------------------------------------------------

  now(): Date {
    return new Date();
  }

  show(view: GuideView): void {
    this.#view = view;
  }

  ask(question: Question): Promise<Answers> {
    this.#question = question;
    this.#number++;
    return new Promise((resolve, reject) => {
      const { signal } = this.#stop;
      const stopped = () => reject(signal.reason as Error);
      if (signal.aborted) stopped();
      signal.addEventListener('abort', stopped, { once: true });
      this.#answer = (answers) => {
        signal.removeEventListener('abort', stopped);
        resolve(answers);
      };
    });
  }

  async pause(ms: number): Promise<void> {
    const { signal } = this.#stop;
    await delay(ms, undefined, { signal }).catch(() => signal.throwIfAborted());
  }

  // ---- its course ----------------------------------------------------------------------------

  async #run(): Promise<void> {
    const { guide, of, rig, recordFolder } = this.#wish;
    try {
      // The page sees that it has begun before it shows anything.
      await this.pause(0);
      if (guide === 'preflight') {
        await runPreflight(this, factsOf(rig, recordFolder));
        this.#end = { state: 'done', guide, of, view: this.#view, kept: null, usable: false };
        return;
      }
      const { draft, kept } = await runGuide(this, guide, of);
      const row = kept === undefined ? null : rowOf(kept, rig, this.now());
      this.#end = {
        ...{ state: 'done', guide, of, view: this.#view, kept: row },
        usable: kept !== undefined && draft.usable,
      };
    } catch (error) {
      const { message: detail, remedy } = asKnown(error);
      this.#end = { state: 'failed', guide, of, detail, remedy };
    } finally {
      this.#question = undefined;
      await this.hands?.('speed off').catch(() => {});
      await this.hands?.('vial off').catch(() => {});
    }
  }
}
