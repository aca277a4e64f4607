/** The Records page's half of the description of the HTTP interface (OpenAPI). */
import { asks, json, problems, ref, shows } from '../openapiParts.js';
import { recordsQueries } from './schemas.js';

const inPath = (name: string, description: string) => ({
  ...{ name, in: 'path', required: true, description },
  schema: { type: 'string' },
});
const session = [inPath('name', "The folder's name, as `GET /api/records` lists it.")];
const job = [inPath('id', 'As it was told when the job was begun.')];

function inQuery({ properties, required }: { properties: object; required: readonly string[] }) {
  return Object.entries(properties).map(([name, schema]) => ({
    ...{ name, in: 'query', required: required.includes(name), schema },
  }));
}

const file = (description: string, type: string) => ({
  '200': { description, content: { [type]: { schema: { type: 'string' } } } },
  default: problems,
});
const begun = {
  '200': { description: 'It waits or runs: follow it.', content: json(ref('JobBegun')) },
  default: problems,
};

export const recordsPaths = {
  '/api/records': {
    get: {
      ...shows('Sessions that fit, sorted; a bad description is told as such.', ref('SessionList'))
        .get,
      parameters: inQuery(recordsQueries.search),
    },
  },
  '/api/records/{name}': {
    get: {
      ...shows('One session: description, summary, what was made of it.', ref('Session')).get,
      parameters: session,
    },
  },
  '/api/records/{name}/work': {
    post: {
      ...asks('Have something made of a record, or found out about it.', 'Work').post,
      parameters: session,
      responses: begun,
    },
  },
  '/api/records/{name}/report': {
    get: {
      summary: 'The report, as it was made last.',
      parameters: session,
      responses: file('One self-contained page.', 'text/html'),
    },
  },
  '/api/records/{name}/download': {
    get: {
      summary: 'The session, its report or an export as one file; folders as a ZIP file.',
      parameters: [...session, ...inQuery(recordsQueries.download)],
      responses: file('The file.', 'application/octet-stream'),
    },
  },
  '/api/comparisons': {
    post: {
      ...asks('Compare sessions of one animal: learning across them.', 'Compare').post,
      responses: begun,
    },
  },
  '/api/comparisons/{id}': {
    get: {
      summary: 'The page of a comparison that is done.',
      parameters: job,
      responses: file('One self-contained page.', 'text/html'),
    },
  },
  '/api/jobs': shows('Long work that waits, runs or has ended, the newest first.', ref('JobList')),
  '/api/jobs/{id}': {
    get: {
      ...shows('How far a job is, or what came of it.', ref('Job')).get,
      parameters: job,
    },
    delete: {
      summary: 'Cancel a job, waiting or running.',
      parameters: job,
      responses: {
        '200': { description: 'It does not run.', content: json(ref('Done')) },
        default: problems,
      },
    },
  },
};
