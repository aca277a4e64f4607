import type { Action, NameRef } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { usesOf } from '../uses.js';

/** Outputs, inputs and valves that the rig lacks. */
export const rigNames: Check = (context) => {
  const { file, rig } = context;
  if (!rig) return;
  const inputs = rig.inputs.map(({ name }) => name);
  const valves = rig.outputs.filter(({ kind }) => kind === 'valve').map(({ name }) => name);
  const others = rig.outputs.filter(({ kind }) => kind !== 'valve').map(({ name }) => name);
  for (const { ref, as } of usesOf(file)) {
    if (as === 'input' && !inputs.includes(ref.name)) lacks(context, ref, 'input', inputs);
    if (as === 'valve' && !valves.includes(ref.name)) lacks(context, ref, 'valve', valves);
    if (as !== 'output') continue;
    if (valves.includes(ref.name)) {
      context.problems.report('wrongKind', ref.at, `\`${ref.name}\` is a valve`, {
        expected: `a volume: \`give 4 uL from ${ref.name}\``,
      });
    } else if (!others.includes(ref.name)) lacks(context, ref, 'output', others);
  }
  for (const action of file.rules.flatMap((rule) => rule.do)) checkValve(context, action, valves);
};

function lacks(
  { problems }: CheckContext,
  ref: NameRef,
  what: string,
  known: readonly string[],
): void {
  const expected =
    known.length === 0 ? `the rig has no ${what}` : `one of the rig's: ${known.join(', ')}`;
  problems.unknown(
    'rigLacks',
    ref.at,
    `the rig has no ${what} \`${ref.name}\``,
    ref.name,
    known,
    expected,
  );
}

/** `give 4 uL` alone needs a rig with one valve. */
function checkValve({ problems }: CheckContext, { body }: Action, valves: readonly string[]): void {
  if (body.kind !== 'give' || body.from || valves.length === 1) return;
  const [first] = valves;
  problems.report('rigLacks', body.at, first ? 'from which valve?' : 'the rig has no valve', {
    expected: first ? `one of the rig's valves: \`from ${first}\`` : 'a rig with a valve',
  });
}
