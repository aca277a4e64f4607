import type { RulesFile, Source } from '../ast.js';
import { inOrder, type Problem, ProblemList } from '../problems.js';
import { FileReader } from './fileReader.js';
import { readOutline } from './outline.js';
import { decode, type FileContent, readable } from './readable.js';

/** Gives the content of a file; throws, or gives undefined, when it cannot be read. */
export type ReadFile = (path: string) => FileContent | undefined;

export interface Parsed {
  /** The rules; absent when anything is wrong. */
  readonly file?: RulesFile;
  /** What could be read, for further checks; absent when there is no outline. */
  readonly draft?: RulesFile;
  /** Names that are declared, though their phrase could not be read. */
  readonly broken: ReadonlySet<string>;
  readonly problems: readonly Problem[];
  /** All that was read, for printing the problems. */
  readonly sources: readonly Source[];
}

/**
 * Parses a rules file and everything that it brings in. Never throws; every problem at once.
 * @param content the file's text, or how files are read: then also included files and tables are
 */
export function parseRules(path: string, content: string | ReadFile): Parsed {
  const problems = new ProblemList();
  const sources: Source[] = [];
  const read: ReadFile = typeof content === 'function' ? content : () => undefined;
  const finish = (draft?: RulesFile, broken: ReadonlySet<string> = new Set()): Parsed => ({
    ...(draft && !problems.failed ? { file: draft } : {}),
    ...(draft ? { draft } : {}),
    broken,
    problems: inOrder(problems.problems),
    sources,
  });
  let text: string;
  try {
    text = decode((typeof content === 'function' ? content(path) : content) ?? missing());
  } catch (error) {
    sources.push({ path, text: '' });
    const why = error instanceof Error ? error.message : String(error);
    problems.report('unreadableFile', { file: 0, start: 0, end: 0 }, `cannot be read: ${why}`);
    return finish();
  }
  sources.push({ path, text });
  if (!readable(text, 0, problems)) return finish();
  const outline = readOutline(text, 0, problems);
  if (!outline) return finish();
  const reader = new FileReader(sources, problems, read);
  return finish(reader.file(outline), reader.broken);
}

function missing(): never {
  throw new Error('there is no such file');
}
