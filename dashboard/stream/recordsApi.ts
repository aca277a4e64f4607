import type { JobTold } from '../../server/web/jobs/jobMessages.js';
import type {
  Download,
  SessionList,
  SessionQuery,
  SessionTold,
  Work,
} from '../../server/web/records/recordsMessages.js';
import type { RulesListAnswer } from '../../server/web/rules/rulesMessages.js';
import { ask } from './ask.js';

const at = (name: string) => `/api/records/${encodeURIComponent(name)}`;

export const recordsApi = {
  list: (query: SessionQuery) => ask<SessionList>('GET', `/api/records?${wordsOf(query)}`),
  session: (name: string) => ask<SessionTold>('GET', at(name)),
  work: (name: string, work: Work) => ask<{ job: string }>('POST', `${at(name)}/work`, work),
  compare: (sessions: readonly string[]) =>
    ask<{ job: string }>('POST', '/api/comparisons', { sessions }),
  jobs: () => ask<{ jobs: readonly JobTold[] }>('GET', '/api/jobs'),
  job: (id: string) => ask<JobTold>('GET', `/api/jobs/${id}`),
  cancel: (id: string) => ask<unknown>('DELETE', `/api/jobs/${id}`),
  rulesFiles: () => ask<RulesListAnswer>('GET', '/api/rules'),
};
export type RecordsApi = typeof recordsApi;

/** Addresses that the browser itself opens. */
export const reportAddress = (name: string) => `${at(name)}/report`;
export const comparisonAddress = (job: string) => `/api/comparisons/${job}`;
export const downloadAddress = (name: string, what: Download) =>
  `${at(name)}/download?what=${what}`;

function wordsOf(query: SessionQuery): URLSearchParams {
  const words = new URLSearchParams();
  for (const [key, value] of Object.entries(query)) {
    if (value !== undefined && value !== '') words.set(key, String(value));
  }
  return words;
}
