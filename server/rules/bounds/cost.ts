import type { Action } from '../ast.js';
import { intervalOf } from '../checks/interval.js';
import type { Symbols } from '../checks/symbols.js';
import type { OutputFacts } from '../facts.js';

/** The most that one action of one firing can cost; Infinity where nothing bounds it. */
export interface Cost {
  readonly output: OutputFacts | undefined;
  /** The output as the file calls it. */
  readonly name: string;
  readonly pulses: number;
  readonly onUs: number;
  /** From first rise to last fall. */
  readonly lastsUs: number;
  /** Share of that time that the output is on. */
  readonly share: number;
  /** Shortest time from a fall to the next rise; Infinity with one pulse. */
  readonly gapUs: number;
  readonly volumeNl: number;
}

/** What an action drives; undefined for actions that drive nothing. */
export function costOf({ body }: Action, symbols: Symbols): Cost | undefined {
  const most = (sum: Parameters<typeof intervalOf>[0]): number => intervalOf(sum, symbols).high;
  const once = { pulses: 1, share: 1, gapUs: Infinity, volumeNl: 0 };
  if (body.kind === 'give') {
    const output = symbols.valve(body.from);
    const volumeNl = most(body.volume);
    const onUs = output?.valve ? output.valve.deadUs + volumeNl * output.valve.usPerNl : 0;
    const name = output?.name ?? body.from?.name ?? 'the valve';
    return { ...once, output, name, onUs, lastsUs: onUs, volumeNl };
  }
  if (body.kind === 'hold') {
    const { name } = body.output;
    const onUs = most(body.until.upTo);
    return { ...once, output: symbols.output(name), name, onUs, lastsUs: onUs };
  }
  if (body.kind !== 'pulse') return undefined;
  const { name } = body.output;
  const output = symbols.output(name);
  const widthUs = most(body.width);
  if (!body.train) return { ...once, output, name, onUs: widthUs, lastsUs: widthUs };
  const rate = intervalOf(body.train.rate, symbols);
  const periodUs = 1e6 / rate.high;
  const pulses = body.train.times
    ? most(body.train.times)
    : Math.ceil((most(body.train.until!.upTo) * rate.high) / 1e6);
  const lastsUs = body.train.times
    ? (pulses - 1) * (1e6 / rate.low) + widthUs
    : most(body.train.until!.upTo);
  const gapUs = pulses > 1 ? periodUs - widthUs : Infinity;
  return {
    output,
    name,
    pulses,
    onUs: pulses * widthUs,
    lastsUs,
    share: widthUs / periodUs,
    gapUs,
    volumeNl: 0,
  };
}
