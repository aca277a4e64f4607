import type {
  CheckAnswer,
  RehearsalState,
  RulesFileAnswer,
  RulesListAnswer,
} from '../../server/web/rules/rulesMessages.js';
import type { Problem } from '../../server/web/streamMessages.js';

export type Told<T> =
  | { readonly done: true; readonly value: T }
  | {
      readonly done: false;
      readonly status: number;
      readonly text: string;
      readonly remedy: string;
    };

export interface RehearsalWish {
  readonly text: string;
  readonly path?: string;
  readonly seed: string;
  readonly animalSeed: number;
  readonly trained: boolean;
  readonly minutes: number;
}

async function ask<T>(method: string, path: string, body?: unknown): Promise<Told<T>> {
  try {
    const response = await fetch(path, {
      method,
      ...(body === undefined
        ? {}
        : { headers: { 'content-type': 'application/json' }, body: JSON.stringify(body) }),
      signal: AbortSignal.timeout(15_000),
    });
    if (response.ok) return { done: true, value: (await response.json()) as T };
    const problem = (await response.json()) as Problem;
    const text = problem.detail || problem.title;
    return { done: false, status: response.status, text, remedy: problem.remedy };
  } catch (error) {
    const late = (error as Error).name === 'TimeoutError';
    return {
      done: false,
      status: 0,
      text: late ? 'The service did not answer in time.' : 'The service cannot be reached.',
      remedy: 'Look at the terminal that runs Lapwing.',
    };
  }
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
