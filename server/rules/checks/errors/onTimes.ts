import type { ActionBody } from '../../ast.js';
import { formatQuantity } from '../../units.js';
import type { Check, CheckContext } from '../check.js';
import { intervalOf } from '../interval.js';

/** Actions longer than their output's longest on-time, and pulses as long as their period. */
export const onTimes: Check = (context) => {
  for (const { body } of context.file.rules.flatMap((rule) => rule.do)) {
    if (body.kind === 'give') volume(context, body);
    if (body.kind === 'hold') {
      onTime(
        context,
        body.output.name,
        intervalOf(body.until.upTo, context.symbols).high,
        body.until.upTo.at,
      );
    }
    if (body.kind === 'pulse') pulse(context, body);
  }
};

type Pulse = ActionBody & { kind: 'pulse' };

function pulse(context: CheckContext, body: Pulse): void {
  const { high } = intervalOf(body.width, context.symbols);
  onTime(context, body.output.name, high, body.width.at);
  const rate = body.train && intervalOf(body.train.rate, context.symbols);
  if (!rate || !(rate.high > 0) || !(high * rate.high >= 1e6)) return;
  const period = formatQuantity(1e6 / rate.high, 'time');
  context.problems.report(
    'pulseFillsPeriod',
    body.width.at,
    `a pulse of ${formatQuantity(high, 'time')} every ${period}`,
    {
      expected: `less than ${period}`,
      also: [{ at: body.train!.rate.at, note: 'the rate' }],
    },
  );
}

function onTime(
  { symbols, problems }: CheckContext,
  name: string,
  us: number,
  at: Pulse['at'],
): void {
  const output = symbols.output(name);
  if (!output || !(us > output.longestOnUs) || !Number.isFinite(us)) return;
  const longest = formatQuantity(output.longestOnUs, 'time');
  problems.report('actionTooLong', at, `\`${name}\` may be on for ${longest} at most`, {
    expected: `${longest} or less`,
  });
}

/** A volume that the valve's calibration does not reach cannot be trusted, nor one beyond its time. */
function volume({ symbols, problems }: CheckContext, body: ActionBody & { kind: 'give' }): void {
  const output = symbols.valve(body.from);
  const line = output?.valve;
  const { low, high } = intervalOf(body.volume, symbols);
  if (output && !line) {
    problems.report(
      'volumeOutOfRange',
      body.volume.at,
      `\`${output.name}\` is not calibrated yet`,
      {
        expected: 'a valve that was calibrated: `lapwing calibrate valve`',
      },
    );
  }
  if (!line || !output || !Number.isFinite(low) || !Number.isFinite(high)) return;
  const range = `${formatQuantity(line.leastNl, 'volume')} to ${formatQuantity(line.mostNl, 'volume')}`;
  if (low < line.leastNl || high > line.mostNl) {
    problems.report(
      'volumeOutOfRange',
      body.volume.at,
      `\`${output.name}\` is calibrated for ${range}`,
      {
        expected: range,
      },
    );
  } else if (line.deadUs + high * line.usPerNl > output.longestOnUs) {
    const longest = formatQuantity(output.longestOnUs, 'time');
    problems.report(
      'actionTooLong',
      body.volume.at,
      `\`${output.name}\` may be on for ${longest} at most`,
      {
        expected: 'a smaller volume',
      },
    );
  }
}
