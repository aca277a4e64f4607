import fs from 'node:fs';
import path from 'node:path';
import type { Group } from 'h5wasm/node';
import type { SessionData } from '../../analysis/readSession.js';
import { type NwbBuilder, text } from './hdf5.js';

const NOTES = {
  rig: 'The rig file that the session ran on, as it was',
  rules: 'The rules file that the session ran, as it was',
  included: 'Brought in by the rules file, as it was',
  calibration: 'A calibration that the rig file refers to, as it was',
} as const;

/** Every file that the session ran from, and its description, as texts. */
export function putFiles(nb: NwbBuilder, scratch: Group, session: SessionData): void {
  const { folder, description } = session;
  const put = (name: string, stored: string, notes: string) => {
    const content = fs.readFileSync(path.join(folder, ...stored.split('/')), 'utf8');
    // HDF5 through this library has no empty text.
    const set = nb.text(scratch, name, content === '' ? ' ' : content);
    nb.typed(set, `/scratch/${name}`, 'ScratchData');
    text(set, 'notes', notes);
  };
  const numbers = { included: 0, calibration: 0 };
  for (const { role, stored, source } of description.files) {
    if (role === 'rig' || role === 'rules') put(`${role}_file`, stored, NOTES[role]);
    else put(`${role}_file_${++numbers[role]}`, stored, `${NOTES[role]}: ${source}`);
  }
  put(
    'session_description',
    'session.json',
    'The description of the session, JSON: who, when, on what, how it ended',
  );
}
