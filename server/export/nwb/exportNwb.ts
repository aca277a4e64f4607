import { askChild, compiledScript } from '../../askChild.js';

/**
 * Writes a session as an NWB file in a process of its own. Returns the file's path.
 * @throws LapwingError as `readSession` and `writeNwb` do
 */
export async function exportNwb(
  folder: string,
  file: string,
  progress: (done: number) => void = () => {},
): Promise<string> {
  const script = compiledScript(import.meta.url, './nwbProcess.js');
  const question = { script, args: [folder, file], about: file, progress } as const;
  const answer = await askChild<{ path: string }>({ ...question, failure: 'exportFolderBad' });
  return answer.path;
}
