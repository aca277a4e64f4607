import { spawn } from 'node:child_process';
import fs from 'node:fs';
import { PassThrough, type Readable } from 'node:stream';
import type { FastifyReply } from 'fastify';
import { compiledScript } from '../../askChild.js';
import { LapwingError } from '../../errors/codes.js';

/** Each has a process of its own that compresses. */
const MOST_AT_ONCE = 3;
const SCRIPT = compiledScript(import.meta.url, './zipProcess.js');

/** Sends sessions, and what was made of them, as files to be kept. */
export class Downloads {
  #running = 0;

  constructor(private readonly script = SCRIPT) {}

  /**
   * A folder as one ZIP file, made as fast as it is taken; a download that breaks off ends the
   * process that made it.
   * @throws LapwingError WEB_TOO_MANY_JOBS
   */
  zip(reply: FastifyReply, folder: string, name: string): FastifyReply {
    if (this.#running >= MOST_AT_ONCE) {
      throw new LapwingError('webTooManyJobs', `${MOST_AT_ONCE} downloads are running.`);
    }
    this.#running++;
    const child = spawn(process.execPath, [this.script, folder, name], {
      stdio: ['ignore', 'pipe', 'ignore'],
    });
    const out = new PassThrough();
    child.stdout.pipe(out, { end: false });
    child.once('error', (error) => out.destroy(error));
    child.once('close', (code, signal) => {
      this.#running--;
      // A file that ends early must not look like one that is whole.
      if (code === 0) out.end();
      else out.destroy(new Error(`the zip was not finished: ${signal ?? `status ${code}`}`));
    });
    out.once('close', () => child.kill('SIGKILL'));
    return asFile(reply, out, `${name}.zip`, 'application/zip');
  }

  /** One file as it is. */
  file(reply: FastifyReply, path: string, name: string, type: string): FastifyReply {
    return asFile(reply, fs.createReadStream(path), name, type);
  }
}

/** Names of session folders are plain ASCII, but one made by hand may not be (RFC 6266, RFC 8187). */
function asFile(reply: FastifyReply, stream: Readable, name: string, type: string): FastifyReply {
  const plain = name.replace(/[^\w.-]/g, '_');
  const exact = encodeURIComponent(name).replace(
    /['()*]/g,
    (c) => `%${c.charCodeAt(0).toString(16)}`,
  );
  return reply
    .type(type)
    .header('content-disposition', `attachment; filename="${plain}"; filename*=UTF-8''${exact}`)
    .send(stream);
}
