import type { Action, NameRef, RuleDecl, Source, When } from '../ast.js';
import type { ProblemList } from '../problems.js';
import { MOST_ACTIONS } from './caps.js';
import { condition } from './conditions.js';
import type { Entry, OutlineNode } from './outline.js';
import type { Phrase } from './phrase.js';
import { keysOf, readPhrase, spanOf } from './reading.js';
import { action, asked, chance, limit, when, within } from './rulePhrases.js';

const RULE_KEYS = ['when', 'if', 'chance', 'sham', 'do', 'limit', 'within', 'asked'] as const;

/**
 * Reads one rule. A key that cannot be read is reported and left out, so that the rest is still
 * checked; the caller knows from the problems that the rule is no whole one.
 */
export function readRule(
  name: NameRef,
  entry: Entry,
  sources: readonly Source[],
  problems: ProblemList,
): RuleDecl | undefined {
  if (entry.value.kind !== 'lines') {
    problems.report(
      'linesExpected',
      entry.keyAt,
      `the rule \`${entry.key}\` has no lines of its own`,
      {
        expected: 'indented lines below it, `when:` and `do:` at least',
      },
    );
    return undefined;
  }
  const keys = keysOf(entry.value, RULE_KEYS, problems, 'a rule');
  const read = <T>(
    key: (typeof RULE_KEYS)[number],
    as: (p: Phrase) => T,
    what: string,
  ): T | undefined => {
    const line = keys.get(key);
    return line && readPhrase(line.value, sources, problems, as, what);
  };
  for (const key of ['when', 'do'] as const) {
    if (!keys.has(key)) {
      problems.report('missingKey', entry.keyAt, `the rule \`${entry.key}\` has no \`${key}:\``);
    }
  }
  const moment = read('when', when, 'a moment such as `reaches 90 cm`');
  const unread: When = { kind: 'begins', what: 'session', at: entry.keyAt };
  const needed = read('if', condition, 'a condition such as `speed > 5 cm/s`');
  const odds = read('chance', chance, 'a share such as `50 %`');
  const pretended = read('sham', condition, 'a condition such as `kind is sham`');
  const caps = read('limit', limit, 'limits such as `1 per lap, 10 per session`');
  const window = read('within', within, 'a distance or a time, such as `1 cm` or `50 ms`');
  const wishes = read('asked', asked, '`now`, `in the next 5 laps`, or both with `or`');
  const actions = keys.get('do');
  return {
    name,
    when: moment ?? unread,
    ...(needed ? { if: needed } : {}),
    ...(odds ? { chance: odds } : {}),
    ...(pretended ? { sham: pretended } : {}),
    do: actions ? readActions(actions.value, sources, problems) : [],
    limits: caps ?? [],
    ...(window ? { within: window } : {}),
    ...(wishes ? { asked: wishes } : {}),
    at: spanOf(entry),
  };
}

/** `do` alone may be a list. */
function readActions(
  node: OutlineNode,
  sources: readonly Source[],
  problems: ProblemList,
): Action[] {
  const items = node.kind === 'list' ? node.items : [node];
  if (items.length > MOST_ACTIONS) {
    problems.report('tooMany', node.at, `more than ${MOST_ACTIONS} actions in one rule`);
    return [];
  }
  const actions: Action[] = [];
  for (const item of items) {
    const read = readPhrase(item, sources, problems, action, 'an action such as `give 4 uL`');
    if (read) actions.push(read);
  }
  return actions;
}
