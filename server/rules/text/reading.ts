/** What every section is read with: keys, phrases, places. */
import type { Source, SourceSpan } from '../ast.js';
import { nearestName } from '../nearestName.js';
import type { ProblemList } from '../problems.js';
import { LONGEST_PHRASE } from './caps.js';
import type { Entry, Lines, OutlineNode, Phrased } from './outline.js';
import { Phrase, PhraseFailed } from './phrase.js';

/** Keys of one level, each once; unknown and doubled ones are reported. */
export function keysOf<T extends string>(
  lines: Lines,
  known: readonly T[],
  problems: ProblemList,
  where: string,
): Map<T, Entry> {
  const found = new Map<T, Entry>();
  for (const entry of lines.entries) {
    const key = known.find((name) => name === entry.key);
    if (key === undefined) {
      const merge = entry.key === '<<';
      problems.report(
        merge ? 'yamlNotAllowed' : 'unknownKey',
        entry.keyAt,
        merge
          ? 'merge keys (`<<`) are not allowed'
          : `\`${entry.key.slice(0, 64)}\` is no key of ${where}`,
        { expected: `one of ${known.join(', ')}`, nearest: nearestName(entry.key, known) },
      );
      continue;
    }
    const first = found.get(key);
    if (first) {
      problems.report('doubledKey', entry.keyAt, `\`${key}\` is written twice`, {
        also: [{ at: first.keyAt, note: 'first written here' }],
      });
      continue;
    }
    found.set(key, entry);
  }
  return found;
}

/** Reads one phrase with a function of the grammar; undefined after a problem. */
export function readPhrase<T>(
  node: OutlineNode,
  sources: readonly Source[],
  problems: ProblemList,
  read: (phrase: Phrase) => T,
  what: string,
): T | undefined {
  const text = phraseOf(node, problems, what);
  if (!text) return undefined;
  const { file, start, end } = text.at;
  try {
    const phrase = new Phrase(file, sources[file]!.text, start, end, problems);
    const result = read(phrase);
    phrase.finish();
    return result;
  } catch (error) {
    if (error instanceof PhraseFailed) return undefined;
    throw error;
  }
}

/** The node as a phrase, or undefined after saying what stands in its place. */
export function phraseOf(
  node: OutlineNode,
  problems: ProblemList,
  what: string,
): Phrased | undefined {
  if (node.kind !== 'phrase') {
    const found = { lines: 'indented lines', list: 'a list', nothing: 'nothing' }[node.kind];
    const { start } = node.at;
    const at = { ...node.at, end: Math.min(node.at.end, start + 40) };
    problems.report('phraseExpected', at, `${found} where a phrase belongs`, { expected: what });
    return undefined;
  }
  if (node.at.end - node.at.start > LONGEST_PHRASE) {
    problems.report('tooLarge', node.at, `a phrase of more than ${LONGEST_PHRASE} letters`);
    return undefined;
  }
  return node;
}

/** A whole `name: phrase` line. */
export function spanOf(entry: Entry): SourceSpan {
  return { ...entry.keyAt, end: Math.max(entry.keyAt.end, entry.value.at.end) };
}
