import type { OperatorAct } from '../../server/session/inputs.js';
import type { Problem } from '../../server/web/streamMessages.js';

/** What became of a request, ready to be shown. */
export type Answer =
  | { readonly done: true }
  | { readonly done: false; readonly text: string; readonly remedy: string };

export interface Beginning {
  readonly rules: string;
  readonly subject: string;
  readonly experimenter?: string;
  readonly protocolNumber?: string;
  readonly seed?: string;
  /** Why it is to begin whatever speaks against it. */
  readonly despite?: string;
}

export async function post(path: string, body: unknown, timeoutMs: number): Promise<Answer> {
  try {
    const response = await fetch(path, {
      method: 'POST',
      headers: { 'content-type': 'application/json' },
      body: JSON.stringify(body),
      signal: AbortSignal.timeout(timeoutMs),
      keepalive: true,
    });
    if (response.ok) return { done: true };
    const problem = (await response.json()) as Problem;
    return { done: false, text: problem.detail || problem.title, remedy: problem.remedy };
  } catch (error) {
    const late = (error as Error).name === 'TimeoutError';
    return {
      done: false,
      text: late ? 'The service did not answer in time.' : 'The service cannot be reached.',
      remedy: 'Look at the terminal that runs Lapwing.',
    };
  }
}

export const api = {
  begin: (session: Beginning) => post('/api/session', session, 30_000),
  act: (act: OperatorAct) => post('/api/acts', { act }, 5000),
  end: (reason: string) => post('/api/end', { reason }, 15_000),
  quiet: () => post('/api/quiet', {}, 5000),
};
