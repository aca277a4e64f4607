import type { SourceSpan } from './ast.js';
import { nearestName } from './nearestName.js';
import { PROBLEMS, type ProblemCode } from './problemCodes.js';
import { MOST_PROBLEMS } from './text/caps.js';

export { formatProblems } from './formatProblems.js';

export type Severity = 'error' | 'warning';

/** One thing wrong with, or suspicious about, a rules file. */
export interface Problem {
  readonly severity: Severity;
  readonly code: ProblemCode;
  /** What is wrong, in one plain sentence. */
  readonly message: string;
  /** What was expected there. */
  readonly expected?: string;
  /** The known name or word that comes nearest to what was written. */
  readonly nearest?: string;
  readonly at: SourceSpan;
  /** Another place involved: "already defined here". */
  readonly also?: readonly { readonly at: SourceSpan; readonly note: string }[];
}

/** What a report may say besides its message. */
export interface Particulars {
  readonly expected?: string | undefined;
  readonly nearest?: string | undefined;
  readonly also?: Problem['also'];
}

/** Collects the problems of one reading or checking, so that all come at once. */
export class ProblemList {
  readonly problems: Problem[] = [];
  private dropped = false;

  /** Adds a problem; its severity is the code's. Past the cap the rest are dropped. */
  report(code: ProblemCode, at: SourceSpan, message: string, more: Particulars = {}): void {
    if (this.problems.length >= MOST_PROBLEMS) {
      if (!this.dropped) {
        this.problems.push({
          severity: 'error',
          code: 'tooMany',
          message: `more than ${MOST_PROBLEMS} problems: the rest are not shown`,
          at,
        });
      }
      this.dropped = true;
      return;
    }
    this.problems.push({
      severity: PROBLEMS[code].severity,
      code,
      message,
      at,
      ...(more.expected === undefined ? {} : { expected: more.expected }),
      ...(more.nearest === undefined ? {} : { nearest: more.nearest }),
      ...(more.also === undefined ? {} : { also: more.also }),
    });
  }

  /** Reports a word that is not known, with the nearest of those that are. */
  unknown(
    code: ProblemCode,
    at: SourceSpan,
    message: string,
    found: string,
    known: readonly string[],
    expected?: string,
  ): void {
    this.report(code, at, message, { expected, nearest: nearestName(found, known) });
  }

  get failed(): boolean {
    return this.problems.some((problem) => problem.severity === 'error');
  }

  /** True once further reports are dropped: a check may stop looking. */
  get full(): boolean {
    return this.problems.length >= MOST_PROBLEMS;
  }
}

/** In the order of the files and of the text. */
export function inOrder(problems: readonly Problem[]): Problem[] {
  return [...problems].sort((a, b) => a.at.file - b.at.file || a.at.start - b.at.start);
}
