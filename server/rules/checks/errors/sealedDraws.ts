import type { DrawDecl, RuleDecl } from '../../ast.js';
import { blindedIn, isSealed } from '../../sealed.js';
import type { Check, CheckContext } from '../check.js';
import { usesIn, usesOf } from '../uses.js';
import { walk } from '../walk.js';

/** A sealed draw decides between real and sham, and nothing that can be told from the outside. */
export const sealedDraws: Check = (context) => {
  const sealed = context.file.draws.filter(isSealed);
  const [first, second] = sealed;
  if (first === undefined) return;
  for (const draw of sealed) form(context, draw);
  if (second) {
    context.problems.report('sealedForm', second.name.at, 'a second sealed draw', {
      expected: 'one: an allocation has one arm for a session',
      also: [{ at: first.name.at, note: 'the first' }],
    });
  }
  uses(context, first);
  for (const rule of blindedIn(context.file)) {
    noWater(context, rule);
    noCount(context, rule);
  }
};

function form({ problems, symbols }: CheckContext, draw: DrawDecl): void {
  const words = draw.choices.kind === 'options' && symbols.yields(draw.choices).kind === 'word';
  if (!words || (draw.choices.kind === 'options' && draw.choices.options.length < 2)) {
    problems.report('sealedForm', draw.choices.at, 'not a choice of words', {
      expected: '`stim or sham`',
    });
  }
  if (draw.every.kind !== 'session') {
    problems.report('sealedForm', draw.every.at, 'an arm is of a whole session', {
      expected: '`every session`',
    });
  }
  for (const habit of draw.habits) {
    if (habit.kind === 'sealed') continue;
    problems.report('sealedForm', habit.at, 'the allocation decides, not chance here', {
      expected: '`sealed` alone',
    });
  }
}

/** Only `sham` may turn on it: what is done then looks the same. */
function uses({ file, problems }: CheckContext, draw: DrawDecl): void {
  const allowed = new Set(
    file.rules.flatMap(({ sham }) => usesIn(sham ?? []).map(({ ref }) => ref.at)),
  );
  for (const { ref } of usesOf(file)) {
    if (ref.name !== draw.name.name || allowed.has(ref.at)) continue;
    problems.report('sealedSeen', ref.at, 'what turns on it here would show the arm', {
      expected: `it in \`sham:\` alone, \`sham: ${ref.name} is ...\``,
      also: [{ at: draw.name.at, note: 'sealed here' }],
    });
  }
}

function noWater({ problems }: CheckContext, rule: RuleDecl): void {
  for (const action of rule.do) {
    if (action.body.kind !== 'give') continue;
    problems.report('sealedSeen', action.at, 'water is always counted and shown', {
      expected: 'an arm that decides about a stimulus, and water in a rule of its own',
    });
  }
}

/** `real firings of R`, `sham firings of R` and the field that it induced tell which it was. */
function noCount({ file, problems }: CheckContext, { name }: RuleDecl): void {
  walk([file.rules, file.phases, file.end ?? []], (node) => {
    const of = node.of as { name?: string } | undefined;
    if (of?.name !== name.name || !node.at) return;
    const tells = node.kind === 'predicted' || (node.kind === 'firings' && node.which !== 'all');
    if (!tells) return;
    problems.report('sealedSeen', node.at, `this tells what ${name.name} was`, {
      expected: `\`firings of ${name.name}\`, real and sham together`,
    });
  });
}
