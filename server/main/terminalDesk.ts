import { createInterface } from 'node:readline/promises';
import { setTimeout as delay } from 'node:timers/promises';
import {
  type Answers,
  checkedAnswer,
  type Desk,
  type Field,
  type GuideBench,
  type GuideView,
  type Hands,
  type Question,
} from '../calibrate/guides/guide.js';
import { LapwingError } from '../errors/codes.js';
import type { Rig } from '../session/rig/rig.js';
import { textPicture } from './textPictures.js';

export interface TerminalDeskOptions {
  readonly rig: Rig;
  readonly bench: GuideBench;
  readonly hands: Hands | undefined;
  readonly by: string;
  readonly signal: AbortSignal;
  /** Answers given in advance, by the field's name. */
  readonly given: Readonly<Record<string, string>>;
  /** What is offered is taken, and nothing is asked. */
  readonly yes: boolean;
  /** Nothing is printed but what is asked for. */
  readonly silent: boolean;
}

/** A person at a terminal: text on standard error, questions answered by line. */
export class TerminalDesk implements Desk {
  readonly rig: Rig;
  readonly bench: GuideBench;
  readonly hands: Hands | undefined;
  readonly by: string;
  readonly #options: TerminalDeskOptions;
  #shown = '';
  #bar = '';

  constructor(options: TerminalDeskOptions) {
    this.#options = options;
    this.rig = options.rig;
    this.bench = options.bench;
    this.hands = options.hands;
    this.by = options.by;
  }

  now(): Date {
    return new Date();
  }

  async pause(ms: number): Promise<void> {
    const { signal } = this.#options;
    // The reason is what a person can read; the timer's own error is not.
    await delay(ms, undefined, { signal }).catch(() => signal.throwIfAborted());
  }

  /** The text once, and again when it says something else; in between a bar that moves. */
  show({ title, text, done, caution, pictures }: GuideView): void {
    if (this.#options.silent) return;
    const { stderr } = process;
    const step = `${title}: ${text}`;
    // A count that moves goes into the bar alone.
    const still = step.replace(/\d[\d.]*/g, 'n');
    if (still !== this.#shown) {
      this.#shown = still;
      this.#clearBar();
      if (caution !== undefined) stderr.write(`\n! ${caution}\n`);
      stderr.write(`\n${step}\n`);
      // A guide's last view has its result; while it goes on, pictures would scroll away.
      if (done === 1)
        for (const one of pictures) stderr.write(`\n${textPicture(one).join('\n')}\n`);
    }
    if (done === null || !stderr.isTTY) return;
    const full = Math.round(done * 30);
    const bar = `[${'#'.repeat(full)}${' '.repeat(30 - full)}] ${Math.floor(done * 100)} %`;
    if (bar === this.#bar) return;
    this.#bar = bar;
    stderr.write(`\r${bar}`);
  }

  async ask({ fields, go }: Question): Promise<Answers> {
    this.#clearBar();
    const answers: Record<string, number | string> = {};
    for (const field of fields) answers[field.name] = await this.#answer(field);
    if (fields.length === 0 && !this.#options.yes) await this.#line(`[Enter] ${go} `);
    return answers;
  }

  async #answer(field: Field): Promise<number | string> {
    const given = this.#options.given[field.name];
    if (given !== undefined) return checkedAnswer(field, given);
    if (this.#options.yes) {
      if (field.value !== undefined) return field.value;
      throw new LapwingError(
        'calibrateAnswer',
        `\`${field.name}\` (${field.label}) has no answer.`,
      );
    }
    for (;;) {
      const text = await this.#line(`${promptOf(field)}: `);
      if (text === '' && field.value !== undefined) return field.value;
      try {
        return checkedAnswer(field, text);
      } catch (error) {
        process.stderr.write(`  ${(error as Error).message}\n`);
      }
    }
  }

  async #line(prompt: string): Promise<string> {
    if (!process.stdin.isTTY) {
      throw new LapwingError(
        'calibrateAnswer',
        'There is nobody to ask: give answers with `--answer`, or take what is offered with `--yes`.',
      );
    }
    const lines = createInterface({ input: process.stdin, output: process.stderr });
    try {
      return (await lines.question(prompt, { signal: this.#options.signal })).trim();
    } finally {
      lines.close();
    }
  }

  #clearBar(): void {
    if (this.#bar !== '') process.stderr.write(`\r${' '.repeat(44)}\r`);
    this.#bar = '';
  }
}

function promptOf(field: Field): string {
  const unit = field.kind === 'number' && field.unit !== '' ? `, ${field.unit}` : '';
  const options = field.kind === 'choice' ? ` (${field.options.join(' / ')})` : '';
  const offered = field.value === undefined || field.value === '' ? '' : ` [${field.value}]`;
  return `${field.label}${unit}${options}${offered}`;
}
