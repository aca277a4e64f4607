import type { StampedDecision } from '../../server/session/decisions.js';
import type { OperatorAct } from '../../server/session/inputs.js';
import { fixed, plural } from './format.js';
import { endWords } from './phase.js';

export type Tone = 'plain' | 'good' | 'warn' | 'bad' | 'stim' | 'water' | 'faint';

export interface Told {
  readonly text: string;
  readonly tone: Tone;
}

const say = (text: string, tone: Tone = 'plain'): Told => ({ text, tone });

/** One event as a sentence for the list of recent events; `kindOf` says what an output is for. */
export function eventWords(
  event: StampedDecision,
  kindOf: (output: string | null) => string | undefined = () => undefined,
): Told {
  switch (event.kind) {
    case 'session began':
      return say(`Session began: ${event.title} (seed ${event.seed})`, 'good');
    case 'session ended':
      return say(`Session ended${because(event.reason)}`, 'warn');
    case 'lap began':
      return say(`Lap ${event.lap} began`, 'faint');
    case 'seam':
      return seamWords(event.event, event.slipMm);
    case 'trust':
      return say(
        `Position ${event.trust}${because(event.reason)}`,
        event.trust === 'trusted' ? 'good' : 'warn',
      );
    case 'lick':
      return say(event.artefact ? 'Lick, perhaps an artefact' : 'Lick', 'faint');
    case 'lick sensor':
      return say(`Lick sensor ${event.state}`, event.state === 'released' ? 'good' : 'bad');
    case 'asked':
      return say(`${event.rule} was asked of the board`, 'faint');
    case 'armed':
      return say(`${event.rule} is armed${atPlace(event.placeCm)}`, 'faint');
    case 'disarmed':
      return say(`${event.rule} was disarmed: ${event.reason}`, 'faint');
    case 'fired':
      return firedWords(event, kindOf(event.output));
    case 'pulse done':
      return say(pulseWords(event), 'faint');
    case 'withheld':
      return say(`${event.rule} was withheld: ${event.reason}`, 'warn');
    case 'missed':
      return say(`${event.rule} was missed: ${event.reason}`, 'warn');
    case 'refused':
      return say(`${event.rule} was refused by the board: ${event.reason}`, 'bad');
    case 'uncertain':
      return say(
        `${event.rule} may have fired, and is charged as if it had: ${event.reason}`,
        'bad',
      );
    case 'drawn':
      return say(`Drawn: ${event.draw} is ${event.value} (${event.scope} ${event.index})`, 'faint');
    case 'phase began':
      return say(`Phase ${event.phase} began${because(event.reason)}`, 'good');
    case 'field predicted':
      return say(fieldWords(event), 'stim');
    case 'cell began':
      return say(`Cell ${event.index} began`, 'good');
    case 'note':
      return say(noteWords(event));
    case 'end foreseen':
      return say(`The end is near: ${endWords(event) ?? ''} (${event.reason})`, 'warn');
    case 'choice':
      return say(
        event.state === 'in force'
          ? `${event.name} counts as changed`
          : `The board is armed by ${event.name} as changed`,
        'good',
      );
    case 'alarm':
      return event.state === 'raised'
        ? say(`Alarm: ${event.text}`, event.level === 'bad' ? 'bad' : 'warn')
        : say(`Over: ${event.text}`, 'good');
    case 'operator':
      return say(`${event.who || event.from}: ${actWords(event.act)}`);
    case 'link':
      return say(
        `Board link ${event.state}${because(event.reason)}`,
        event.state === 'down' ? 'bad' : 'good',
      );
    case 'board fault':
      return say(`The board reports a fault: ${event.fault} (${event.detail})`, 'bad');
    case 'frames lost':
      return say(`${plural(event.frames, 'frame')} lost: ${event.why}`, 'warn');
    default:
      // A newer loop may tell of more than this page knows.
      return say(String((event as { kind: string }).kind), 'faint');
  }
}

function seamWords(event: string, slipMm: number | null): Told {
  const slip = slipMm === null ? '' : `, slip ${fixed(slipMm, 1)} mm`;
  if (event === 'first') return say(`First seam mark${slip}`, 'good');
  if (event === 'accepted') return say(`Seam mark${slip}`, 'faint');
  if (event === 'missed') return say('Seam mark missed', 'warn');
  if (event === 'rehomed')
    return say(`Two seam marks agreed elsewhere: position set anew${slip}`, 'warn');
  return say(`Seam mark ignored, far from where it should be${slip}`, 'warn');
}

function firedWords(
  event: Extract<StampedDecision, { kind: 'fired' }>,
  outputKind: string | undefined,
): Told {
  if (event.sham)
    return say(`${event.rule}: sham firing${atPlace(event.riseCm ?? event.placeCm)}`, 'stim');
  const how = event.armed ? 'by the board' : 'by the host';
  const error = event.errorMm === null ? '' : `, ${fixed(event.errorMm, 1)} mm off`;
  const place = atPlace(event.riseCm ?? event.placeCm);
  const driven = outputKind === 'valve' ? 'water' : 'stim';
  const tone = event.output === null ? 'plain' : driven;
  const output = event.output === null ? '' : ` (${event.output})`;
  return say(`${event.rule} fired${output}${place}${error}, ${how}`, tone);
}

function noteWords({ text, mark }: Extract<StampedDecision, { kind: 'note' }>): string {
  if (!mark) return `Note: ${text}`;
  return text === '' ? `Mark ${mark}` : `Mark ${mark}: ${text}`;
}

function fieldWords(event: Extract<StampedDecision, { kind: 'field predicted' }>): string {
  const { rule, peakCm, widthCm, shiftCm } = event;
  const side = shiftCm < 0 ? 'after' : 'before';
  return (
    `${rule} is predicted to leave a field ${fixed(widthCm, 0)} cm wide that peaks at ` +
    `${fixed(peakCm, 0)} cm, ${fixed(Math.abs(shiftCm), 0)} cm ${side} the onset`
  );
}

function pulseWords(event: Extract<StampedDecision, { kind: 'pulse done' }>): string {
  const volume = event.volumeNl > 0 ? `, ${fixed(event.volumeNl / 1000, 1)} µL` : '';
  const why = ['', 'none'].includes(event.reason) ? '' : ` (${event.reason})`;
  return `${event.output} off after ${fixed(event.onUs / 1000, 1)} ms${volume}${why}`;
}

function because(reason: string): string {
  return reason === '' ? '' : `: ${reason}`;
}

function atPlace(cm: number | null): string {
  return cm === null ? '' : ` at ${fixed(cm, 1)} cm`;
}

function controlsWords(holder: string | null, before: string | null): string {
  if (holder === null) return `gave up the controls${before === null ? '' : ` that ${before} had`}`;
  if (holder === before) return `${holder} holds the controls`;
  return before === null ? 'took the controls' : `took the controls from ${before}`;
}

/** An operator's act, as others read it. */
export function actWords(act: OperatorAct): string {
  switch (act.act) {
    case 'press':
      return `pressed ${act.button}`;
    case 'choose':
      return `set ${act.name} to ${act.value}`;
    case 'hold':
      return act.on ? `holds the ${act.what}` : `released the ${act.what}`;
    case 'phase':
      return `asked for phase: ${act.to}`;
    case 'new cell':
      return 'began the next cell';
    case 'exclude lap':
      return `excluded lap ${act.lap}`;
    case 'note':
      return `note: ${act.text}`;
    case 'mark':
      return 'made a mark';
    case 'ask':
      return act.laps === 0
        ? `asked for ${act.rule} now`
        : `asked for ${act.rule} in the next ${plural(act.laps, 'lap')}`;
    case 'withdraw':
      return `took back ${act.rule}`;
    case 'put off':
      return `put off the end by ${act.laps > 0 ? plural(act.laps, 'lap') : `${act.minutes} min`}`;
    case 'acknowledge':
      return act.alarm === 'all' ? 'saw the alarms' : `saw the alarm: ${act.alarm}`;
    case 'stop everything':
      return 'stopped everything';
    case 'allow stimulation':
      return 'allowed stimulation';
    case 'hand on belt':
      return act.on ? 'put a hand on the belt' : 'took the hand off the belt';
    case 'controls':
      return controlsWords(act.holder, act.before);
    case 'end':
      return `ended the session: ${act.reason}`;
    default:
      return (act as { act: string }).act;
  }
}
