/** The Animals page's half of the HTTP interface: who is kept, weights, and the water book. */
import type { FastifyInstance } from 'fastify';
import { AnimalsDesk } from '../../animals/animalsDesk.js';
import { AnimalsFolder } from '../../animals/animalsFolder.js';
import { checkDay, ownZone } from '../../animals/days.js';
import type { Entry } from '../../animals/entry.js';
import { historiesOf, overviewOf, pageOf } from '../../animals/overview.js';
import { LapwingError } from '../../errors/codes.js';
import { askedBy } from '../access/routes.js';
import type { AnimalsAsk, AnimalsTold, AnimalTold } from './animalsMessages.js';
import { animalsBody, animalsParams } from './schemas.js';

const DAYS_SHOWN = 30;

/** Weighing is done while another operator holds the rig's controls. */
const OPERATOR = { needs: 'operator' } as const;

/** @param folder where animals are kept, absolute; without it the list says so and the others answer ANIMALS_NO_FOLDER */
export function addAnimalsRoutes(app: FastifyInstance, folder: string | undefined): void {
  const kept = folder === undefined ? undefined : new AnimalsDesk(new AnimalsFolder(folder));

  const need = (): AnimalsDesk => {
    if (kept !== undefined) return kept;
    throw new LapwingError('animalsNoFolder', 'The rig file names no animals folder.');
  };

  app.get('/api/animals', async (): Promise<AnimalsTold> => {
    if (kept === undefined) return { folder: null, ...overviewOf([], [], new Date(), ownZone()) };
    const desk = kept;
    const { zone, entries, troubles } = await desk.folder.read();
    const overview = overviewOf(historiesOf(entries, zone), troubles, new Date(), zone);
    return { folder: desk.folder.folder, ...overview };
  });

  app.get<{ Params: { animal: string } }>(
    '/api/animals/:animal',
    { schema: { params: animalsParams } },
    async (request): Promise<AnimalTold> => {
      const { history, reading } = await need().history(request.params.animal);
      return pageOf(history, new Date(), reading.zone, DAYS_SHOWN);
    },
  );

  app.post<{ Body: AnimalsAsk }>(
    '/api/animals',
    { config: OPERATOR, schema: { body: animalsBody } },
    async (request) => {
      const { who } = askedBy(request, request.body.by);
      const { id } = await write(need(), request.body, who);
      return { done: true, id };
    },
  );
}

function write(desk: AnimalsDesk, ask: AnimalsAsk, by: string): Promise<Entry> {
  const { animal } = ask;
  switch (ask.do) {
    case 'add':
      return desk.folder.addAnimal(animal, { kind: 'card', set: daysChecked(ask.set) }, by);
    case 'change':
      return desk.change(animal, daysChecked(ask.set), by, {
        from: ask.from === undefined ? undefined : checkDay(ask.from, 'The first day'),
        reason: ask.reason,
      });
    case 'weigh':
      return desk.weigh(animal, ask.grams, { ...ask, by });
    case 'water':
      return desk.give(animal, ask.ul, { ...ask, by });
    case 'correct':
      return desk.correct(animal, ask.of, ask, ask.reason, by);
  }
}

function daysChecked<T extends Extract<AnimalsAsk, { do: 'add' }>['set']>(set: T): T {
  if (set.bornOn) checkDay(set.bornOn, 'The day of birth');
  if (set.baselineOn) checkDay(set.baselineOn, 'The day of the baseline');
  return set;
}
