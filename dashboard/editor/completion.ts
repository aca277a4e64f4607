/** What may come next: keys from the schema, words of the grammar, and names that are there. */
import type { Completion, CompletionContext, CompletionResult } from '@codemirror/autocomplete';
import schema from '../../server/rules/rules.schema.json' with { type: 'json' };
import { FREE_WORDS, RESERVED } from '../../server/rules/text/words.js';
import { UNITS } from '../../server/rules/units.js';
import type { RigNames } from '../../server/web/rules/rulesMessages.js';

interface Described {
  readonly description?: string;
}

const SECTIONS = keysOf(schema.properties);
const RULE_KEYS = keysOf(schema.properties.rules.additionalProperties.properties);
const UNIT_WORDS = Object.keys(UNITS).map((label): Completion => ({ label, type: 'unit' }));
const WORDS = [...new Set([...RESERVED, ...FREE_WORDS])]
  .filter((word) => !(word in UNITS) && word.length > 1)
  .map((label): Completion => ({ label, type: 'keyword' }));

function keysOf(properties: Record<string, Described>): Completion[] {
  return Object.entries(properties).map(([key, { description }]) => ({
    label: key,
    apply: `${key}: `,
    type: 'property',
    ...(description === undefined ? {} : { info: description }),
  }));
}

/** Names declared in a text: the keys of lines one step in, with their section. */
export function namesIn(text: string): { readonly name: string; readonly section: string }[] {
  const found: { name: string; section: string }[] = [];
  let section = '';
  let step = 0;
  for (const line of text.split('\n')) {
    const [, indent = '', key] = /^( *)([A-Za-z][A-Za-z0-9_]*)\s*:(?:\s|$)/.exec(line) ?? [];
    if (key === undefined) continue;
    if (indent === '') {
      section = key;
      step = 0;
      continue;
    }
    step ||= indent.length;
    if (indent.length === step) found.push({ name: key, section });
  }
  return found;
}

/** The section that a line of a text is in, or '' at the top. */
function sectionAt(text: string, upTo: number): string {
  return [...text.slice(0, upTo).matchAll(/^([A-Za-z]+)\s*:/gm)].at(-1)?.[1] ?? '';
}

/** Gives the completions for a cursor; `rig` has the names of outputs and inputs. */
export function complete(
  context: CompletionContext,
  rig: RigNames | undefined,
): CompletionResult | null {
  const { state, pos, explicit } = context;
  const line = state.doc.lineAt(pos);
  const before = line.text.slice(0, pos - line.from);
  if (/(^|\s)#/.test(before)) return null;
  const word = /[A-Za-z0-9_]*$/.exec(before)![0];
  const from = pos - word.length;
  const lead = before.slice(0, before.length - word.length);
  if (word === '' && !explicit) return null;
  const text = state.doc.toString();
  if (/^ *$/.test(lead)) {
    if (lead === '') return { from, options: SECTIONS, validFor: /^\w*$/ };
    if (lead.length > 2 && sectionAt(text, line.from) === 'rules') {
      return { from, options: RULE_KEYS, validFor: /^\w*$/ };
    }
    // A name of the writer's own choice.
    return null;
  }
  if (/^ *(title|include)\s*:/.test(before)) return null;
  if (/\d\s*$/.test(lead) && !/^\d/.test(word)) {
    return { from, options: UNIT_WORDS, validFor: /^[A-Za-z]*$/ };
  }
  if (/^\d/.test(word)) return null;
  const own = namesIn(text).map(({ name, section }): Completion => {
    return { label: name, type: 'variable', detail: `in ${section}`, boost: 2 };
  });
  const outputs = (rig?.outputs ?? []).map(({ name, kind }): Completion => {
    return { label: name, type: 'variable', detail: kind, boost: 1 };
  });
  const inputs = (rig?.inputs ?? []).map((label): Completion => {
    return { label, type: 'variable', detail: 'input', boost: 1 };
  });
  const named = new Map([...WORDS, ...inputs, ...outputs, ...own].map((one) => [one.label, one]));
  return { from, options: [...named.values()], validFor: /^\w*$/ };
}
