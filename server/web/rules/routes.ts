/** The rules editor's half of the HTTP interface: files, checks, rehearsals. */
import type { FastifyInstance } from 'fastify';
import { LapwingError } from '../../errors/codes.js';
import { pathBeside } from '../../rules/text/paths.js';
import { factsOf, type Rig } from '../../session/rig/rig.js';
import { RateLimit } from '../gates.js';
import { Rehearsals } from '../rehearsal/rehearsals.js';
import { bodies, queries } from '../schemas.js';
import { checkAnswer, checkRulesText, UNSAVED } from './checkAnswer.js';
import { RulesFolder } from './rulesFolder.js';
import type { RulesListAnswer } from './rulesMessages.js';

export interface RulesRouteOptions {
  /** As the loop has it; without it these routes answer WEB_NO_RIG. */
  readonly rig: Rig | undefined;
  /** Instead of the rig file's. */
  readonly rulesFolder: string | undefined;
  readonly rehearsals?: Rehearsals;
  /** A file was saved: what the page offers may have changed. */
  readonly saved: (files: readonly string[]) => void;
}

/** A rules file is at most this long, and so is the body that holds one. */
export const RULES_BODY_BYTES = 256 << 10;
/** A check takes some milliseconds, of a hostile file some hundred: nobody types faster than this. */
const CHECKS_PER_S = 6;

/** Nothing on the rig changes, and a running session keeps its rules: the controls are not needed. */
const OPERATOR = { config: { needs: 'operator' } } as const;

interface CheckBody {
  readonly text: string;
  readonly path?: string;
}
interface RehearseBody extends CheckBody {
  readonly seed?: string;
  readonly animalSeed?: number;
  readonly trained?: boolean;
  readonly minutes?: number;
  readonly runs?: number;
}

/** Adds the routes, and returns the folder that they serve. */
export function addRulesRoutes(
  app: FastifyInstance,
  options: RulesRouteOptions,
): RulesFolder | undefined {
  const { rig } = options;
  const folder = rig && new RulesFolder(options.rulesFolder ?? rig.rulesFolder);
  const facts = rig && factsOf(rig);
  const rehearsals = options.rehearsals ?? new Rehearsals();
  const checks = new RateLimit(CHECKS_PER_S, CHECKS_PER_S * 4);
  const bodyLimit = RULES_BODY_BYTES;

  const need = () => {
    if (!rig || !folder || !facts)
      throw new LapwingError('webNoRig', '`--rig-file` was not given.');
    return { rig, folder, facts };
  };

  app.get('/api/rules', async (): Promise<RulesListAnswer> => {
    const { rig, folder } = need();
    const outputs = rig.outputs.map(({ name, kind }) => ({ name, kind }));
    const inputs = rig.inputs.map(({ name }) => name);
    return { files: folder.list(), rig: { beltCm: rig.belt.lengthCm, outputs, inputs } };
  });
  app.get<{ Querystring: { path: string } }>(
    '/api/rules/file',
    { schema: { querystring: queries.rulesFile } },
    async (request) => need().folder.read(request.query.path),
  );
  app.put<{ Body: { path: string; text: string; version?: string } }>(
    '/api/rules/file',
    { ...OPERATOR, bodyLimit, schema: { body: bodies.saveRules } },
    async (request) => {
      const { path, text, version } = request.body;
      const { folder } = need();
      const now = folder.write(path, text, version);
      options.saved(folder.list());
      return { done: true, version: now };
    },
  );
  app.post<{ Body: CheckBody }>(
    '/api/rules/check',
    { ...OPERATOR, bodyLimit, schema: { body: bodies.checkRules } },
    async (request) => {
      if (!checks.take(request.ip)) {
        throw new LapwingError('webTooManyRequests', `More than ${CHECKS_PER_S} checks a second.`);
      }
      const { folder, facts } = need();
      const path = placeFor(request.body.path);
      return checkAnswer(checkRulesText(folder, path, request.body.text, facts), facts);
    },
  );
  app.post<{ Body: RehearseBody }>(
    '/api/rehearse',
    { ...OPERATOR, bodyLimit, schema: { body: bodies.rehearse } },
    async (request) => {
      const { rig, folder } = need();
      const { text, path, seed = '', animalSeed = 1, trained = true } = request.body;
      const { minutes = 60, runs = 1 } = request.body;
      const number = rehearsals.begin({
        ...{ text, path: placeFor(path), seed, animalSeed, trained, minutes, runs },
        ...{ rigPath: rig.path, rulesFolder: folder.folder },
      });
      return { done: true, number };
    },
  );
  app.get('/api/rehearse', async () => rehearsals.state);
  app.delete('/api/rehearse', OPERATOR, async () => {
    rehearsals.cancel();
    return { done: true };
  });
  app.addHook('onClose', async () => void rehearsals.cancel());
  return folder;
}

/** Where a text stands, or would; what it brings in is looked for beside it. */
function placeFor(path: string | undefined): string {
  if (path === undefined) return UNSAVED;
  const found = pathBeside('', path, ['.yaml', '.yml']);
  if ('why' in found) {
    throw new LapwingError('webRulesPath', `${JSON.stringify(path)}: ${found.why}.`);
  }
  return found.path;
}
