import { UNITS } from '../units.js';

/** A word, number or sign of one phrase, with offsets into its file. */
export interface Token {
  readonly kind: 'word' | 'number' | 'quantity' | 'ordinal' | 'sign' | 'bad' | 'end';
  /** As written, but `µ` as `u`, and `≤` `≥` as `<=` `>=`. */
  readonly text: string;
  readonly start: number;
  readonly end: number;
  /** A number's value as written, an ordinal's rank. */
  readonly value: number;
  /** A quantity's unit. */
  readonly unit: string;
}

const UNIT_NAMES = Object.keys(UNITS).sort((a, b) => b.length - a.length);
const SPACE = /[ \t\r\n\u00a0\u202f]*/y;
const NUMBER = /\d+(?:\.\d+)?/y;
const ORDINAL = /(\d+)(?:st|nd|rd|th)(?![A-Za-z0-9_])/y;
const WORD = /[\p{L}_][\p{L}\p{N}_]*/uy;
// Two-letter forms first. Those that are no part of the language are read whole, so that the
// problem can show the right form.
const SIGN = /<=|>=|≤|≥|\.\.\.|\.\.|==|!=|&&|\|\||<>|[<>(),+\-*/%=!.:;?[\]{}|&^~#@$'"]/y;

/**
 * Splits a phrase into tokens; never throws: what cannot be read becomes a `bad` token.
 * @param text the whole file
 * @param start offset at which the phrase begins
 * @param end offset after its last letter
 */
export function lex(text: string, start: number, end: number): Token[] {
  const tokens: Token[] = [];
  const match = (pattern: RegExp, at: number): string | undefined => {
    pattern.lastIndex = at;
    const found = pattern.exec(text);
    return found && at + found[0].length <= end ? found[0] : undefined;
  };
  const push = (kind: Token['kind'], from: number, to: number, value = 0, unit = ''): number => {
    tokens.push({ kind, text: plain(text.slice(from, to)), start: from, end: to, value, unit });
    return to;
  };
  let at = start;
  for (;;) {
    at += match(SPACE, at)?.length ?? 0;
    if (at >= end) break;
    const rank = match(ORDINAL, at);
    if (rank) {
      at = push('ordinal', at, at + rank.length, Number.parseInt(rank, 10));
      continue;
    }
    const number = match(NUMBER, at);
    if (number) {
      const after = at + number.length;
      const unitAt = after + (match(SPACE, after)?.length ?? 0);
      const unit = unitAfter(text, unitAt, end);
      const kind = unit === '' ? 'number' : 'quantity';
      at = push(kind, at, unit === '' ? after : unitAt + unit.length, Number(number), unit);
      continue;
    }
    const word = match(WORD, at);
    if (word) {
      at = push('word', at, at + word.length);
      continue;
    }
    const sign = match(SIGN, at);
    if (sign) {
      at = push('sign', at, at + sign.length);
      continue;
    }
    // A whole character, not half of a surrogate pair.
    const length = text.codePointAt(at)! > 0xffff ? 2 : 1;
    at = push('bad', at, Math.min(end, at + length));
  }
  push('end', end, end);
  return tokens;
}

function plain(text: string): string {
  if (text === '≤') return '<=';
  if (text === '≥') return '>=';
  return text.replace(/[µμ]/g, 'u');
}

/** The unit that stands at an offset and ends there, or nothing. */
function unitAfter(text: string, at: number, end: number): string {
  const window = plain(text.slice(at, Math.min(end, at + 5)));
  for (const unit of UNIT_NAMES) {
    if (!window.startsWith(unit)) continue;
    const next = window[unit.length];
    if (unit !== '%' && next !== undefined && /[\p{L}\p{N}_]/u.test(next)) continue;
    return unit;
  }
  return '';
}
