import { whyNotArmed } from './armable.js';
import type { DrawDecl, PhaseDecl, RuleDecl, RulesFile, Sum } from './ast.js';
import { bounds, type RuleBounds, type SessionBounds } from './bounds/sessionBounds.js';
import { phasesOf } from './checks/course.js';
import { intervalOf } from './checks/interval.js';
import { resolve, type Symbols } from './checks/symbols.js';
import { usesIn, usesOf } from './checks/uses.js';
import { MOST_PUT_OFF_LAPS, MOST_PUT_OFF_MIN } from './engine/ending.js';
import type { RigFacts } from './facts.js';
import { printChoices, printCourse, printHabit, printOccasion, printSpot } from './print.js';
import { printAction, printAsked, printCap, printWhen } from './printRule.js';
import { printCondition, printSum } from './printSum.js';
import { formatQuantity } from './units.js';

/**
 * Says in plain words what a file will do: phase by phase, each rule with its numbers, what the rig
 * must provide, which rules the board starts by itself, and the most that a session can deliver.
 * @param file a file without errors
 */
export function explain(file: RulesFile, rig?: RigFacts): string {
  const symbols = resolve(file, rig);
  const most = bounds(file, rig);
  const sections = [
    `${file.title}\nOn a belt of ${file.beltLengthCm.written}.`,
    course(file, symbols),
    chance(file, symbols),
    steering(file, symbols),
    rules(file, symbols, most),
    needs(file, symbols),
    delivery(most),
  ];
  return `${sections.filter((text) => text !== '').join('\n\n')}\n`;
}

function titled(title: string, lines: readonly string[]): string {
  return lines.length === 0 ? '' : [title, ...lines.map((line) => `  ${line}`)].join('\n');
}

// ---- the course ----------------------------------------------------------------------------

function course(file: RulesFile, symbols: Symbols): string {
  const lines: string[] = [];
  if (file.phases.length === 0) lines.push('One stretch without phases.');
  file.phases.forEach((phase, index) => {
    const next = file.phases[index + 1];
    lines.push(
      `${index + 1}. ${phase.name.name}: ${coursePhrase(phase)}, then ${next ? next.name.name : 'the session ends'}.`,
    );
    for (const rule of rulesIn(file, phase))
      lines.push(`   - ${rule.name.name}: ${inPhase(rule, phase, symbols)}`);
  });
  lines.push(
    file.end
      ? `The session ends when ${printCondition(file.end)}.`
      : 'Nothing else ends the session but the operator.',
  );
  return titled('Phase by phase', lines);
}

function coursePhrase(phase: PhaseDecl): string {
  const words = printCourse(phase);
  const whole = words.startsWith('for ') ? words.replace(/ laps?\b/, ' whole laps') : words;
  return phase.atLapEnd ? `${whole}, and on to the end of that lap` : whole;
}

function rulesIn(file: RulesFile, phase: PhaseDecl): readonly RuleDecl[] {
  return file.rules.filter((rule) => phasesOf(rule, file).includes(phase));
}

/** The moment and the actions, with what the names come to in this phase. */
function inPhase(rule: RuleDecl, phase: PhaseDecl, symbols: Symbols): string {
  const actions = rule.do.map(printAction).join(', ');
  const numbers = numbersOf([rule.when, rule.do], symbols, phase.name.name);
  return `${printWhen(rule.when)}: ${actions}${numbers}`;
}

/** ` (spot is 60 cm)` for every value and place that a piece names. */
function numbersOf(piece: unknown, symbols: Symbols, phase?: string): string {
  const names = new Set(usesIn(piece).map(({ ref }) => ref.name));
  const known = [...names].flatMap((name) => {
    const worth = worthOf(name, symbols, phase);
    return worth === undefined ? [] : [`${name} is ${worth}`];
  });
  return known.length === 0 ? '' : ` (${known.join(', ')})`;
}

function worthOf(name: string, symbols: Symbols, phase?: string): string | undefined {
  const symbol = symbols.get(name);
  if (symbol?.kind === 'draw') return `drawn: ${printChoices(symbol.decl.choices)}`;
  if (symbol?.kind === 'choice')
    return `chosen by the operator: ${printChoices(symbol.decl.choices)}`;
  if (symbol?.kind !== 'place' && symbol?.kind !== 'value') return undefined;
  const { base, exceptions } = symbol.kind === 'place' ? symbol.decl.place : symbol.decl.value;
  if (phase === undefined && exceptions.length > 0) return 'not the same in every phase';
  const here =
    exceptions.find(({ phases }) => phases.some((ref) => ref.name === phase))?.value ?? base;
  if ('from' in here && !('kind' in here)) {
    const edges = [here.from, ...(here.to ? [here.to] : [])].map((sum) =>
      number(sum, symbols, phase),
    );
    return edges.includes(undefined) ? printSpot(here) : edges.join(' to ');
  }
  return number(here as Sum, symbols, phase) ?? printSum(here as Sum);
}

/** An amount that is one number, printed; undefined when it varies. */
function number(sum: Sum, symbols: Symbols, phase?: string): string | undefined {
  if (sum.kind === 'quantity') return sum.written;
  const { low, high } = intervalOf(sum, symbols, phase);
  if (low !== high) return undefined;
  const names = usesIn({ sum });
  const isLength = names.some(({ ref }) => symbols.get(ref.name)?.kind === 'place');
  return isLength ? formatQuantity(low, 'length') : undefined;
}

// ---- chance and the operator ----------------------------------------------------------------

function chance(file: RulesFile, symbols: Symbols): string {
  return titled(
    "Drawn from the session's seed",
    file.draws.map((draw) => drawPhrase(draw, symbols)),
  );
}

function drawPhrase(draw: DrawDecl, symbols: Symbols): string {
  const every =
    draw.every.kind === 'visit' || draw.every.kind === 'firing'
      ? printOccasion(draw)
      : draw.every.kind;
  const habits = draw.habits.map((habit) => `; ${printHabit(habit)}`).join('');
  const kind = symbols.yields(draw.choices).kind;
  const between = draw.choices.kind === 'between' ? 'anything from ' : '';
  const what = kind === 'word' ? 'one of ' : between;
  return `${draw.name.name}: ${what}${printChoices(draw.choices)}, a new one with every ${every}${habits}.`;
}

function steering(file: RulesFile, symbols: Symbols): string {
  const lines = file.operator.map(({ name, choices, step, first }) => {
    const at = first.kind === 'quantity' ? first.written : first.name;
    const place = file.places.some(({ place: where }) =>
      usesIn(where).some(({ ref }) => ref.name === name.name),
    );
    const when =
      place || symbols.yields(choices).kind === 'point' ? 'as the next lap begins' : 'at once';
    const steps = step ? ` in steps of ${printSum(step)}` : '';
    return `${name.name}: ${printChoices(choices)}${steps}, at first ${at}; a change counts ${when}.`;
  });
  const buttons = new Set(
    usesOf(file).flatMap(({ ref, as }) => (as === 'button' ? [ref.name] : [])),
  );
  for (const button of buttons) lines.push(`A button \`${button}\`.`);
  for (const { name, asked } of file.rules) {
    if (asked) lines.push(`${name.name} may be asked for: ${printAsked(asked)}.`);
  }
  return titled('Steered by the operator', lines);
}

// ---- rules ---------------------------------------------------------------------------------

function rules(file: RulesFile, symbols: Symbols, most: SessionBounds): string {
  const blocks = file.rules.map((rule, index) => {
    const lines = rulePhrases(rule, symbols, most.rules[index]!);
    return [`  ${rule.name.name}`, ...lines.map((line) => `    ${line}`)].join('\n');
  });
  return ['The rules, asked in this order', ...blocks].join('\n');
}

function rulePhrases(rule: RuleDecl, symbols: Symbols, most: RuleBounds): string[] {
  const lines = [`When: ${printWhen(rule.when)}${numbersOf([rule.when], symbols)}.`];
  if (rule.if) lines.push(`Only if ${printCondition(rule.if)}, read at that moment.`);
  if (rule.chance) lines.push(`By a chance of ${rule.chance.written}.`);
  for (const action of rule.do)
    lines.push(`It does: ${printAction(action)}${numbersOf([action], symbols)}.`);
  if (rule.sham) lines.push(`A sham, which drives no output, when ${printCondition(rule.sham)}.`);
  if (rule.limits.length > 0) lines.push(`Limits: ${rule.limits.map(printCap).join(', ')}.`);
  lines.push(
    rule.within
      ? `An output starts within ${printSum(rule.within)} or not at all.`
      : 'An output starts within 50 ms of the moment or not at all.',
  );
  const why = whyNotArmed(rule, symbols.rig);
  lines.push(
    why === undefined ? 'Started by the board itself (armed).' : `Started by the host: ${why}.`,
  );
  if (rule.asked) {
    lines.push(
      `Asked for by the operator (${printAsked(rule.asked)}), its ${rule.chance ? '`if` and `chance` are' : '`if` is'} taken as true; all else holds.`,
    );
  }
  lines.push(`At most: ${mostPhrase(most)}.`);
  return lines;
}

function mostPhrase({ firings, because, outputs, waterNl }: RuleBounds): string {
  if (!Number.isFinite(firings)) return 'nothing in the file bounds its firings';
  const costs = outputs.map(
    ({ output, pulses, onUs }) =>
      `${count(pulses, 'pulse')} of ${output}${onUs > 0 ? `, ${time(onUs)} on` : ''}`,
  );
  if (waterNl > 0) costs.push(volume(waterNl));
  return [`${count(firings, 'firing')} (by ${because})`, ...costs].join('; ');
}

// ---- the rig and the sum -------------------------------------------------------------------

function needs(file: RulesFile, symbols: Symbols): string {
  const uses = usesOf(file);
  const named = (role: string): string[] => [
    ...new Set(uses.flatMap(({ ref, as }) => (as === role ? [ref.name] : []))),
  ];
  const gives = file.rules.some((rule) =>
    rule.do.some(({ body }) => body.kind === 'give' && !body.from),
  );
  const subjects = uses.flatMap(({ ref, as }) =>
    as === 'subject' && !symbols.get(ref.name) ? [ref.name] : [],
  );
  const inputs = [...new Set([...named('input'), ...subjects])];
  const text =
    JSON.stringify(file.rules) + JSON.stringify(file.phases) + JSON.stringify(file.end ?? '');
  const licks = /"(licks|lick|nth lick|bout|lick mark|share of licks)"/.test(text);
  return titled('What the rig must provide', [
    `A belt of ${file.beltLengthCm.written}.`,
    ...(gives ? ['One valve.'] : []),
    ...named('valve').map((name) => `A valve \`${name}\`.`),
    ...named('output').map((name) => `An output \`${name}\`.`),
    ...inputs.map((name) => `An input \`${name}\`.`),
    ...(licks ? ['A lick sensor.'] : []),
  ]);
}

function delivery(most: SessionBounds): string {
  return titled('The most that a session of one cell can deliver', [
    `Time: ${Number.isFinite(most.timeUs) ? time(most.timeUs) : 'no bound'}. Laps: ${Number.isFinite(most.laps) ? most.laps : 'no bound'}.`,
    ...most.outputs.map(
      ({ output, pulses, onUs }) =>
        `${output}: ${Number.isFinite(pulses) ? count(pulses, 'pulse') : 'no bound on its pulses'}${onUs > 0 && Number.isFinite(onUs) ? `, ${time(onUs)} on` : ''}.`,
    ),
    `The operator may put off the end, by ${MOST_PUT_OFF_LAPS} laps and ${MOST_PUT_OFF_MIN} min at most: that is not counted in.`,
    `Water: ${Number.isFinite(most.waterNl) ? volume(most.waterNl) : 'no bound in this file; the rig file has one'}.`,
  ]);
}

const count = (n: number, what: string): string => `${n} ${what}${n === 1 ? '' : 's'}`;
const time = (us: number): string => formatQuantity(us, 'time');
const volume = (nl: number): string => formatQuantity(nl, 'volume');
