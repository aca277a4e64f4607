import {
  isMap,
  isScalar,
  isSeq,
  type Node,
  type Pair,
  parseDocument,
  type Scalar,
  type YAMLError,
} from 'yaml';
import type { SourceSpan } from '../ast.js';
import type { ProblemList } from '../problems.js';
import { onlyPlainYaml } from './yamlGate.js';

/** The outline of a file: YAML without anything that a rules file does not need, order kept. */
export type OutlineNode = Phrased | Lines | Listed | Nothing;
export interface Phrased {
  readonly kind: 'phrase';
  /** Without quotes. */
  readonly at: SourceSpan;
  /** Lines folded, as YAML reads it. */
  readonly text: string;
  readonly quoted: boolean;
  /** Where a comment begins on the phrase's own last line. */
  readonly comment: number | undefined;
}
export interface Lines {
  readonly kind: 'lines';
  readonly at: SourceSpan;
  readonly entries: readonly Entry[];
}
export interface Listed {
  readonly kind: 'list';
  readonly at: SourceSpan;
  readonly items: readonly OutlineNode[];
}
export interface Nothing {
  readonly kind: 'nothing';
  readonly at: SourceSpan;
}
export interface Entry {
  readonly key: string;
  readonly keyAt: SourceSpan;
  readonly value: OutlineNode;
}

/**
 * Reads the outline from YAML's syntax tree: never through a JavaScript object, which would reorder
 * the keys `1:` and `2:` and know `__proto__`.
 * @returns undefined when it cannot be read at all; the problems say why
 */
export function readOutline(text: string, file: number, problems: ProblemList): Lines | undefined {
  if (!onlyPlainYaml(text, file, problems)) return undefined;
  const document = parseDocument(text, {
    schema: 'failsafe',
    uniqueKeys: false,
    prettyErrors: false,
    logLevel: 'silent',
  });
  for (const error of document.errors) reportYaml(error, text, file, problems);
  if (document.errors.length > 0) return undefined;
  const reader = new OutlineReader(text, file, problems);
  const root = reader.node(document.contents, 0);
  if (root.kind === 'lines') return root;
  problems.report('missingKey', { file, start: 0, end: 0 }, 'there are no sections', {
    expected: '`title:`, `belt:` and `rules:`',
  });
  return undefined;
}

const PLAIN_ERRORS: Readonly<Record<string, string>> = {
  TAB_AS_INDENT: 'a tab: indent with spaces',
  BAD_INDENT: 'this line is not indented like its neighbours',
  BLOCK_AS_IMPLICIT_KEY: 'a second colon in one line: no phrase needs one',
  MULTILINE_IMPLICIT_KEY: 'a line without a colon where `name: phrase` was expected',
  BAD_SCALAR_START: 'a phrase cannot begin with this sign',
  BAD_DQ_ESCAPE: 'escapes are not allowed',
};

function reportYaml(error: YAMLError, text: string, file: number, problems: ProblemList): void {
  const [start, end] = error.pos;
  const message = PLAIN_ERRORS[error.code] ?? `the outline cannot be read here: ${error.message}`;
  const last = Math.min(text.length, Math.max(start + 1, end));
  problems.report('yamlSyntax', { file, start: Math.min(start, text.length), end: last }, message);
}

class OutlineReader {
  constructor(
    private readonly text: string,
    private readonly file: number,
    private readonly problems: ProblemList,
  ) {}

  node(node: Node | null, offset: number): OutlineNode {
    const [start, end] = node?.range ?? [offset, offset];
    const at = { file: this.file, start, end };
    if (isMap(node)) {
      const entries: Entry[] = [];
      for (const pair of node.items as Pair<Node, Node | null>[]) {
        const entry = this.entry(pair, start);
        if (entry) entries.push(entry);
      }
      return { kind: 'lines', at: { ...at, end: this.trimmed(start, end) }, entries };
    }
    if (isSeq(node)) {
      const items = (node.items as Node[]).map((item) => this.node(item, start));
      return { kind: 'list', at: { ...at, end: this.trimmed(start, end) }, items };
    }
    if (isScalar(node)) return this.phrase(node, at);
    return { kind: 'nothing', at };
  }

  private entry(pair: Pair<Node, Node | null>, offset: number): Entry | undefined {
    const key = pair.key;
    const start = key?.range?.[0] ?? offset;
    const end = key?.range?.[1] ?? start;
    const keyAt = {
      file: this.file,
      start,
      end: Math.max(end, Math.min(start + 1, this.text.length)),
    };
    if (!isScalar(key) || String(key.value) === '') {
      this.problems.report('yamlSyntax', keyAt, 'expected `name: phrase`');
      return undefined;
    }
    return { key: String(key.value), keyAt, value: this.node(pair.value, end) };
  }

  private phrase(node: Scalar, at: SourceSpan): OutlineNode {
    const quote = this.text[at.start];
    const quoted = node.type === 'QUOTE_SINGLE' || node.type === 'QUOTE_DOUBLE';
    const text = String(node.value);
    if (!quoted) {
      const comment = this.commentAfter(at.end);
      if (at.end <= at.start) return { kind: 'nothing', at };
      return { kind: 'phrase', at, text, quoted, comment };
    }
    const inner = { ...at, start: at.start + 1, end: Math.max(at.start + 1, at.end - 1) };
    const raw = this.text.slice(inner.start, inner.end);
    const escaped = raw.indexOf(quote === "'" ? "''" : '\\');
    if (escaped >= 0) {
      const start = inner.start + escaped;
      this.problems.report(
        'yamlNotAllowed',
        { ...at, start, end: start + 2 },
        'escapes are not allowed',
      );
    }
    if (raw.trim() === '') return { kind: 'nothing', at };
    return { kind: 'phrase', at: inner, text, quoted, comment: undefined };
  }

  private commentAfter(end: number): number | undefined {
    const newline = this.text.indexOf('\n', end);
    const rest = this.text.slice(end, newline < 0 ? undefined : newline);
    return /^\s+#/.test(rest) ? end + rest.indexOf('#') : undefined;
  }

  /** An end without the blank lines and comments that YAML counts to what stands before them. */
  private trimmed(start: number, end: number): number {
    let last = end;
    while (last > start && /\s/.test(this.text[last - 1]!)) last--;
    return last;
  }
}
