/** The Rig page's half of the HTTP interface: ports, the bench, guides, calibrations, pre-flight. */
import type { FastifyInstance, FastifyRequest } from 'fastify';
import type { Answers } from '../../calibrate/guides/guide.js';
import type { GuideName } from '../../calibrate/guides/runGuide.js';
import { useCalibration } from '../../calibrate/store.js';
import { LapwingError } from '../../errors/codes.js';
import { describePorts } from '../../link/describePorts.js';
import { grabberWarnings } from '../../link/portWarnings.js';
import { type RigAddress, rigAddress } from '../../loop/rigLock.js';
import { latestPreflight } from '../../session/preflight.js';
import { listCalibrations, readCalibration } from '../../session/rig/calibration.js';
import { readRig } from '../../session/rig/readRig.js';
import type { Rig } from '../../session/rig/rig.js';
import { settingsOf } from '../../session/rig/settings.js';
import { BenchHolder } from './benchHolder.js';
import { rowOf } from './calibrationRow.js';
import { GuideRun } from './guideRun.js';
import type { BenchTold, GuideTold, PortsTold, RigTold, TriedTold } from './rigMessages.js';
import { rigBodies, rigQueries } from './schemas.js';

export interface RigRouteOptions {
  /** As the web process was started with it; without it these routes answer WEB_NO_RIG. */
  readonly rig: Rig | undefined;
  /** The loop's door, if it is not where the rig's name says. */
  readonly loop: Pick<RigAddress, 'socketPath'> & { readonly tokenFile?: string };
  /** Where sessions are recorded, if not where the rig file says. */
  readonly records: string | undefined;
}

export function addRigRoutes(app: FastifyInstance, options: RigRouteOptions): void {
  const { rig: first, loop } = options;
  let holder: BenchHolder | undefined;
  let run: GuideRun | undefined;

  const need = (): Rig => {
    if (first === undefined) throw new LapwingError('webNoRig', '`--rig-file` was not given.');
    return first;
  };
  /** As the file is now: calibrations may have been put in force since. */
  const fresh = (): Rig => readRig(need().path);
  const held = (): BenchHolder => {
    const address = rigAddress(need().name);
    const { socketPath, tokenFile = address.tokenFile } = loop;
    holder ??= new BenchHolder({ ...address, socketPath, tokenFile });
    return holder;
  };
  const tell = (): GuideTold => run?.told ?? { state: 'none' };

  app.get('/api/rig', async (): Promise<RigTold> => {
    const rig = fresh();
    const now = new Date();
    const { calibrations, bad } = listCalibrations(rig.calibrationsFolder);
    return {
      ...{ name: rig.name, path: rig.path, inputs: rig.inputs },
      outputs: rig.outputs.map(({ name, line, kind, longestOnUs, leastGapUs }) => ({
        ...{ name, line, kind, longestOnUs, leastGapUs },
      })),
      settings: settingsOf(rig.text),
      calibrations: calibrations.map((one) => rowOf(one, rig, now)),
      bad,
      preflight: latestPreflight(rig, now) ?? null,
    };
  });
  app.get(
    '/api/rig/ports',
    async (): Promise<PortsTold> => ({
      ports: await describePorts(),
      warnings: grabberWarnings(),
    }),
  );
  app.get<{ Querystring: { after?: string } }>(
    '/api/rig/bench',
    { schema: { querystring: rigQueries.bench } },
    (request): Promise<BenchTold> => held().itemsAfter(Number(request.query.after ?? 0)),
  );
  app.post<{ Body: { output: string; widthMs: number; into: 'vial' | 'spout' } }>(
    '/api/rig/try',
    { schema: { body: rigBodies.attempt } },
    async (request): Promise<TriedTold> => {
      const { output, widthMs, into } = request.body;
      if (run !== undefined && !run.over) throw busy();
      const bench = await held().bench();
      const widthUs = Math.round(widthMs * 1_000);
      return { tried: await bench.attempt({ output, widthUs, into }) };
    },
  );

  app.get('/api/rig/guide', async () => tell());
  const begin = async (request: FastifyRequest, guide: GuideName | 'preflight', of: string) => {
    if (run !== undefined && !run.over) throw busy();
    const rig = fresh();
    const bench = await held().bench();
    // Two may have asked at once, and the first has it.
    if (run !== undefined && !run.over) throw busy();
    if (bench.state?.session === 'running') {
      throw new LapwingError('benchInSession', 'A session is running.');
    }
    const hands = await held().hands();
    const by = request.visitor?.name || 'operator';
    const recordFolder = options.records;
    run = new GuideRun({ rig, guide, of, by, bench, hands: hands?.say, recordFolder });
    const release = held().use();
    void run.finished.finally(release);
    return tell();
  };
  app.post<{ Body: { guide: GuideName; of?: string } }>(
    '/api/rig/guide',
    { schema: { body: rigBodies.guide } },
    (request) => begin(request, request.body.guide, request.body.of ?? ''),
  );
  app.post<{ Body: { number: number; answers: Answers } }>(
    '/api/rig/guide/answer',
    { schema: { body: rigBodies.answer } },
    async (request) => {
      if (run === undefined) throw new LapwingError('calibrateAnswer', 'Nothing is asked now.');
      run.answer(request.body.number, request.body.answers);
      return tell();
    },
  );
  app.delete('/api/rig/guide', async () => {
    if (run?.over) run = undefined;
    run?.stop('It was stopped on the Rig page.');
    await run?.finished;
    return { done: true };
  });

  app.get('/api/rig/preflight', async () => ({
    // A page without a rig file has none, and need not be told so as an error.
    preflight: (first && latestPreflight(first, new Date())) ?? null,
  }));
  app.post('/api/rig/preflight', { schema: { body: rigBodies.nothing } }, (request) =>
    begin(request, 'preflight', ''),
  );

  app.post<{ Body: { name: string } }>(
    '/api/rig/calibrations/use',
    { schema: { body: rigBodies.use } },
    async (request) => {
      const rig = need();
      const found = readCalibration(rig.calibrationsFolder, request.body.name);
      const bench = await held().bench();
      if (bench.state?.session === 'running') {
        throw new LapwingError('loopBusy', 'The rig file is read again between sessions.');
      }
      useCalibration(rig.path, found);
      await bench.reload();
      return { done: true };
    },
  );
  app.addHook('onClose', async () => {
    run?.stop('Lapwing is stopping.');
    holder?.close();
  });
}

function busy(): LapwingError {
  return new LapwingError('benchBusy', 'A guide is going on.');
}
