import { dropsOf, lapsOf } from '../../analysis/happenings.js';
import type { MeasuredBack } from '../../analysis/loopback.js';
import type { SessionData } from '../../analysis/readSession.js';
import type { SessionDescription } from '../../session/description.js';
import { describeTroubles } from '../../session/record/recordState.js';
import { fieldWords } from '../../session/summary.js';
import type { Shown } from './figures.js';
import { counted, factsTable, fixed } from './htmlTable.js';
import { escapeHtml } from './plot.js';

/** Who, when, on what, and how far the record is to be trusted. */
export function facts(session: SessionData): string {
  const { description, beganUs, endedUs, rig, state } = session;
  const { software, board, seed, ended, replay } = description;
  const minutes = (endedUs - beganUs) / 60e6;
  return factsTable([
    ['session', description.name],
    ['session number', description.sessionNumber ?? ''],
    ['started', `${description.startedAt}, ${minutes.toFixed(1)} min`],
    ['experimenter', description.experimenter ?? ''],
    ['animal protocol', description.protocolNumber ?? ''],
    ['weight', weightInWords(description.animal)],
    ['water', waterInWords(session)],
    ...cellsInWords(session),
    ['ended', ended === null ? 'not known' : `${ended.how}: ${ended.reason}`],
    ['rig', `${rig.name}, belt ${rig.belt.lengthCm} cm, board ${board?.model ?? 'not recorded'}`],
    ['software', `lapwing ${software.version}, seed ${seed}`],
    ['record', [state.state, ...describeTroubles(state)].join('; ')],
    ['replay of the record', replayInWords(replay)],
    ...description.files.map(
      ({ role, source, sha256 }) =>
        [`${role} file`, `${source}, SHA-256 ${sha256.slice(0, 16)}...`] as const,
    ),
  ]);
}

/** Cells after the first, with what the operator noted of each. */
function cellsInWords({ decisions }: SessionData): [string, string][] {
  return decisions.flatMap((decision): [string, string][] => {
    if (decision.kind !== 'cell began') return [];
    const { index, lap, fields } = decision;
    return [[`cell ${index}`, [`from lap ${lap}`, fieldWords(fields)].filter(Boolean).join('; ')]];
  });
}

function weightInWords(animal: SessionDescription['animal']): string {
  if (animal === undefined || animal.weightG === null) return '';
  const { weightG, percent, leastPercent } = animal;
  if (percent === null) return `${weightG} g`;
  const least = leastPercent === null ? '' : ` (at least ${leastPercent} %)`;
  return `${weightG} g, ${percent.toFixed(1)} % of its baseline${least}`;
}

function waterInWords(session: SessionData): string {
  const { water, waterEarlierUl = 0, animal } = session.description;
  const given = dropsOf(session).reduce((sum, { volumeUl }) => sum + volumeUl, 0);
  const uncertain = water?.uncertainUl ?? 0;
  const target = animal?.targetUl ?? null;
  return [
    `${fixed(given, 1)} uL given`,
    ...(uncertain > 0 ? [`${fixed(uncertain, 1)} uL uncertain`] : []),
    ...(waterEarlierUl > 0 ? [`${fixed(waterEarlierUl, 1)} uL earlier that day`] : []),
    ...(target === null ? [] : [`${fixed(target, 0)} uL a day is its target`]),
  ].join(', ');
}

function replayInWords(replay: SessionDescription['replay']): string {
  if (replay === undefined) return 'not made yet: `lapwing replay` makes it';
  const { identical, inputs, decisions, commands, failed, difference } = replay;
  if (identical) return `identical: ${inputs} inputs, ${decisions} decisions, ${commands} commands`;
  return failed ?? `different at input ${difference?.input}`;
}

/** What whoever reads the numbers should know first. */
export function cautions(
  session: SessionData,
  { licking, laps, firings }: Shown,
  measured: MeasuredBack | undefined,
): string {
  const { decisions, description, state, rig } = session;
  const all = lapsOf(session);
  const excluded = all.filter((lap) => lap.excluded).map((lap) => lap.lap);
  const found: string[] = [];
  if (state.state !== 'whole')
    found.push(`The record is ${state.state}: see what is missing above.`);
  if (description.replay?.identical === false)
    found.push('A replay of the record did not give the same decisions.');
  if (description.board?.simulated) found.push('The board was simulated: no wire left it.');
  for (const against of description.animal?.against ?? [])
    found.push(`Before it began: ${against}.`);
  if (description.animal?.despite !== undefined)
    found.push(`It was begun all the same: ${description.animal.despite}`);
  if (excluded.length > 0) found.push(`Laps left out by the operator: ${excluded.join(', ')}.`);
  const uncertain = decisions.filter(({ kind }) => kind === 'uncertain').length;
  if (uncertain > 0) found.push(`${counted(uncertain, 'firing')} uncertain: the board never said.`);
  const doubt = decisions.filter((d) => d.kind === 'trust' && d.trust === 'doubtful').length;
  if (doubt > 0) found.push(`Position became doubtful ${counted(doubt, 'time')}.`);
  const warn = (rig.belt.seam?.warnCm ?? Number.POSITIVE_INFINITY) * 10;
  const slipped = laps.filter(({ slipMm }) => slipMm !== null && Math.abs(slipMm) > warn);
  if (slipped.length > 0)
    found.push(`Slip of more than ${warn} mm on ${counted(slipped.length, 'lap')}.`);
  const artefacts = decisions.filter((d) => d.kind === 'lick' && d.artefact).length;
  if (artefacts > 0)
    found.push(`${counted(artefacts, 'lick')} left out that may be electrical artefacts.`);
  if (licking.spoutCm === null)
    found.push('No water at a known place: there is no spout to speak of.');
  if (laps.length < 10) found.push(`Only ${counted(laps.length, 'complete lap')}.`);
  const late = firings.filter((f) => (f.latencyUs ?? 0) > 10_000).length;
  if (late > 0) found.push(`${counted(late, 'firing')} rose more than 10 ms after being decided.`);
  const unseen = [...(measured?.firings.values() ?? [])].filter((seen) => seen === null).length;
  if (unseen > 0) found.push(`${counted(unseen, 'firing')} not seen on the loopback input.`);
  const extra = measured?.unexplained.length ?? 0;
  if (extra > 0) found.push(`The loopback input rose ${counted(extra, 'time')} without a firing.`);
  found.push(
    'The partial stretch before the first mark and the lap that the end cut short are in no figure.',
  );
  return `<ul>${found.map((caution) => `<li>${escapeHtml(caution)}</li>`).join('')}</ul>`;
}
