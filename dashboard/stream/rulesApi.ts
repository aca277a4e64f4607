import type {
  CheckAnswer,
  RehearsalState,
  RulesFileAnswer,
  RulesListAnswer,
} from '../../server/web/rules/rulesMessages.js';
import { ask } from './ask.js';

export interface RehearsalWish {
  readonly text: string;
  readonly path?: string;
  readonly seed: string;
  readonly animalSeed: number;
  readonly trained: boolean;
  readonly minutes: number;
  readonly runs: number;
}

export const rulesApi = {
  list: () => ask<RulesListAnswer>('GET', '/api/rules'),
  open: (path: string) =>
    ask<RulesFileAnswer>('GET', `/api/rules/file?path=${encodeURIComponent(path)}`),
  save: (file: { path: string; text: string; version?: string }) =>
    ask<{ version: string }>('PUT', '/api/rules/file', file),
  check: (text: string, path: string | undefined) =>
    ask<CheckAnswer>('POST', '/api/rules/check', { text, ...(path ? { path } : {}) }),
  rehearse: (wish: RehearsalWish) => ask<{ number: number }>('POST', '/api/rehearse', wish),
  rehearsal: () => ask<RehearsalState>('GET', '/api/rehearse'),
  cancel: () => ask<unknown>('DELETE', '/api/rehearse'),
};
export type RulesApi = typeof rulesApi;
