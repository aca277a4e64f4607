/**
 * `zipProcess FOLDER NAME`: writes the files of a folder to standard output as one ZIP file, below
 * NAME, as they are read. Compressing keeps a core busy, which the web process must not be.
 */
import fs from 'node:fs';
import path from 'node:path';
import type { Readable } from 'node:stream';
import { fileURLToPath } from 'node:url';
import yazl from 'yazl';

/** Compressed already: packing them again costs time and saves nothing. */
const PACKED = /\.(mcap|nwb|parquet)$/;
/** Files that are only there for an instant. */
const PASSING = /\.(new|old)$|^recording\.lock$|^finishing\.mcap$/;

/** Every plain file below the folder, as paths from it with `/`; no link is followed. */
export function filesIn(folder: string, below = ''): string[] {
  const entries = fs.readdirSync(path.join(folder, below), { withFileTypes: true });
  return entries
    .filter(({ name }) => !PASSING.test(name))
    .sort((a, b) => (a.name < b.name ? -1 : 1))
    .flatMap((entry) => {
      const name = below === '' ? entry.name : `${below}/${entry.name}`;
      if (entry.isDirectory()) return filesIn(folder, name);
      return entry.isFile() ? [name] : [];
    });
}

/** The folder as a ZIP file that is made as it is read. */
export function zipOf(folder: string, name: string): Readable {
  const zip = new yazl.ZipFile();
  for (const file of filesIn(folder)) {
    zip.addFile(path.join(folder, file), `${name}/${file}`, { compress: !PACKED.test(file) });
  }
  zip.end();
  const out = zip.outputStream as Readable;
  zip.on('error', (error) => out.destroy(error as Error));
  return out;
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  const [folder = '', name = ''] = process.argv.slice(2);
  const failed = (error: Error) => {
    process.stderr.write(`${error.message}\n`);
    process.exit(1);
  };
  // Whoever read it has gone.
  process.stdout.on('error', failed);
  zipOf(folder, name).on('error', failed).pipe(process.stdout);
}
