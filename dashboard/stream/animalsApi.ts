import type {
  AnimalsAsk,
  AnimalsTold,
  AnimalTold,
} from '../../server/web/animals/animalsMessages.js';
import { ask } from './ask.js';

export const animalsApi = {
  list: () => ask<AnimalsTold>('GET', '/api/animals'),
  animal: (name: string) => ask<AnimalTold>('GET', `/api/animals/${encodeURIComponent(name)}`),
  write: (entry: AnimalsAsk) => ask<{ id: string }>('POST', '/api/animals', entry),
};
export type AnimalsApi = typeof animalsApi;
