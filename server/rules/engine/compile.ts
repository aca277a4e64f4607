import { isArmable } from '../armable.js';
import { alternativesOf, type PhaseDecl, type RuleDecl, type RulesFile, termsOf } from '../ast.js';
import { measuresIn } from '../checks/walk.js';
import type { RigFacts } from '../facts.js';
import { sealedOf } from '../sealed.js';
import { boundsOf } from './bounds.js';
import { Builder } from './builder.js';
import { compileAction, compileCap } from './compileAction.js';
import { compileAhead, lengthAhead } from './compileAhead.js';
import { compileCondition } from './compileCondition.js';
import { compileChoice, compileDraw, namesOfPlaces, visit } from './compileDraw.js';
import { compileSum, edgesOfName } from './compileSum.js';
import { armingOf, compileWhen, type Waiters } from './compileWhen.js';
import type { PhaseSpec, PlaceView, Program, RuleSpec, Test } from './program.js';
import { TRUE, truth } from './truth.js';

/**
 * Turns a checked rules file into closures, once.
 * @throws Error for a file that the checker would have refused
 */
export function compile(file: RulesFile, facts: RigFacts): Program {
  const b = new Builder(file, facts);
  const waiters: Waiters = {
    licks: [],
    rises: [],
    falls: [],
    lap: [],
    cell: [],
    session: [],
    phase: [],
    presses: new Map(),
    fires: file.rules.map(() => []),
  };
  const placeNames = namesOfPlaces(b);
  const draws = file.draws.map((decl, index) => compileDraw(b, decl, index));
  const choices = file.operator.map((decl) => compileChoice(b, decl, placeNames));
  const rules = file.rules.map((decl, index) => compileRule(b, decl, index, waiters));
  const phases = file.phases.map((decl) => compilePhase(b, decl));
  const end = file.end ? compileCondition(b, file.end) : undefined;
  const endAhead = file.end ? compileAhead(b, file.end) : undefined;
  const places = placesShown(b, placeNames);
  for (const waiter of waiters.licks) {
    if (waiter.nth?.stretch === 'visit') b.spans[waiter.span]!.tracked = true;
  }
  return {
    title: file.title,
    facts,
    rules,
    phases,
    draws,
    choices,
    spans: b.spans,
    points: b.points,
    tallies: b.tallies,
    marks: b.marks,
    places,
    end,
    endAlternatives: alternativesOf(file.end).map((one) => compileCondition(b, one)),
    endAhead,
    gaps: b.gaps,
    lickWaiters: waiters.licks,
    sealed: sealedOf(b.file),
    lickMarks: b.lickMarks,
    risesRules: waiters.rises,
    fallsRules: waiters.falls,
    inputMarks: b.inputMarks,
    lapRules: waiters.lap,
    cellRules: waiters.cell,
    sessionRules: waiters.session,
    phaseRules: waiters.phase,
    phaseMarks: b.phaseMarks,
    buttons: [...waiters.presses.keys()],
    buttonRules: [...waiters.presses.values()],
  };
}

function compileRule(b: Builder, decl: RuleDecl, index: number, waiters: Waiters): RuleSpec {
  const when = compileWhen(b, decl, index, waiters);
  const caps = decl.limits.map((cap) => compileCap(b, cap));
  let windowUs = 0;
  for (const cap of decl.limits) {
    if (cap.kind !== 'per' || typeof cap.per === 'string') continue;
    windowUs = Math.max(windowUs, boundsOf(cap.per, b.names).most);
  }
  const within = decl.within ? compileSum(b, decl.within) : undefined;
  const byPlace = decl.within ? b.names.dimensionOf(decl.within) === 'length' : false;
  return {
    name: decl.name.name,
    index,
    when,
    if: decl.if ? compileCondition(b, decl.if) : undefined,
    ifTerms: termsOf(decl.if).map((term) => compileCondition(b, term)),
    chance: decl.chance?.value,
    sham: decl.sham ? compileCondition(b, decl.sham) : undefined,
    actions: decl.do.map((action) => compileAction(b, action)),
    amountsVary: measuresIn(decl.do).length > 0,
    caps,
    induces: induces(b, decl),
    realTally: b.tally('real firings', index, { windowUs }),
    shamTally: b.tally('sham firings', index, { windowUs }),
    withinUs: byPlace ? undefined : within,
    withinCm: byPlace ? within : undefined,
    tiedToPlace: tiedToPlace(b, decl),
    arming: isArmable(decl, b.facts) ? armingOf(b, decl) : undefined,
    asked: decl.asked && {
      now: decl.asked.now,
      laps: decl.asked.laps && compileSum(b, decl.asked.laps),
    },
    mostAsked: decl.asked?.laps ? boundsOf(decl.asked.laps, b.names).most : 0,
    firesRules: waiters.fires[index]!,
    firesDraws: b.file.draws.flatMap((draw, n) =>
      draw.every.kind === 'firing' && draw.every.of.name === decl.name.name ? [n] : [],
    ),
  };
}

/**
 * What a dashboard draws on the belt: the file's places, draws and choices that are places, and,
 * under the rule's name, places that a rule gives by their amount alone.
 */
function placesShown(b: Builder, placeNames: ReadonlySet<string>): PlaceView[] {
  const named = [...b.file.places, ...b.file.draws, ...b.file.operator].flatMap(({ name }) => {
    const meaning = b.names.need(name.name, 'place', 'draw', 'choice');
    const isPlace =
      meaning.kind === 'place' ||
      (placeNames.has(name.name) && b.names.dimensionOfChoices(meaning.decl.choices) === 'length');
    return isPlace ? [{ name: name.name, ...edgesOfName(b, name.name) }] : [];
  });
  const unnamed = b.file.rules.flatMap(({ name, when }) => {
    const moment = when.kind === 'after' ? when.moment : when;
    if (moment.kind === 'reaches' && moment.place.kind !== 'name') {
      const at = compileSum(b, moment.place);
      return [{ name: name.name, from: at, to: at }];
    }
    if ((moment.kind === 'enters' || moment.kind === 'leaves') && moment.span.kind === 'range') {
      const { from, to } = moment.span;
      return [{ name: name.name, from: compileSum(b, from), to: compileSum(b, to) }];
    }
    return [];
  });
  return [...named, ...unnamed];
}

/** It drives what the rig file says evokes a plateau, or the file reads its predicted field. */
function induces(b: Builder, decl: RuleDecl): boolean {
  const evokes = decl.do.some(({ body }) => {
    if (body.kind !== 'pulse' && body.kind !== 'hold') return false;
    return b.names.need(body.output.name, 'output').output.evokesPlateau === true;
  });
  let read = false;
  visit(b.file, (node) => {
    const { kind, of } = node as { kind?: string; of?: { name?: string } };
    if (kind === 'predicted' && of?.name === decl.name.name) read = true;
  });
  return evokes || read;
}

/**
 * Whether a rule names or reads a place. Laps, speed and time alone do not tie it to one; `lap
 * begins` does, since a lap begins at the belt's 0 cm.
 */
function tiedToPlace(b: Builder, decl: RuleDecl): boolean {
  let tied = false;
  visit(decl, (node) => {
    const { kind, what, measure, name, within } = node as Record<string, unknown>;
    if (kind === 'reaches' || kind === 'enters' || kind === 'leaves') tied = true;
    if (kind === 'in' || kind === 'learned' || kind === 'edge' || kind === 'place mark')
      tied = true;
    if (kind === 'begins' && what === 'lap') tied = true;
    if (kind === 'measure' && measure === 'position') tied = true;
    if (
      (kind === 'scoped' || kind === 'lick' || kind === 'nth lick' || kind === 'bout') &&
      within
    ) {
      tied = true;
    }
    if (kind === 'lick mark' && within) tied = true;
    if (kind === 'every row') {
      const { table } = node as { table: { name: string } };
      if (b.names.need(table.name, 'table').decl.rows.kind === 'places') tied = true;
    }
    if (typeof name === 'string' && b.names.get(name)?.kind === 'place') tied = true;
  });
  return tied;
}

function compilePhase(b: Builder, decl: PhaseDecl): PhaseSpec {
  const { course } = decl;
  const name = decl.name.name;
  if (course.kind === 'to the end') {
    return { name, over: undefined, atLapEnd: decl.atLapEnd, why: '', ahead: undefined };
  }
  if (course.kind === 'until') {
    const over = compileCondition(b, course.condition);
    const ahead = compileAhead(b, course.condition);
    return { name, over, atLapEnd: decl.atLapEnd, why: `${name}: its \`until\` is true`, ahead };
  }
  const lengths = course.lengths.map((length): Test => {
    if (length.kind === 'laps') {
      const count = compileSum(b, length.count);
      return (s) => truth(s.phaseLap() - 1 >= count(s));
    }
    const time = compileSum(b, length.time);
    return (s) => truth(s.nowUs - s.phaseUs >= time(s));
  });
  const over: Test =
    lengths.length === 1 ? lengths[0]! : (s) => truth(lengths.some((test) => test(s) === TRUE));
  const ahead = lengthAhead(b, course.lengths);
  return { name, over, atLapEnd: decl.atLapEnd, why: `${name} has run its length`, ahead };
}
