import { costOf } from '../../bounds/cost.js';
import { formatQuantity } from '../../units.js';
import type { Check } from '../check.js';
import { intervalOf } from '../interval.js';

/** Limits beyond the rig's: its guard says no before the rule's own limit does. */
export const limitBeyondRig: Check = ({ file, rig, symbols, problems }) => {
  if (!rig) return;
  for (const rule of file.rules) {
    for (const action of rule.do) {
      const cost = costOf(action, symbols);
      const output = cost?.output;
      if (!cost || !output) continue;
      if (output.perSession !== undefined && cost.pulses > output.perSession) {
        problems.report('limitBeyondRig', action.at, `one firing has ${cost.pulses} pulses`, {
          expected: `the rig allows \`${output.name}\` ${output.perSession} a session`,
        });
      }
      if (cost.gapUs < output.leastGapUs) {
        problems.report(
          'limitBeyondRig',
          action.at,
          `${formatQuantity(cost.gapUs, 'time')} between pulses`,
          {
            expected: `the rig wants ${formatQuantity(output.leastGapUs, 'time')} at least`,
          },
        );
      }
      for (const cap of rule.limits) {
        const count =
          cap.kind === 'per' && cap.per === 'session' ? intervalOf(cap.count, symbols).low : 0;
        if (output.perSession !== undefined && cost.pulses * count > output.perSession) {
          problems.report(
            'limitBeyondRig',
            cap.at,
            `${count} firings have ${cost.pulses * count} pulses`,
            {
              expected: `the rig allows \`${output.name}\` ${output.perSession} a session`,
            },
          );
        }
        if (cap.kind !== 'apart time') continue;
        const apart = intervalOf(cap.time, symbols).high;
        if (apart < output.leastGapUs) {
          problems.report('limitBeyondRig', cap.at, `${formatQuantity(apart, 'time')} apart`, {
            expected: `the rig wants ${formatQuantity(output.leastGapUs, 'time')} between pulses of \`${output.name}\``,
          });
        }
      }
    }
  }
};
