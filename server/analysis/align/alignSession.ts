import { LapwingError } from '../../errors/codes.js';
import { firingsOf } from '../firings.js';
import { dropsOf, lapsOf, licksOf, phasesOf } from '../happenings.js';
import type { SessionData } from '../readSession.js';
import { type Alignment, align, convert, type Refused } from './align.js';

/** One thing that happened, on both clocks. */
export interface AlignedEvent {
  /** Number of the input of the record that it came from. */
  readonly input: number;
  readonly kind: 'lap' | 'lick' | 'firing' | 'sham' | 'water' | 'phase';
  readonly name: string;
  readonly sessionS: number;
  /** In the acquisition's own clock; null outside every acquisition. */
  readonly otherS: number | null;
  readonly acquisition: number | null;
  readonly lap: number;
  readonly positionCm: number | null;
}

/** How far beyond its first and last edge an acquisition's clock is taken to go on, s. */
const BEYOND_S = 10;

/**
 * Rising edges of a line, s since the session began: a sync train's or an input's as the board
 * stamped them, or the rises of an output that rules drive.
 * @param name of an input or output of the rig file; undefined: the sync line
 * @throws LapwingError ALIGN_REFUSED where the record holds none
 */
export function ownEdges(session: SessionData, name?: string): { line: string; times: number[] } {
  const { rig, edges, decisions, beganUs } = session;
  const sync = rig.outputs.find(({ line }) => line === rig.sync?.line)?.name;
  const line = name ?? sync;
  if (line === undefined)
    throw new LapwingError('alignRefused', 'The rig has no sync train; say a line with --line.');
  const since = (us: number) => (us - beganUs) / 1e6;
  const times = edges.flatMap((edge) =>
    edge.name === line && edge.level === 1 ? [since(edge.boardUs)] : [],
  );
  if (times.length === 0) {
    for (const d of decisions)
      if (d.kind === 'fired' && d.output === line && d.riseUs !== null) times.push(since(d.riseUs));
  }
  if (times.length === 0)
    throw new LapwingError('alignRefused', `The record holds no rise of ${line}.`);
  return { line, times: times.sort((a, b) => a - b) };
}

/**
 * Aligns a session with the acquisitions of another instrument and gives its events in their time.
 * @throws LapwingError ALIGN_REFUSED with the reason for each acquisition, where none fits
 */
export function alignSession(
  session: SessionData,
  acquisitions: readonly (readonly number[])[],
  name?: string,
) {
  const { line, times } = ownEdges(session, name);
  const toS = (session.endedUs - session.beganUs) / 1e6;
  const results = align(times, acquisitions, { fromS: 0, toS });
  const good = results.filter((result): result is Alignment => !('refused' in result));
  const refused = results.filter((result): result is Refused => 'refused' in result);
  if (good.length === 0) {
    const why = refused.map((r) => `acquisition ${r.acquisition}: ${r.refused}`).join('; ');
    throw new LapwingError('alignRefused', `${why}.`);
  }
  const overlap = good.find((a, i) =>
    good.slice(i + 1).some((b) => a.toS > b.fromS && b.toS > a.fromS),
  );
  if (overlap !== undefined)
    throw new LapwingError(
      'alignRefused',
      `Acquisition ${overlap.acquisition} and another fit the same part of the session.`,
    );
  return { line, edges: times.length, good, refused, events: eventsOf(session, good) };
}

function eventsOf(session: SessionData, good: readonly Alignment[]): AlignedEvent[] {
  const events: AlignedEvent[] = [];
  const put = (
    kind: AlignedEvent['kind'],
    label: string,
    boardUs: number,
    { input, lap }: { readonly input: number; readonly lap: number },
    positionCm: number | null,
  ) => {
    const sessionS = (boardUs - session.beganUs) / 1e6;
    const found = good.find((a) => sessionS >= a.fromS - BEYOND_S && sessionS <= a.toS + BEYOND_S);
    const otherS = found === undefined ? null : convert(found, sessionS);
    const acquisition = found?.acquisition ?? null;
    events.push({ input, kind, name: label, sessionS, otherS, acquisition, lap, positionCm });
  };
  for (const lap of lapsOf(session)) put('lap', `lap ${lap.lap}`, lap.startUs, lap, null);
  for (const l of licksOf(session)) if (!l.artefact) put('lick', '', l.boardUs, l, l.positionCm);
  for (const f of firingsOf(session)) {
    const label = f.output === null ? f.rule : `${f.rule} ${f.output}`;
    put(f.sham ? 'sham' : 'firing', label, f.boardUs, f, f.riseCm);
  }
  for (const d of dropsOf(session)) put('water', d.rule ?? '', d.boardUs, d, d.positionCm);
  for (const p of phasesOf(session)) put('phase', p.phase, p.startUs, p, null);
  return events.sort((a, b) => a.sessionS - b.sessionS);
}
