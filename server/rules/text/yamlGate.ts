import { CST, Lexer } from 'yaml';
import type { ProblemList } from '../problems.js';
import { WIDEST_INDENT } from './caps.js';

/** What of YAML a rules file has no use for, with the reason. */
const REFUSED: Readonly<Partial<Record<CST.TokenType, string>>> = {
  anchor: 'anchors (`&name`) are not allowed: give the value a name under `values`',
  alias: 'aliases (`*name`) are not allowed: use a name from `values`',
  tag: 'tags (`!name`) are not allowed: to say not, write `not`',
  'explicit-key-ind': 'keys that begin with `?` are not allowed',
  'flow-map-start': '`{ }` is not allowed: write one line for each key, indented',
  'flow-seq-start': '`[ ]` is not allowed: write one line for each action, beginning with `- `',
  'block-scalar-header': '`|` and `>` are not allowed: a phrase may go on over indented lines',
  'doc-end': '`...` is not allowed: a file holds one session',
  'directive-line': 'directives (`%`) are not allowed',
};

/**
 * Refuses the parts of YAML that a rules file has no use for, from YAML's own tokens and before
 * anything is built from them: no alias is ever followed, and nothing nests beyond the cap.
 * @returns false after reporting each
 */
export function onlyPlainYaml(text: string, file: number, problems: ProblemList): boolean {
  let offset = 0;
  let passed = true;
  let content = false;
  let lineStart = true;
  let colons = 0;
  let dashes = 0;
  const refuse = (
    length: number,
    code: 'yamlNotAllowed' | 'yamlSyntax' | 'tooDeep',
    why: string,
  ) => {
    problems.report(code, { file, start: offset, end: offset + length }, why);
    passed = false;
  };
  for (const lexeme of new Lexer().lex(text)) {
    const type = CST.tokenType(lexeme);
    // These stand for themselves and take no room in the text.
    if (lexeme === CST.DOCUMENT || lexeme === CST.SCALAR || lexeme === CST.FLOW_END) continue;
    if (type === 'newline') {
      colons = 0;
      dashes = 0;
    }
    if (type === 'doc-start') {
      if (content) refuse(3, 'yamlNotAllowed', 'a second document: a file holds one session');
      content = true;
    } else if (type !== null && type in REFUSED) {
      refuse(lexeme.length, 'yamlNotAllowed', REFUSED[type]!);
    } else if (type === 'map-value-ind' && ++colons === 2) {
      refuse(1, 'yamlSyntax', 'a second colon in one line: no phrase needs one');
    } else if (type === 'seq-item-ind' && ++dashes === 2) {
      refuse(1, 'tooDeep', 'a list within a list');
    } else if (type === 'space' && lineStart && lexeme.length > WIDEST_INDENT) {
      refuse(lexeme.length, 'tooDeep', `a line indented by more than ${WIDEST_INDENT} spaces`);
    }
    if (!['newline', 'space', 'comment', 'doc-start', 'directive-line'].includes(type ?? ''))
      content = true;
    lineStart = type === 'newline';
    offset += lexeme.length;
    if (problems.full) break;
  }
  return passed;
}
