/** The rules language's colours in the editor: a guide for the eye, not a parser. */
import {
  HighlightStyle,
  StreamLanguage,
  type StringStream,
  syntaxHighlighting,
} from '@codemirror/language';
import { tags } from '@lezer/highlight';
import { FREE_WORDS, RESERVED } from '../../server/rules/text/words.js';
import { UNITS } from '../../server/rules/units.js';

const WORDS = new Set([...RESERVED, ...FREE_WORDS].filter((word) => !(word in UNITS)));

interface LineState {
  /** The key of the line: what follows `title:` is no phrase. */
  key: string;
  /** A number came last, and a unit may follow. */
  afterNumber: boolean;
}

/** The kind of the next piece of a line; null for what has none. */
function token(stream: StringStream, state: LineState): string | null {
  if (stream.sol()) {
    state.key = '';
    state.afterNumber = false;
    stream.match(/^\s*(- )?/);
    const key = stream.match(/^([A-Za-z][A-Za-z0-9_]*)(?=\s*:(\s|$))/) as RegExpMatchArray | null;
    if (key) {
      state.key = key[1]!;
      const indent = stream.indentation();
      if (indent === 0) return 'heading';
      return indent <= 2 ? 'variableName.definition' : 'propertyName';
    }
  }
  if (stream.eatSpace()) return null;
  if (stream.peek() === '#' && /(^|\s)$/.test(stream.string.slice(0, stream.pos))) {
    stream.skipToEnd();
    return 'comment';
  }
  if (state.key === 'title' || state.key === 'include') {
    if (stream.match(/^:/)) return 'punctuation';
    stream.match(/^[^#]+/) || stream.next();
    return 'string';
  }
  const { afterNumber } = state;
  state.afterNumber = false;
  if (stream.match(/^\d+(st|nd|rd|th)\b/)) return 'number';
  if (stream.match(/^\d+(\.\d+)?/)) {
    state.afterNumber = true;
    return 'number';
  }
  if (stream.match(/^(<=|>=|[<>+*/≤≥-])/)) {
    return 'operator';
  }
  const word = stream.match(/^([A-Za-zµμ][A-Za-z0-9_µμ]*(\/[a-z]+)?|%)/) as RegExpMatchArray | null;
  if (word) {
    const text = word[0].replace(/[µμ]/g, 'u');
    if (afterNumber && text in UNITS) return 'unit';
    if (text in UNITS) return 'unit';
    const bare = text.split('/')[0]!;
    if (bare !== text) stream.backUp(text.length - bare.length);
    return WORDS.has(bare) ? 'keyword' : 'variableName';
  }
  stream.next();
  return null;
}

const rulesLanguage = StreamLanguage.define<LineState>({
  name: 'rules',
  startState: () => ({ key: '', afterNumber: false }),
  copyState: (state) => ({ ...state }),
  token,
  languageData: { commentTokens: { line: '#' } },
});

/** Weight and slant carry the difference too: in the red theme the colours are all red. */
const colours = HighlightStyle.define([
  { tag: tags.heading, color: 'var(--ink)', fontWeight: '700' },
  { tag: tags.definition(tags.variableName), color: 'var(--accent)', fontWeight: '600' },
  { tag: tags.propertyName, color: 'var(--soft)', fontWeight: '600' },
  { tag: tags.keyword, color: 'var(--ink)' },
  { tag: tags.variableName, color: 'var(--accent)' },
  { tag: [tags.number, tags.unit], color: 'var(--water)' },
  { tag: tags.operator, color: 'var(--ink)' },
  { tag: tags.string, color: 'var(--ink)' },
  { tag: tags.comment, color: 'var(--soft)', fontStyle: 'italic' },
]);

export const rules = [rulesLanguage, syntaxHighlighting(colours)];
