import type {
  Condition,
  DrawDecl,
  NameRef,
  OperatorDecl,
  PhaseDecl,
  PlaceDecl,
  Quantity,
  RuleDecl,
  RulesFile,
  Source,
  TableDecl,
  ValueDecl,
} from '../ast.js';
import type { ProblemList } from '../problems.js';
import { LONGEST_TABLE, MOST_RULES } from './caps.js';
import { condition } from './conditions.js';
import { belt, draw, operator, phase, place, value } from './declarations.js';
import { NameList } from './names.js';
import { type Entry, type Lines, type OutlineNode, type Phrased, readOutline } from './outline.js';
import type { ReadFile } from './parseRules.js';
import { pathBeside } from './paths.js';
import type { Phrase } from './phrase.js';
import { decode, readable } from './readable.js';
import { keysOf, phraseOf, readPhrase, spanOf } from './reading.js';
import { readRule } from './ruleReader.js';
import { readTable } from './table.js';

const SECTIONS = [
  'title',
  'belt',
  'include',
  'values',
  'operator',
  'tables',
  'draws',
  'places',
  'phases',
  'rules',
  'end',
] as const;
const SHARED_SECTIONS = ['values', 'places'] as const;
const LONGEST_TITLE = 200;

/** Turns the outline of a rules file into its syntax tree. */
export class FileReader {
  /** Names whose phrase could not be read. */
  readonly broken = new Set<string>();
  private readonly names: NameList;

  constructor(
    private readonly sources: Source[],
    private readonly problems: ProblemList,
    private readonly read: ReadFile,
  ) {
    this.names = new NameList(problems);
  }

  file(outline: Lines): RulesFile {
    const keys = keysOf(outline, SECTIONS, this.problems, 'a rules file');
    for (const key of ['title', 'belt', 'rules'] as const) {
      if (keys.has(key)) continue;
      const at = { file: 0, start: outline.at.start, end: outline.at.start };
      this.problems.report('missingKey', at, `there is no \`${key}:\``);
    }
    const shared = this.included(keys.get('include'));
    const values = [...shared.values, ...this.values(keys.get('values'))];
    const sharedPlaces = shared.places;
    const operators = this.section(
      keys.get('operator'),
      (name, entry): OperatorDecl | undefined => {
        const read = this.phrase(
          entry.value,
          operator,
          'a choice such as `20 to 140 cm, at first 45 cm`',
        );
        return read && { name, ...read, at: spanOf(entry) };
      },
    );
    const tables = this.section(keys.get('tables'), (name, entry) => this.table(name, entry));
    const draws = this.section(keys.get('draws'), (name, entry): DrawDecl | undefined => {
      const read = this.phrase(entry.value, draw, 'a draw such as `stim or sham, every lap`');
      return read && { name, ...read, at: spanOf(entry) };
    });
    const places = [...sharedPlaces, ...this.places(keys.get('places'))];
    const phases = this.section(keys.get('phases'), (name, entry): PhaseDecl | undefined => {
      const read = this.phrase(entry.value, phase, 'a phase such as `for 20 laps`');
      return read && { name, ...read, at: spanOf(entry) };
    });
    const written = keys.get('rules')?.value;
    if (written?.kind === 'lines' && written.entries.length > MOST_RULES) {
      const at = keys.get('rules')!.keyAt;
      this.problems.report('tooMany', at, `more than ${MOST_RULES} rules`);
    }
    const rules = this.section(keys.get('rules'), (name, entry): RuleDecl | undefined =>
      readRule(name, entry, this.sources, this.problems),
    );
    if (keys.has('rules') && rules.length === 0 && !this.problems.failed) {
      this.problems.report('missingKey', keys.get('rules')!.keyAt, 'there is no rule');
    }
    const end = this.optional(keys.get('end'), condition, 'a condition such as `time >= 60 min`');
    return {
      sources: this.sources,
      title: this.title(keys.get('title')),
      beltLengthCm: this.belt(keys.get('belt')),
      values,
      operator: operators,
      tables,
      draws,
      places,
      phases,
      rules,
      ...(end ? { end } : {}),
    };
  }

  private phrase<T>(node: OutlineNode, read: (p: Phrase) => T, what: string): T | undefined {
    return readPhrase(node, this.sources, this.problems, read, what);
  }

  private optional(
    entry: Entry | undefined,
    read: (p: Phrase) => Condition,
    what: string,
  ): Condition | undefined {
    return entry && this.phrase(entry.value, read, what);
  }

  private title(entry: Entry | undefined): string {
    if (!entry) return '';
    const node = phraseOf(entry.value, this.problems, 'a title');
    if (!node) return '';
    if (node.text.length > LONGEST_TITLE) {
      this.problems.report('tooLarge', node.at, `a title of more than ${LONGEST_TITLE} letters`);
    }
    if (node.comment !== undefined) {
      const at = { ...node.at, start: node.comment, end: node.comment + 1 };
      this.problems.report(
        'textLost',
        at,
        `the title is read as \`${node.text}\`: what follows is a comment`,
        {
          expected: 'quotes around the title if the rest belongs to it',
        },
      );
    }
    return node.text.trim().replace(/\s+/g, ' ');
  }

  private belt(entry: Entry | undefined): Quantity {
    const at = entry?.value.at ?? { file: 0, start: 0, end: 0 };
    const none: Quantity = {
      kind: 'quantity',
      value: Number.NaN,
      dimension: 'length',
      written: '',
      at,
    };
    return (entry && this.phrase(entry.value, belt, 'a length such as `180 cm`')) ?? none;
  }

  private values(entry: Entry | undefined): ValueDecl[] {
    return this.section(entry, (name, line) => {
      const read = this.phrase(line.value, value, 'an amount such as `4 uL`');
      return read && { name, value: read, at: spanOf(line) };
    });
  }

  private places(entry: Entry | undefined): PlaceDecl[] {
    return this.section(entry, (name, line) => {
      const read = this.phrase(line.value, place, 'a place such as `45 cm` or `85 to 95 cm`');
      return read && { name, place: read, at: spanOf(line) };
    });
  }

  private section<T>(
    section: Entry | undefined,
    read: (name: NameRef, entry: Entry) => T | undefined,
  ): T[] {
    if (!section) return [];
    if (section.value.kind !== 'lines') {
      this.problems.report(
        'linesExpected',
        section.keyAt,
        `\`${section.key}:\` has no lines of its own`,
        {
          expected: 'indented lines below it, each `name: phrase`',
        },
      );
      return [];
    }
    const found: T[] = [];
    for (const entry of section.value.entries) {
      const name = this.names.declare(entry.key, entry.keyAt, section.key);
      if (this.problems.full) break;
      // A line whose name is refused is still read, so that its own mistakes are told too.
      const result = read(name ?? { name: entry.key, at: entry.keyAt }, entry);
      if (result && name) found.push(result);
      else this.broken.add(entry.key);
    }
    return found;
  }

  private included(entry: Entry | undefined): Pick<RulesFile, 'values' | 'places'> {
    const none = { values: [], places: [] };
    const text = entry && phraseOf(entry.value, this.problems, 'a file name');
    if (!text) return none;
    const source = this.load(text, ['.yaml', '.yml']);
    if (source === undefined) return none;
    const outline = readOutline(this.sources[source]!.text, source, this.problems);
    if (!outline) return none;
    const keys = keysOf(outline, SHARED_SECTIONS, this.problems, 'an included file');
    return { values: this.values(keys.get('values')), places: this.places(keys.get('places')) };
  }

  private table(name: NameRef, entry: Entry): TableDecl | undefined {
    const text = phraseOf(entry.value, this.problems, 'a file name such as `earned.csv`');
    if (!text) return undefined;
    const source = this.load(text, ['.csv'], LONGEST_TABLE);
    if (source === undefined) return undefined;
    const rows = readTable(this.sources[source]!.text, source, this.problems);
    return rows && { name, file: { name: text.text, at: text.at }, rows, at: spanOf(entry) };
  }

  /** Reads a file beside this one; its index among the sources, or undefined after a problem. */
  private load(text: Phrased, ending: readonly string[], longest?: number): number | undefined {
    const owner = this.sources[text.at.file]!.path;
    const found = pathBeside(owner, text.text, ending);
    if ('why' in found) {
      this.problems.report('badPath', text.at, found.why);
      return undefined;
    }
    let content: string;
    try {
      const raw = this.read(found.path);
      if (raw === undefined) throw new Error('there is no such file');
      content = decode(raw);
    } catch (error) {
      const why = error instanceof Error ? error.message : String(error);
      this.problems.report('unreadableFile', text.at, `\`${text.text}\` cannot be read: ${why}`);
      return undefined;
    }
    const index = this.sources.push({ path: found.path, text: content }) - 1;
    return readable(content, index, this.problems, longest) ? index : undefined;
  }
}
