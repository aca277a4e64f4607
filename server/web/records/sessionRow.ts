import { readFileSync } from 'node:fs';
import { Ajv2020 } from 'ajv/dist/2020.js';
import { type SessionDescription, sessionSchemaFile } from '../../session/description.js';
import type { SessionRow } from './recordsMessages.js';

const fits = new Ajv2020({ allowUnionTypes: true }).compile<SessionDescription>(
  JSON.parse(readFileSync(sessionSchemaFile(), 'utf8')) as object,
);

/**
 * A session's line in the list, from its description as it was parsed.
 * @throws Error saying where the description is not as its schema says
 */
export function rowOf(name: string, value: unknown): SessionRow {
  if (!fits(value)) {
    const [error] = fits.errors ?? [];
    const where = error?.instancePath ? `session.json at ${error.instancePath}` : 'session.json';
    throw new Error(`${where} ${error?.message ?? 'is not as its schema says'}`);
  }
  const { ended, water, record, replay, startedAt } = value;
  const source = value.files.find(({ role }) => role === 'rules')?.source ?? '';
  return {
    name,
    bad: null,
    ...{ subject: value.subject, title: value.title, experimenter: value.experimenter },
    ...{ protocolNumber: value.protocolNumber, sessionNumber: value.sessionNumber },
    ...{ startedAt, ended, recording: false },
    rules: source.split(/[\\/]/).at(-1) ?? '',
    minutes: ended && (Date.parse(ended.at) - Date.parse(startedAt)) / 60_000,
    givenUl: water?.givenUl ?? null,
    uncertainUl: water?.uncertainUl ?? null,
    record: record?.state ?? null,
    check: replay ? checkOf(replay) : null,
    simulated: value.board?.simulated ?? null,
  };
}

function checkOf(replay: NonNullable<SessionDescription['replay']>): SessionRow['check'] {
  if (replay.failed !== undefined) return 'failed';
  return replay.identical ? 'identical' : 'different';
}

/** The line of a session whose description cannot be read: its folder's name still says when. */
export function badRow(name: string, why: string): SessionRow {
  const [, day, time] = /^(\d{4}-\d\d-\d\d)_(\d\d-\d\d-\d\d)/.exec(name) ?? [];
  const startedAt = day && time ? `${day}T${time.replaceAll('-', ':')}` : '';
  return {
    ...{ name, bad: why, subject: '', title: '', experimenter: null, rules: '' },
    ...{ protocolNumber: null, sessionNumber: null, startedAt, recording: false, ended: null },
    ...{ minutes: null, givenUl: null, uncertainUl: null, record: null, check: null },
    simulated: null,
  };
}

/** Something about it wants looking at. */
export function hasTrouble(row: SessionRow): boolean {
  if (row.bad !== null) return true;
  if (row.recording) return false;
  const checked = row.check === null || row.check === 'identical';
  return row.ended === null || !checked || (row.record !== null && row.record !== 'whole');
}
