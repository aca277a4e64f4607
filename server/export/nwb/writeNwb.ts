import fs from 'node:fs';
import path from 'node:path';
import { File, type Group } from 'h5wasm/node';
import type { SessionData } from '../../analysis/readSession.js';
import { LapwingError } from '../../errors/codes.js';
import { packageVersion } from '../../packageRoot.js';
import { syncFile, syncFolder } from '../../session/writeFileWhole.js';
import { loadHdf5, NwbBuilder, text } from './hdf5.js';
import { putDecisions, putFirings, putLicksAndWater, putLines } from './nwbEvents.js';
import { putFiles } from './nwbFiles.js';
import { putIntervals } from './nwbIntervals.js';
import { putBelt, putStimuli } from './nwbSeries.js';
import { putSpecifications } from './specifications.js';

/**
 * Writes a session as one NWB 2.10 file (HDF5), under a temporary name that is synced and renamed.
 * Times are seconds since the session began by the board's clock. The same record and the same
 * `createdAt` give the same bytes, so `file_create_date` is the one field that may differ.
 * @param createdAt RFC 3339
 * @param progress called with the share done, 0 to 1
 * @throws LapwingError EXPORT_FOLDER_BAD
 */
export async function writeNwb(
  session: SessionData,
  file: string,
  createdAt: string,
  progress: (done: number) => void = () => {},
): Promise<void> {
  await loadHdf5();
  const temporary = `${file}.${process.pid}.new`;
  const now = Date.now;
  // The library stamps each object with the time; the record's own start takes its place.
  Date.now = () => Date.parse(session.description.startedAt);
  try {
    fs.rmSync(temporary, { force: true });
    const nwb = new File(temporary, 'w');
    try {
      fill(nwb, session, createdAt, progress);
      nwb.flush();
    } finally {
      nwb.close();
    }
    syncFile(temporary);
    fs.renameSync(temporary, file);
    syncFolder(path.dirname(file));
  } catch (error) {
    fs.rmSync(temporary, { force: true });
    throw new LapwingError('exportFolderBad', `${file}: ${(error as Error).message ?? error}`, {
      cause: error,
    });
  } finally {
    Date.now = now;
  }
}

function fill(
  nwb: File,
  session: SessionData,
  createdAt: string,
  progress: (done: number) => void,
): void {
  const { description, rig } = session;
  const nb = new NwbBuilder(description.name);
  nb.typed(nwb, '/', 'NWBFile');
  text(nwb, 'nwb_version', '2.10.0');
  nb.texts(nwb, 'file_create_date', [createdAt]);
  nb.text(nwb, 'identifier', nb.uuid('file'));
  nb.text(
    nwb,
    'session_description',
    `${description.title}: running on a ${rig.belt.lengthCm} cm belt`,
  );
  nb.text(nwb, 'session_start_time', description.startedAt);
  nb.text(nwb, 'timestamps_reference_time', description.startedAt);
  const names = [
    'acquisition',
    'analysis',
    'processing',
    'stimulus',
    'general',
    'events',
    'scratch',
  ];
  const [acquisition, , processing, stimulus, general, events, scratch] = [
    ...[...names, 'intervals'].map((name) => nb.group(nwb, name)),
  ] as [Group, Group, Group, Group, Group, Group, Group];
  const presentation = nb.group(stimulus, 'presentation');
  nb.group(stimulus, 'templates');
  putGeneral(nb, general, session);
  // The samples are nearly all of it.
  putBelt(nb, acquisition, processing, session, (done) => progress(0.9 * done));
  putLicksAndWater(nb, events, session);
  putStimuli(nb, presentation, session);
  putFirings(nb, events, session);
  putIntervals(nb, nwb.get('intervals') as Group, session);
  putDecisions(nb, events, session);
  putLines(nb, events, session);
  progress(0.95);
  putSpecifications(nb, nwb);
  putFiles(nb, scratch, session);
}

function putGeneral(nb: NwbBuilder, general: Group, { description, rig }: SessionData): void {
  const { subject, experimenter, protocolNumber, sessionNumber, board, software } = description;
  if (experimenter) nb.texts(general, 'experimenter', [experimenter]);
  nb.text(general, 'session_id', description.name);
  if (protocolNumber) nb.text(general, 'protocol', protocolNumber);
  nb.text(general, 'experiment_description', description.title);
  const made = ['lapwing', packageVersion];
  if (board !== null) made.push(`firmware of ${board.model}`, String(board.firmware));
  nb.texts(general, 'was_generated_by', made, [made.length / 2, 2]);
  nb.text(
    general,
    'notes',
    (sessionNumber === null ? '' : `Session ${sessionNumber} of this subject. `) +
      'Time zero is the beginning of the session by the clock of the board; session_start_time is ' +
      `as good as the computer clock. Recorded by lapwing ${software.version}. Lap 0 is the partial ` +
      'stretch before the first mark, where position is not known (NaN). file_create_date alone ' +
      'differs when the same record is exported again.',
  );
  const devices = nb.group(general, 'devices');
  const models = nb.group(devices, 'models');
  const boardName = board?.model ?? 'board';
  const model = nb.group(models, 'belt_rig', 'DeviceModel');
  text(model, 'manufacturer', 'unknown');
  text(model, 'description', `Belt treadmill with ${rig.belt.countsPerCm} encoder counts a cm`);
  const treadmill = nb.group(devices, 'treadmill', 'Device');
  text(
    treadmill,
    'description',
    `Rig ${rig.name}, ${rig.belt.lengthCm} cm belt, board ${boardName}`,
  );
  if (board?.boardId) text(treadmill, 'serial_number', String(board.boardId));
  treadmill.create_soft_link('/general/devices/models/belt_rig', 'model');
  const animal = nb.group(general, 'subject', 'Subject');
  nb.text(animal, 'subject_id', subject);
  const weightG = description.animal?.weightG ?? null;
  if (weightG !== null) nb.text(animal, 'weight', `${(weightG / 1_000).toFixed(5)} kg`);
}
