import { nearestName } from '../nearestName.js';
import type { ProblemCode } from '../problemCodes.js';
import { UNITS } from '../units.js';
import type { Token } from './lexer.js';
import { FREE_WORDS, RESERVED, SPELLED_ORDINALS } from './words.js';

export interface Diagnosis {
  readonly code: ProblemCode;
  readonly message: string;
  readonly expected?: string | undefined;
  readonly nearest?: string | undefined;
  /** Index of the token to underline, and of the last when there are several. */
  readonly token: number;
  readonly lastToken?: number;
}

/** Signs of other notations, each with the form that the language has for it. */
const RIGHT_FORMS: Readonly<Record<string, string>> = {
  '..': 'for a range say `to`: `85 to 95 cm`',
  '...': 'for a range say `to`: `85 to 95 cm`',
  '–': 'for a range say `to`: `85 to 95 cm`; for minus write ` - `',
  '—': 'for a range say `to`: `85 to 95 cm`; for minus write ` - `',
  '−': 'for minus write ` - `, with a space on each side',
  '=': 'say `is`: `lap is 5`',
  '==': 'say `is`: `lap is 5`',
  ':': 'no phrase needs a colon: say `is`',
  '!=': 'say `is not`: `lap is not 5`',
  '<>': 'say `is not`: `lap is not 5`',
  '≠': 'say `is not`: `lap is not 5`',
  '!': 'say `not`: `not in zone`',
  '&': 'say `and`',
  '&&': 'say `and`',
  '|': 'say `or`',
  '||': 'say `or`',
  ';': 'several actions are a list below `do:`, one line each beginning with `- `',
  '%': 'for a remainder say `is a multiple of`: `lap is a multiple of 10`',
  '^': 'there are no powers',
  '×': 'write `*`',
  '÷': 'write `/`',
};

/** Words that a phrase may begin with. */
const FIRST_WORDS = [
  'reaches',
  'enters',
  'leaves',
  'every',
  'operator',
  'lick',
  'give',
  'pulse',
  'hold',
  'stop',
  'until',
  'after',
  'still',
  'position',
  'speed',
  'phase',
];

/** Words that people write for a unit. */
const UNIT_WORDS: Readonly<Record<string, string>> = Object.assign(Object.create(null), {
  sec: 's',
  secs: 's',
  second: 's',
  seconds: 's',
  msec: 'ms',
  msecs: 'ms',
  millisecond: 'ms',
  milliseconds: 'ms',
  minute: 'min',
  minutes: 'min',
  mins: 'min',
  hour: 'h',
  hours: 'h',
  hr: 'h',
  hrs: 'h',
  ul: 'uL',
  ml: 'mL',
  nl: 'nL',
  microliters: 'uL',
  microlitres: 'uL',
  hz: 'Hz',
  khz: 'kHz',
  percent: '%',
  centimetres: 'cm',
  centimeters: 'cm',
});

/** Says what is wrong at a token out of place, with the right form where the mistake is known. */
export function diagnose(
  tokens: readonly Token[],
  index: number,
  tried: readonly string[],
  candidates: readonly string[],
): Diagnosis {
  const token = tokens[index]!;
  const before = tokens[index - 1];
  const after = tokens[index + 1];
  const wrong = (expected: string, first = index, last = index): Diagnosis => ({
    code: 'wrongForm',
    message: `\`${written(tokens, first, last)}\` is not a form of this language`,
    expected,
    token: first,
    lastToken: last,
  });
  const sign = token.kind === 'sign' || token.kind === 'bad';
  if (sign && token.text === ',' && touching(before, token) && touching(token, after)) {
    if (before?.kind === 'number' && (after?.kind === 'number' || after?.kind === 'quantity')) {
      return wrong(`a decimal point: \`${before.text}.${after.text}\``, index - 1, index + 1);
    }
  }
  if (sign && token.text === '%' && before?.kind === 'number') {
    return wrong(RIGHT_FORMS['%']!, index - 1, index);
  }
  const right = sign ? RIGHT_FORMS[token.text] : undefined;
  if (right) return wrong(right);
  if (before?.kind === 'quantity' && before.unit === '%' && token.kind === 'number') {
    return wrong(RIGHT_FORMS['%']!, index - 1, index);
  }
  // `third` alone reads as a name, so that only the word after it is out of place.
  const rank = token.text === 'lick' && before ? SPELLED_ORDINALS.get(before.text) : undefined;
  if (rank) return wrong(`\`${rank} lick\``, index - 1, index);
  if (token.kind === 'word' && ['AND', 'OR', 'NOT', 'And', 'Or', 'Not'].includes(token.text)) {
    return wrong(`\`${token.text.toLowerCase()}\`: capitals count`);
  }
  if (before?.kind === 'number' && token.kind === 'word' && !known(token.text)) {
    return unknownUnit(token, index);
  }
  if (index === 1 && before?.kind === 'word' && !known(before.text)) {
    // A first word that was taken for a name may be a misspelt word of the language.
    const nearest = nearestName(before.text, FIRST_WORDS);
    if (nearest) {
      const message = `\`${before.text}\` is out of place`;
      return { code: 'unexpectedWord', message, nearest, token: 0 };
    }
  }
  return outOfPlace(token, index, tried, candidates);
}

function unknownUnit(token: Token, index: number): Diagnosis {
  const units = Object.keys(UNITS);
  const nearest = UNIT_WORDS[token.text.toLowerCase()] ?? nearestName(token.text, units);
  return {
    code: 'unknownUnit',
    message: `\`${token.text}\` is not a unit`,
    expected: `one of ${units.join(' ')}`,
    nearest,
    token: index,
  };
}

function outOfPlace(
  token: Token,
  index: number,
  tried: readonly string[],
  candidates: readonly string[],
): Diagnosis {
  const found = token.kind === 'end' ? 'the phrase ends too soon' : undefined;
  const reserved =
    token.kind === 'word' && known(token.text) && tried.some((text) => text.startsWith('a name'));
  const words = tried
    .filter((text) => text.startsWith('`'))
    .map((text) => text.slice(1, -1).split(' ')[0]!);
  return {
    code: 'unexpectedWord',
    message:
      found ??
      (reserved
        ? `\`${token.text}\` is a word of the language and cannot be a name`
        : `\`${token.text}\` is out of place`),
    expected: alternatives(tried),
    nearest: token.kind === 'word' ? nearestName(token.text, [...words, ...candidates]) : undefined,
    token: index,
  };
}

/** `A, B or C`, the first dozen. */
function alternatives(tried: readonly string[]): string | undefined {
  if (tried.length === 0) return undefined;
  const shown = tried.slice(0, 12);
  if (tried.length > shown.length) return `${shown.join(', ')}, ...`;
  if (shown.length === 1) return shown[0];
  return `${shown.slice(0, -1).join(', ')} or ${shown.at(-1)}`;
}

const known = (word: string): boolean => RESERVED.has(word) || FREE_WORDS.includes(word);

function touching(a: Token | undefined, b: Token | undefined): boolean {
  return a !== undefined && b !== undefined && a.end === b.start;
}

function written(tokens: readonly Token[], first: number, last: number): string {
  return tokens
    .slice(first, last + 1)
    .map((token) => token.text)
    .join('');
}
