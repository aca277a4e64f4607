import type { NameRef, SourceSpan } from '../ast.js';
import type { ProblemList } from '../problems.js';
import { LONGEST_NAME, MOST_NAMES } from './caps.js';
import { FREE_WORDS, NAME_PATTERN, RESERVED } from './words.js';

/** The one list that all names of a file share. */
export class NameList {
  private readonly seen = new Map<string, { readonly at: SourceSpan; readonly section: string }>();

  constructor(private readonly problems: ProblemList) {}

  /** Takes a name into the list; undefined after reporting why it cannot be one. */
  declare(name: string, at: SourceSpan, section: string): NameRef | undefined {
    if (this.seen.size >= MOST_NAMES) {
      this.problems.report('tooMany', at, `more than ${MOST_NAMES} names`);
      return undefined;
    }
    if (!this.wellFormed(name, at)) return undefined;
    const other = this.seen.get(name);
    if (other) {
      this.problems.report('nameTwice', at, `\`${name}\` is a name already`, {
        expected: 'another name: all sections share one list',
        also: [{ at: other.at, note: `first named here, under \`${other.section}\`` }],
      });
      return undefined;
    }
    this.seen.set(name, { at, section });
    return { name, at };
  }

  private wellFormed(name: string, at: SourceSpan): boolean {
    const expected = 'letters, digits and `_`, beginning with a letter';
    if (name === '<<') {
      this.problems.report('yamlNotAllowed', at, 'merge keys (`<<`) are not allowed');
    } else if (name.length > LONGEST_NAME) {
      this.problems.report('badName', at, `a name of more than ${LONGEST_NAME} letters`);
    } else if (!NAME_PATTERN.test(name)) {
      this.problems.report('badName', at, `\`${name}\` cannot be a name`, { expected });
    } else if (RESERVED.has(name)) {
      this.problems.report('reservedName', at, `\`${name}\` is a word of the language`, {
        expected: `another name, such as \`${name}_1\`; words that may be names: ${FREE_WORDS.join(' ')}`,
      });
    } else return true;
    return false;
  }
}
