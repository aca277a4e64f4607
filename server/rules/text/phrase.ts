import type { NameRef, SourceSpan } from '../ast.js';
import type { ProblemCode } from '../problemCodes.js';
import type { Particulars, ProblemList } from '../problems.js';
import { DEEPEST_NESTING, MOST_TOKENS } from './caps.js';
import { diagnose } from './diagnose.js';
import { lex, type Token } from './lexer.js';
import { FREE_WORDS, RESERVED } from './words.js';

/** Ends the reading of one phrase; its problem is in the list already. */
export class PhraseFailed extends Error {}

/**
 * A reader over the tokens of one phrase. Every word that was tried and not found at the furthest
 * token is remembered, so that "what was expected" needs no second list.
 */
export class Phrase {
  readonly tokens: readonly Token[];
  private index = 0;
  private furthest = 0;
  private tried = new Set<string>();
  private candidates = new Set<string>();
  private depth = 0;

  constructor(
    private readonly file: number,
    text: string,
    start: number,
    end: number,
    private readonly problems: ProblemList,
  ) {
    this.tokens = lex(text, start, end);
    if (this.tokens.length > MOST_TOKENS) {
      this.report('tooLarge', { file, start, end }, `a phrase of more than ${MOST_TOKENS} words`);
    }
  }

  /** The token `ahead` places on; the `end` token past the last. */
  peek(ahead = 0): Token {
    return this.tokens[Math.min(this.index + ahead, this.tokens.length - 1)]!;
  }

  next(): Token {
    const token = this.peek();
    if (this.index < this.tokens.length - 1) this.index++;
    return token;
  }

  /** Is the next token of this kind? Remembered as `expected` when it is not. */
  isKind(kind: Token['kind'], expected: string): boolean {
    if (this.peek().kind === kind) return true;
    this.remember(expected);
    return false;
  }

  /** Do these words or signs (split at spaces) come next? */
  at(words: string): boolean {
    const found = words.split(' ').every((word, ahead) => this.isAt(word, ahead));
    if (!found) this.remember(`\`${words}\``);
    return found;
  }

  /** Looks without remembering: for choosing between forms. */
  isAt(word: string, ahead = 0): boolean {
    const token = this.peek(ahead);
    return token.text === word && (token.kind === 'word' || token.kind === 'sign');
  }

  /** Takes the words if they come next. */
  accept(words: string): boolean {
    if (!this.at(words)) return false;
    this.index = Math.min(this.index + words.split(' ').length, this.tokens.length - 1);
    return true;
  }

  /** Takes the words if they come next; where they do not they only help to find the nearest. */
  take(words: string): boolean {
    const split = words.split(' ');
    if (split.every((word, ahead) => this.isAt(word, ahead))) {
      this.index = Math.min(this.index + split.length, this.tokens.length - 1);
      return true;
    }
    this.forget();
    if (this.index === this.furthest) this.candidates.add(split[0]!);
    return false;
  }

  /** Takes the words, or ends the phrase with what was expected. */
  expect(words: string): void {
    for (const word of words.split(' ')) {
      if (!this.accept(word)) this.fail();
    }
  }

  /** Takes the first of several words that comes next. */
  oneOf<const T extends string>(choices: readonly T[]): T | undefined {
    return choices.find((choice) => this.accept(choice));
  }

  /** Could a name be `ahead` places on? */
  isName(ahead = 0): boolean {
    const token = this.peek(ahead);
    return token.kind === 'word' && (!RESERVED.has(token.text) || FREE_WORDS.includes(token.text));
  }

  name(what: string): NameRef {
    if (!this.isName()) {
      this.remember(what);
      this.fail();
    }
    const token = this.next();
    return { name: token.text, at: this.spanOf(token) };
  }

  remember(expected: string): void {
    if (this.index < this.furthest) return;
    this.forget();
    this.tried.add(expected);
  }

  /** What was tried at an earlier token is of no use any more. */
  private forget(): void {
    if (this.index <= this.furthest) return;
    this.furthest = this.index;
    this.tried = new Set();
    this.candidates = new Set();
  }

  /** Goes back to an earlier token, for forms that only their end tells apart. */
  mark(): number {
    return this.index;
  }

  /** Reads what is nested, within the cap. */
  nested<T>(read: () => T): T {
    this.depth++;
    if (this.depth > DEEPEST_NESTING) {
      this.report('tooDeep', this.spanOf(this.peek()), 'parentheses nested too deep');
    }
    const result = read();
    this.depth--;
    return result;
  }

  spanOf(token: Token): SourceSpan {
    return { file: this.file, start: token.start, end: token.end };
  }

  /** From the token at `mark` to the last one taken. */
  since(mark: number): SourceSpan {
    const first = this.tokens[mark]!;
    const last = this.tokens[Math.max(mark, this.index - 1)]!;
    return { file: this.file, start: first.start, end: last.end };
  }

  /** Nothing may be left over. */
  finish(): void {
    if (this.peek().kind === 'end') return;
    this.remember('the end of the phrase');
    this.fail();
  }

  /** Ends the phrase: the next token is out of place. */
  fail(): never {
    const found = diagnose(this.tokens, this.index, [...this.tried], [...this.candidates]);
    const at = this.tokens[found.token]!;
    const last = this.tokens[found.lastToken ?? found.token]!;
    this.report(
      found.code,
      { file: this.file, start: at.start, end: last.end },
      found.message,
      found,
    );
  }

  /** Ends the phrase with a problem of its own. */
  report(code: ProblemCode, at: SourceSpan, message: string, more?: Particulars): never {
    this.problems.report(code, at, message, more);
    throw new PhraseFailed();
  }

  /** Reports and reads on: the phrase is understood, only its value is wrong. */
  warn(code: ProblemCode, at: SourceSpan, message: string, more?: Particulars): void {
    this.problems.report(code, at, message, more);
  }
}
