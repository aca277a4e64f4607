/**
 * The web process's entry: `webProcess --socket PATH --token-file FILE [--rig-file FILE]
 * [--rules-folder FOLDER] [--records FOLDER] [--host H] [--port N] [--sign-in] [--name HOST ...]
 * [--proxy ADDRESS ...] [--tls-cert FILE --tls-key FILE]`.
 */
import { resolve } from 'node:path';
import { fileURLToPath } from 'node:url';
import { parseArgs } from 'node:util';
import { LapwingError } from '../errors/codes.js';
import { readRig } from '../session/rig/readRig.js';
import { accessFiles } from './access/people.js';
import { buildWeb } from './buildWeb.js';
import { isLoopback } from './gates.js';
import { notifyOf } from './notices/notices.js';
import { DEFAULT_PORT } from './port.js';
import { certificateWarning, readTls } from './tls.js';

/**
 * Serves until SIGTERM or SIGINT. Prints one JSON line, `{"listening":"http://127.0.0.1:8711"}`, to
 * standard output once the page can be opened; logs go to standard error.
 */
export async function runWeb(argv: readonly string[]): Promise<void> {
  const { values } = parseArgs({
    args: [...argv],
    options: {
      socket: { type: 'string' },
      'token-file': { type: 'string' },
      'rig-file': { type: 'string' },
      'rules-folder': { type: 'string' },
      records: { type: 'string' },
      'animals-folder': { type: 'string' },
      host: { type: 'string', default: '127.0.0.1' },
      port: { type: 'string', default: String(DEFAULT_PORT) },
      'sign-in': { type: 'boolean', default: false },
      name: { type: 'string', multiple: true, default: [] },
      proxy: { type: 'string', multiple: true, default: [] },
      'tls-cert': { type: 'string' },
      'tls-key': { type: 'string' },
      dashboard: { type: 'string' },
      log: { type: 'string', default: 'info' },
    },
  });
  if (values.socket === undefined) throw new LapwingError('loopAway', '`--socket` is missing.');
  const signIn = values['sign-in'];
  if (!signIn && (!isLoopback(values.host) || values.proxy.length > 0)) {
    throw new LapwingError('webHostNotLoopback', `--host ${values.host} without --sign-in`);
  }
  const rig = values['rig-file'] === undefined ? undefined : readRig(values['rig-file']);
  const { 'tls-cert': cert, 'tls-key': key } = values;
  const tls = cert === undefined || key === undefined ? undefined : readTls(cert, key);
  // Beside this file in dist/: dist/server/web and dist/dashboard.
  const built = fileURLToPath(new URL('../../dashboard/', import.meta.url));
  const app = buildWeb({
    socketPath: values.socket,
    ...(values['token-file'] === undefined ? {} : { tokenFile: values['token-file'] }),
    ...(rig === undefined ? {} : { rig, notify: notifyOf(rig) }),
    ...(signIn ? { access: accessFiles(rig?.name ?? '') } : {}),
    ...(tls ? { tls } : {}),
    allowedHosts: values.name,
    proxies: values.proxy,
    ...(values['rules-folder'] === undefined ? {} : { rulesFolder: values['rules-folder'] }),
    ...(values.records === undefined ? {} : { records: resolve(values.records) }),
    ...(values['animals-folder'] === undefined ? {} : { animals: values['animals-folder'] }),
    dashboard: values.dashboard ?? built,
    log: values.log === 'silent' ? false : values.log,
  });
  const warning = tls && certificateWarning(tls, new Date());
  if (warning) app.log.warn(warning);
  let stopping = false;
  const stop = () => {
    if (stopping) process.exit(1);
    stopping = true;
    void app.close().then(() => process.exit(0));
  };
  process.on('SIGTERM', stop);
  process.on('SIGINT', stop);
  // Started by the launcher, it goes with the launcher.
  process.on('disconnect', stop);
  try {
    const at = await app.listen({ host: values.host, port: Number(values.port) });
    const listening = tls ? at.replace(/^http:/, 'https:') : at;
    process.stdout.write(JSON.stringify({ listening }) + '\n');
  } catch (error) {
    await app.close();
    if ((error as NodeJS.ErrnoException).code === 'EADDRINUSE') {
      throw new LapwingError('webPortBusy', `${values.host}:${values.port}`, { cause: error });
    }
    throw error;
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  runWeb(process.argv.slice(2)).catch((error: Error & { code?: string; remedy?: string }) => {
    process.stderr.write(`${error.code ?? 'ERROR'}: ${error.message}\n${error.remedy ?? ''}\n`);
    // 2: starting it again would not help.
    process.exit(error.remedy === undefined ? 1 : 2);
  });
}
