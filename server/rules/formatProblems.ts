import type { Source, SourceSpan } from './ast.js';
import type { Problem } from './problems.js';

export interface FormatOptions {
  /** Colours for a terminal (ANSI, ECMA-48 SGR). */
  readonly color?: boolean;
  /** Letters of a source line shown at most. */
  readonly width?: number;
}

export interface LineColumn {
  /** From 1. */
  readonly line: number;
  /** From 1, in UTF-16 units, as editors count. */
  readonly column: number;
}

/** Line and column of an offset. */
export function lineColumn(text: string, offset: number): LineColumn {
  let line = 1;
  let start = 0;
  for (;;) {
    const newline = text.indexOf('\n', start);
    if (newline < 0 || newline >= offset) return { line, column: offset - start + 1 };
    line++;
    start = newline + 1;
  }
}

/**
 * Prints problems for people: `file:line:column`, the line with its words underlined, what was
 * expected, the nearest known name, the other place involved. Ends without a newline.
 * @param sources those of the parsed file, that the problems' offsets count in
 */
export function formatProblems(
  problems: readonly Problem[],
  sources: readonly Source[],
  options: FormatOptions = {},
): string {
  return problems.map((problem) => formatProblem(problem, sources, options)).join('\n\n');
}

function formatProblem(
  problem: Problem,
  sources: readonly Source[],
  { color = false, width = 100 }: FormatOptions,
): string {
  const paint = painter(color);
  const tone = problem.severity === 'error' ? '31' : '33';
  const severity = paint(tone, problem.severity);
  const lines = [
    `${paint('1', placeOf(problem.at, sources))}: ${severity}: ${problem.message} [${problem.code}]`,
    ...excerpt(problem.at, sources, width, (marks) => paint(tone, marks)),
  ];
  if (problem.expected !== undefined) lines.push(`  expected: ${problem.expected}`);
  if (problem.nearest !== undefined) lines.push(`  nearest: ${paint('1', problem.nearest)}`);
  for (const { at, note } of problem.also ?? []) {
    lines.push(`  ${placeOf(at, sources)}: ${note}`);
    lines.push(...excerpt(at, sources, width, (marks) => paint('36', marks)));
  }
  return lines.join('\n');
}

function painter(color: boolean): (code: string, text: string) => string {
  return (code, text) => (color ? `\u001b[${code}m${text}\u001b[0m` : text);
}

function placeOf(at: SourceSpan, sources: readonly Source[]): string {
  const source = sources[at.file];
  if (!source) return '?';
  const { line, column } = lineColumn(source.text, at.start);
  return `${source.path}:${line}:${column}`;
}

/** The line of the problem and the underline; of a span over several lines, the first. */
function excerpt(
  at: SourceSpan,
  sources: readonly Source[],
  width: number,
  paint: (marks: string) => string,
): string[] {
  const source = sources[at.file];
  if (!source || source.text === '') return [];
  const { text } = source;
  const { line } = lineColumn(text, at.start);
  // A start of -1 would be taken for 0.
  const start = at.start === 0 ? 0 : text.lastIndexOf('\n', at.start - 1) + 1;
  const newline = text.indexOf('\n', start);
  const end = newline < 0 ? text.length : newline;
  const full = text
    .slice(start, end)
    .replace(/\r$/, '')
    .replace(/[\t\u00a0\u202f]/g, ' ');
  const from = at.start - start;
  const to = Math.max(from + 1, Math.min(at.end, end) - start);
  // Of a long line, the part around the words.
  const cut = full.length > width ? Math.max(0, Math.min(from - 20, full.length - width)) : 0;
  const shown = full.slice(cut, cut + width);
  const before = cut > 0 ? '...' : '';
  const after = cut + width < full.length ? '...' : '';
  const marks = '^'.repeat(Math.max(1, Math.min(to, cut + width) - from));
  const gutter = String(line);
  return [
    `  ${gutter} | ${before}${printable(shown)}${after}`,
    `  ${' '.repeat(gutter.length)} | ${' '.repeat(before.length + from - cut)}${paint(marks)}`,
  ];
}

/** No control character of a hostile file reaches the terminal. */
function printable(text: string): string {
  // biome-ignore lint/suspicious/noControlCharactersInRegex: they are what is replaced
  return text.replace(/[\u0000-\u001f\u007f-\u009f\u2028-\u202e\u2066-\u2069\ufeff]/g, '\ufffd');
}
