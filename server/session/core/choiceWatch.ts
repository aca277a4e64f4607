import type { Program } from '../../rules/engine/program.js';
import type { Decision } from '../decisions.js';

/**
 * A slot has stood so long on the board, and was not refused: the line keeps the order of what is
 * said, a refusal comes at once, and a frame that was lost shows in the board's own counter.
 */
const STOOD_US = 100_000;

/** What of a changed choice the board has not yet confirmed. */
interface Open {
  readonly choice: number;
  readonly value: number | string;
  readonly sinceUs: number;
}

/**
 * Follows an operator's choice from the moment when it counts until the board has been armed by it
 * anew. What the board does not arm by itself is in force at once.
 */
export class ChoiceWatch {
  readonly #program: Program;
  readonly #armedSinceUs: (rule: number) => number;
  readonly #tell: (decision: Decision) => void;
  #open: Open[] = [];

  constructor(
    program: Program,
    armedSinceUs: (rule: number) => number,
    tell: (decision: Decision) => void,
  ) {
    this.#program = program;
    this.#armedSinceUs = armedSinceUs;
    this.#tell = tell;
  }

  inForce(choice: number, value: number | string, nowUs: number): void {
    const { name, rearms } = this.#program.choices[choice]!;
    this.#tell({ kind: 'choice', name, value, state: 'in force' });
    this.#open = this.#open.filter((one) => one.choice !== choice);
    if (rearms.length > 0) this.#open.push({ choice, value, sinceUs: nowUs });
  }

  /** Whether the board has yet to be armed by the choice as it is now. */
  isOpen(choice: number): boolean {
    return this.#open.some((one) => one.choice === choice);
  }

  /** At each instant; nothing while no change is open. */
  step(nowUs: number): void {
    if (this.#open.length === 0) return;
    for (const open of [...this.#open]) {
      const { name, rearms } = this.#program.choices[open.choice]!;
      const stands = rearms.some((rule) => {
        const sinceUs = this.#armedSinceUs(rule);
        return sinceUs >= open.sinceUs && nowUs - sinceUs >= STOOD_US;
      });
      if (!stands) continue;
      this.#open = this.#open.filter((one) => one !== open);
      this.#tell({ kind: 'choice', name, value: open.value, state: 'armed anew' });
    }
  }
}
