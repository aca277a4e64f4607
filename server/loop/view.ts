import { readdirSync } from 'node:fs';
import { join, relative, sep } from 'node:path';
import type { BoardLink } from '../link/boardLink.js';
import type { Program } from '../rules/engine/program.js';
import type { SessionCore } from '../session/core/sessionCore.js';
import type { PreparedRules } from '../session/prepare.js';
import type { Rig } from '../session/rig/rig.js';
import { CAPABILITY } from '../wire/messages.js';
import type { AlarmView } from './alarms/alarms.js';
import type { Setup, Snapshot } from './protocol.js';

/** What a session's card and files say, for the setup. */
export interface RunningSession {
  readonly folder: string;
  readonly rules: PreparedRules;
  readonly subject: string;
  readonly experimenter: string;
  readonly seed: string;
  readonly startedAt: Date;
  /** Given to this animal earlier today. */
  readonly waterTodayNl: number;
  /** Of a blinded session; never shown. */
  readonly arm?: string;
}

export interface RecordView {
  readonly state: Snapshot['record']['state'];
  readonly bytes: number;
  readonly reason: string;
  readonly diskFreeGb: number;
}

/** What stays the same while a session runs, or while none does. */
export function setupOf(
  rig: Rig,
  rulesFolder: string,
  link: BoardLink,
  session: RunningSession | undefined,
): Setup {
  return {
    rig: rig.name,
    simulated: ((link.identity?.capabilities ?? 0) & CAPABILITY.simulated) !== 0,
    beltLengthCm: rig.belt.lengthCm,
    outputs: rig.outputs.map(({ name, kind }) => ({ name, kind })),
    inputs: rig.inputs.map(({ name }) => name),
    cellFields: rig.cellFields,
    buttonBox: rig.buttons.map(({ name, does }) => ({ input: name, does })),
    rulesFiles: rulesFilesBelow(rulesFolder),
    session: session === undefined ? null : describe(session),
  };
}

function describe(session: RunningSession): NonNullable<Setup['session']> {
  const { folder, rules, subject, experimenter, seed, startedAt } = session;
  const { program, file, choices } = rules;
  return {
    folder,
    title: file.title,
    subject,
    experimenter,
    seed,
    startedAt: startedAt.toISOString(),
    rulesText: file.sources[0]!.text,
    blinded: program.sealed !== undefined,
    rules: file.rules.map(({ name }) => name.name),
    phases: file.phases.map(({ name }) => name.name),
    buttons: program.buttons,
    stimuli: stimuliOf(program),
    asks: asksOf(program),
    choices,
  };
}

function stimuliOf({ rules }: Program): string[] {
  return rules
    .filter(({ actions }) =>
      actions.some((action) => action.kind === 'order' && action.outputKind === 'stimulus'),
    )
    .map(({ name }) => name);
}

/** What may be asked for; how many laps is a choice's bound or a number, as the file says. */
function asksOf(program: Program): NonNullable<Setup['session']>['asks'] {
  return program.rules.flatMap(({ name, asked, mostAsked }) =>
    asked === undefined ? [] : [{ rule: name, now: asked.now, laps: mostAsked }],
  );
}

/** Every rules file below the folder, at most a few levels down, as paths with `/`. */
export function rulesFilesBelow(folder: string): string[] {
  try {
    return readdirSync(folder, { recursive: true, withFileTypes: true })
      .filter((entry) => entry.isFile() && /\.ya?ml$/i.test(entry.name))
      .map((entry) => relative(folder, join(entry.parentPath, entry.name)).split(sep).join('/'))
      .filter((path) => path.split('/').length <= 4)
      .sort()
      .slice(0, 500);
  } catch {
    return [];
  }
}

/** The state now. */
export function snapshotOf(
  core: SessionCore,
  link: BoardLink,
  session: RunningSession | undefined,
  record: RecordView,
  framesPerS: number,
  ended: string | null,
  alarms: readonly AlarmView[],
): Snapshot {
  const { instant, tracker, guard, holds, engine, firings, rig } = core;
  const view = engine.view();
  const { identity, trouble, counters } = link;
  return {
    input: core.input,
    boardUs: instant.nowUs,
    session: session === undefined ? (ended === null ? 'idle' : 'ended') : 'running',
    endedBecause: ended,
    sessionS: session === undefined ? 0 : (instant.nowUs - core.beganUs) / 1_000_000,
    link: {
      state: link.state,
      reason: trouble?.message ?? '',
      remedy: trouble?.remedy ?? '',
      port: link.port ?? rig.port,
      board: identity === undefined ? '' : identity.model,
      framesPerS,
      lostFrames: counters.lost,
      badFrames: counters.bad,
    },
    trust: instant.trust,
    trustReason: tracker.trustReason,
    positionCm: instant.placed ? instant.positionCm : null,
    speedCmPerS: instant.speedCmPerS,
    lap: instant.lap,
    lickOn: tracker.contact,
    licks: core.licks,
    phase: view.phase,
    phaseLap: view.phaseLap,
    places: view.places,
    progress: view.progress,
    cell: view.cell,
    end: view.end,
    putOff: view.putOff,
    choices: view.choices.map((one, n) => ({ ...one, waits: core.changes.isOpen(n) })),
    rules: view.rules.map((rule, index) => ({ ...rule, armed: firings.isArmed(index) })),
    outputs: inOrder(tracker.outputs, rig.outputs),
    inputs: inOrder(instant.inputs, rig.inputs),
    waterUl: guard.waterGivenNl / 1_000,
    waterUncertainUl: guard.waterUncertainNl / 1_000,
    waterLimitUl: rig.water.perSessionNl / 1_000,
    waterTodayUl: (core.waterEarlierNl + guard.waterGivenNl) / 1_000,
    waterDayLimitUl: rig.water.perDayNl / 1_000,
    alarms,
    marks: core.marks.open,
    held: { stimulus: holds.reason('stimulus'), water: holds.reason('water') },
    handOnBelt: core.handOnBelt,
    record,
  };
}

/** From a mask by the board's lines to one by the order of the rig file, as the setup lists them. */
function inOrder(mask: number, lines: readonly { readonly line: number }[]): number {
  let ordered = 0;
  lines.forEach(({ line }, index) => {
    if ((mask & (1 << line)) !== 0) ordered |= 1 << index;
  });
  return ordered;
}
