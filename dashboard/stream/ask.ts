import type { Problem } from '../../server/web/streamMessages.js';

/** What the service answered, or why it did not, ready to be shown. */
export type Told<T> =
  | { readonly done: true; readonly value: T }
  | {
      readonly done: false;
      /** Of the HTTP answer; 0 where there was none. */
      readonly status: number;
      readonly text: string;
      readonly remedy: string;
    };

/** Asks the service for JSON. It never throws. */
export async function ask<T>(method: string, path: string, body?: unknown): Promise<Told<T>> {
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
